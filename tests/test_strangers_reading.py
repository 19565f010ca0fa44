"""Files as people have them are read without editing; tests/strangers/truth.json has the vortex that made each."""

import json
from pathlib import Path

import numpy as np
import pytest

from vortexwidgets.survey.reading import read_survey
from vortexwidgets.survey.screening import screen

FOLDER = Path(__file__).parent / "strangers"
TRUTH = json.loads((FOLDER / "truth.json").read_text(encoding="utf-8"))
LINES = [name for name in TRUTH if name != "plane.csv"]
# Rows of numbers counted in the files by hand (wc -l less header and comments), and of those without a value.
ROWS = {
    "plain.csv": (61, 0),
    "columns_swapped.csv": (54, 0),
    "semicolon_decimal_comma.csv": (173, 0),
    "tabs.txt": (171, 0),
    "feet.csv": (142, 0),
    "gaps.csv": (120, 21),
    "repeats.csv": (120, 0),
    "spikes.csv": (150, 0),
    "coverage_factor_two.csv": (137, 0),
    "never_in_the_core.csv": (60, 0),
    "plane.csv": (1681, 129),
    "bom_crlf.csv": (168, 0),
}


def true_swirl(truth: dict, radius: np.ndarray) -> np.ndarray:
    """Lamb-Oseen: v = Γ / (2π r) (1 - exp(-r²/r_c²)); H. Lamb, Hydrodynamics, 6th ed. (1932), art. 334a."""
    return truth["circulation"] / (2.0 * np.pi * radius) * -np.expm1(-((radius / truth["core_radius"]) ** 2))


@pytest.mark.parametrize("name", TRUTH)
def test_every_row_is_kept_or_listed(name):
    survey = read_survey(FOLDER / name)
    rows, missing = ROWS[name]
    components = 2 if name == "plane.csv" else 1
    assert survey.velocity.size == components * (rows - missing)
    assert len(survey.provenance.dropped) == missing
    assert all(item.reason for item in survey.provenance.dropped)


@pytest.mark.parametrize("name", LINES)
def test_a_traverse_has_the_right_units_signs_and_noise(name):
    truth, survey = TRUTH[name], read_survey(FOLDER / name)
    assert survey.geometry == "traverse"
    radius = survey.x - truth["centre"]
    residual = survey.velocity - np.sign(radius) * true_swirl(truth, np.abs(radius))
    expected = truth["noise"]
    # The scatter of the residuals is the noise: no unit, sign or decimal can be wrong.
    assert np.median(np.abs(residual)) == pytest.approx(0.6745 * expected, rel=0.35)
    if survey.uncertainty is not None:
        np.testing.assert_allclose(survey.uncertainty, expected, rtol=2e-3)


def test_a_plane_has_the_right_units_signs_and_background():
    truth, survey = TRUTH["plane.csv"], read_survey(FOLDER / "plane.csv")
    x, y = survey.x - truth["centre"][0], survey.y - truth["centre"][1]
    radius = np.hypot(x, y)
    swirl = true_swirl(truth, radius)
    u = truth["background"][0] - swirl * y / radius
    v = truth["background"][1] + swirl * x / radius
    expected = np.where(survey.direction[:, 0] == 1.0, u, v)
    assert survey.geometry == "plane"
    assert survey.two_components
    # Noise of 2 % of the peak, as the README of the files says; the peak is 0.638 Γ/(2π r_c).
    noise = 0.02 * 0.638 * truth["circulation"] / (2.0 * np.pi * truth["core_radius"])
    assert np.std(survey.velocity - expected) == pytest.approx(noise, rel=0.3)


def test_a_feet_file_knows_its_fluid_and_temperature():
    facts = read_survey(FOLDER / "feet.csv").facts
    assert facts["fluid"] == "air"
    assert facts["temperature"].value == pytest.approx(288.15)  # 59 °F is 15 °C


def test_a_coverage_factor_is_taken_out_and_said():
    survey = read_survey(FOLDER / "coverage_factor_two.csv")
    np.testing.assert_allclose(survey.uncertainty, 0.11321, rtol=1e-4)  # half of 0.22642 in the file
    assert any("coverage factor 2" in note for note in survey.provenance.notes)


def test_remarks_go_into_the_reason():
    dropped = read_survey(FOLDER / "gaps.csv").provenance.dropped
    assert dropped[0].row == 6
    assert "seeding poor" in dropped[0].reason


@pytest.mark.parametrize("name", TRUTH)
def test_outliers_are_the_gross_spikes_and_nothing_else(name):
    found = screen(read_survey(FOLDER / name))
    if name == "spikes.csv":
        # The three values far outside ±17 m/s, seen by eye: 150.27, -104.15 and 90.637 m/s.
        assert sorted(found.survey.velocity[list(found.outliers)]) == [-104.15, 90.637, 150.27]
        assert found.points == 147
        reasons = [found.survey.set_aside[index] for index in found.outliers]
        assert len(reasons) == 3
        assert all("outlier" in reason for reason in reasons)
    else:
        assert found.outliers == ()
        assert not found.survey.set_aside


@pytest.mark.parametrize("name", TRUTH)
def test_points_inside_the_core_are_counted(name):
    truth, survey = TRUTH[name], read_survey(FOLDER / name)
    centre = tuple(np.atleast_1d(truth["centre"])) if name == "plane.csv" else (truth["centre"], 0.0)
    peak = 1.1209 * truth["core_radius"]  # where the Lamb-Oseen swirl is largest
    found = screen(survey, centre=centre, peak_radius=peak)
    radius = np.hypot(survey.x - centre[0], survey.y - centre[1])
    assert found.reach == pytest.approx(radius.max() / peak)
    if name == "never_in_the_core.csv":
        assert found.inside_core == 0
        assert any("No station lies inside the core" in sentence for sentence in found.sentences)
    else:
        assert found.inside_core >= 3
