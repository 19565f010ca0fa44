import numpy as np
import pytest
import xarray

from vortexwidgets.survey import grid
from vortexwidgets.survey.reading import read_survey
from vortexwidgets.survey.survey import SurveyError

X, Y = np.array([-20.0, -10.0, 0.0, 10.0, 20.0]), np.array([-10.0, 0.0, 10.0])


def plane(**more):
    u, v = np.meshgrid(X, Y)
    dataset = xarray.Dataset(
        {
            "u": (("y", "x"), -v, {"units": "cm s-1"}),
            "v": (("y", "x"), u, {"units": "cm s-1"}),
            "temperature_map": (("y", "x"), u),
        },
        coords={"x": ("x", X, {"units": "mm"}), "y": ("y", Y, {"units": "mm"})},
        attrs={"title": "planar field", "fluid": "air", "temperature": 15.0, "temperature_units": "degC"},
    )
    return dataset.assign(more)


@pytest.mark.parametrize(("engine", "form"), [("h5netcdf", "NETCDF4"), ("scipy", "NETCDF3_64BIT")])
def test_a_planar_field_is_read_with_units_and_facts(tmp_path, engine, form):
    path = tmp_path / "plane.nc"
    plane().to_netcdf(path, engine=engine, format=form)
    survey = read_survey(path)
    assert survey.geometry == "plane"
    assert survey.stations == 15
    at = np.flatnonzero((survey.x == 0.01) & (survey.y == -0.01))
    np.testing.assert_allclose(survey.velocity[at], [0.1, 0.1])  # u = 10 cm/s, v = 10 cm/s
    assert survey.facts["fluid"] == "air"
    assert survey.facts["temperature"].value == pytest.approx(288.15)
    assert "u -> component along x [cm/s]" in survey.provenance.columns


def test_a_traverse_is_found_by_its_long_name_and_missing_values_are_listed(tmp_path):
    path = tmp_path / "line.nc"
    xarray.Dataset(
        {
            "a": ("n", [1.0, np.nan, 3.0, 4.0], {"units": "m/s", "long_name": "velocity"}),
            "uncertainty": ("n", [0.1, 0.1, 0.1, 0.1], {"units": "m/s"}),
        },
        coords={"position": ("n", [0.0, 1.0, 2.0, 3.0], {"units": "mm"})},
    ).to_netcdf(path, engine="h5netcdf")
    survey = read_survey(path)
    assert survey.geometry == "traverse"
    assert survey.points == 3
    assert survey.provenance.dropped[0].row == 1


def test_refusals(tmp_path, monkeypatch):
    path = tmp_path / "bad.nc"
    snapshots = plane().expand_dims(time=[0, 1, 2])
    snapshots.to_netcdf(path, engine="h5netcdf")
    with pytest.raises(SurveyError, match=r"'u' varies along 'time' \(3 values\), along which no position is given"):
        read_survey(path)
    path.unlink()
    xarray.Dataset({"a": ("n", [1.0])}).to_netcdf(path, engine="h5netcdf")
    with pytest.raises(SurveyError, match="has no variable whose name says position or velocity"):
        read_survey(path)
    path.write_bytes(b"\x89HDF\r\n\x1a\nbroken")
    with pytest.raises(SurveyError, match="cannot be read as NetCDF"):
        read_survey(path)
    path.unlink()
    plane().to_netcdf(path, engine="h5netcdf")
    monkeypatch.setattr(grid, "LARGEST_GRID", 100)
    with pytest.raises(SurveyError, match="MB of numbers, the limit is"):
        read_survey(path)
