import dataclasses

import numpy as np
import pytest

from vortexwidgets.survey.survey import Survey, SurveyError
from vortexwidgets.uncertainty import Estimate

LINE = np.array([-0.02, -0.01, 0.0, 0.01, 0.02])


def traverse(**changes):
    given = {"position": LINE, "velocity": [-1.0, -2.0, 0.1, 2.0, 1.0], "uncertainty": 0.1}
    return Survey.traverse(**{**given, **changes})


def test_a_traverse_lies_along_x_and_measures_the_left():
    survey = traverse()
    assert survey.geometry == "traverse"
    np.testing.assert_array_equal(survey.direction, np.tile([0.0, 1.0, 0.0], (5, 1)))
    np.testing.assert_array_equal(survey.y, 0.0)
    assert survey.points == survey.stations == 5
    assert not survey.two_components


def test_a_second_component_and_an_axial_one_are_further_samples():
    survey = traverse(along=np.full(5, 0.3), axial=[10.0, np.nan, 8.0, 9.0, 10.0])
    assert survey.points == 14
    assert survey.stations == 5
    assert survey.two_components
    assert survey.axial.sum() == 4
    assert survey.in_plane.sum() == 10


def test_uncertainty_is_one_number_one_per_position_or_one_row_per_component():
    rows = np.array([[0.1] * 5, [0.2] * 5])
    survey = traverse(along=np.zeros(5), uncertainty=rows)
    np.testing.assert_array_equal(survey.uncertainty, rows.ravel())
    with pytest.raises(SurveyError, match=r"uncertainty has shape \(3,\)"):
        traverse(uncertainty=[0.1, 0.1, 0.1])


def test_a_plane_takes_axes_or_points_and_lists_missing_vectors():
    u = np.ones((3, 4))
    u[1, 2] = np.nan
    survey = Survey.plane(x=np.arange(4.0), y=np.arange(3.0), u=u, v=np.zeros((3, 4)), w=np.full((3, 4), 9.0))
    assert survey.in_plane.sum() == 22
    assert survey.axial.sum() == 11
    assert [item.row for item in survey.provenance.dropped] == [6]


def test_a_radial_survey_keeps_its_centre():
    survey = Survey.radial(radius=[0.1, 0.2, 0.2], swirl=[1.0, 2.0, 2.1])
    assert survey.geometry == "radial"
    assert survey.stations == 2
    with pytest.raises(SurveyError, match=r"radius must not be negative, got -0.1 m"):
        Survey.radial(radius=[-0.1, 0.2, 0.3], swirl=[1.0, 1.0, 1.0])


def test_samples_set_aside_are_kept_with_their_reason():
    survey = traverse()
    less = survey.without([1], "by hand")
    assert less.points == 4
    assert less.set_aside == {1: "by hand"}
    assert less.velocity.size == 5
    assert less.with_all() == survey
    assert less.with_samples([1]) == survey
    with pytest.raises(SurveyError, match="there is no sample 9"):
        survey.without([9], "by hand")
    with pytest.raises(SurveyError, match="say why"):
        survey.without([1], " ")
    with pytest.raises(SurveyError, match="the survey has 2 samples in use"):
        survey.without([0, 1, 2], "by hand")


def test_surveys_are_equal_by_content_and_never_change():
    one, two = traverse(title="bench 3"), traverse(title="bench 3")
    assert one == two
    assert hash(one) == hash(two)
    assert one != traverse(title="bench 4")
    assert one != traverse(uncertainty=None, title="bench 3")
    with pytest.raises(ValueError, match="read-only"):
        one.velocity[0] = 3.0
    with pytest.raises(dataclasses.FrozenInstanceError):
        one.geometry = "plane"


def test_facts_are_estimates_text_and_numbers():
    survey = traverse(title="bench", temperature=(288.15, 0.2), gas_saturation=0.8)
    assert survey.facts["temperature"] == Estimate(288.15, 0.2, "temperature")
    assert survey.facts["gas_saturation"] == 0.8
    assert survey.with_facts(title=None, fluid="air").facts.keys() == {"temperature", "gas_saturation", "fluid"}
    with pytest.raises(SurveyError, match="fact title must be text or a number"):
        traverse(title=[1])


def test_gain_and_scale_are_one_with_an_uncertainty():
    survey = traverse(velocity_gain=(1.0, 0.005), miss_distance=(0.002, 0.001))
    assert survey.velocity_gain.uncertainty == 0.005
    assert survey.miss_distance == Estimate(0.002, 0.001, "miss_distance")
    with pytest.raises(SurveyError, match=r"velocity_gain must be 1 .* got 1.02; correct the velocities first"):
        traverse(velocity_gain=(1.02, 0.005))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"position": np.zeros(5)}, "all 5 samples are at the same position"),
        ({"position": LINE[:2], "velocity": [1.0, 2.0]}, "the survey has 2 samples in use; at least 3 are needed"),
        ({"velocity": [1.0, 2.0]}, "velocity has 2 values for 5 positions"),
        ({"velocity": [1.0, 2.0, 3.0, 4.0, 1e7]}, r"velocity of sample 4 is 1e\+07 m/s"),
        ({"position": LINE * 1e12}, "x of sample 0 is"),
        ({"uncertainty": 0.0}, "uncertainty must be positive, got 0 m/s at sample 0"),
        ({"uncertainty": [0.1, 0.1, -0.1, 0.1, 0.1]}, "got -0.1 m/s at sample 2"),
        ({"uncertainty": np.nan}, "uncertainty must be positive, got nan"),
        ({"velocity": ["fast"] * 5}, "velocity must be numbers in SI units, got .'fast'"),
        ({"position": [1, [2]]}, "position must be numbers in SI units"),
        ({"uncertainty": "small"}, "uncertainty must be numbers in SI units, got 'small'"),
        ({"pressure": ["low"] * 5}, "pressure must be numbers in SI units"),
        ({"miss_distance": -0.005}, "miss_distance must not be negative, got -0.005 m; give the distance"),
        ({"miss_distance": 5.0}, "miss_distance is 5 m, but the survey is only .* m long"),
        ({"pressure": [1.0]}, "pressure has 1 values for 5 positions"),
    ],
)
def test_refusals_say_what_is_wrong(changes, message):
    with pytest.raises(SurveyError, match=message):
        traverse(**changes)


def test_a_direction_is_a_unit_vector_and_geometry_is_known():
    survey = traverse()
    with pytest.raises(SurveyError, match="direction of sample 0 has length 2"):
        dataclasses.replace(survey, direction=2.0 * survey.direction)
    with pytest.raises(SurveyError, match="geometry must be radial, traverse or plane"):
        dataclasses.replace(survey, geometry="cube")


class Solid:
    """Solid-body rotation of 3 rad/s about (0.01, 0.002)."""

    centre = (0.01, 0.002)

    def swirl(self, radius):
        return 3.0 * radius

    def velocity(self, x, y):
        return -3.0 * (y - 0.002), 3.0 * (x - 0.01)


def test_simulated_surveys_see_the_vortex_where_it_is():
    line = Survey.simulated(Solid(), position=LINE, along=True, background=(0.0, 0.5))
    np.testing.assert_allclose(line.velocity[:5], 3.0 * (LINE - 0.01) + 0.5)
    np.testing.assert_allclose(line.velocity[5:], 0.006)
    assert line.uncertainty is None
    plane = Survey.simulated(Solid(), x=LINE, y=LINE[:3])
    assert plane.points == 30
    radial = Survey.simulated(Solid(), radius=[0.1, 0.2, 0.3])
    np.testing.assert_allclose(radial.velocity, [0.3, 0.6, 0.9])
    with pytest.raises(ValueError, match="in one way"):
        Survey.simulated(Solid(), position=LINE, radius=LINE)


def test_simulated_noise_is_seeded_and_stated():
    one = Survey.simulated(Solid(), position=np.linspace(-1, 1, 4001), noise=0.2, seed=4)
    assert one == Survey.simulated(Solid(), position=np.linspace(-1, 1, 4001), noise=0.2, seed=4)
    assert np.std(one.velocity - 3.0 * (one.x - 0.01)) == pytest.approx(0.2, rel=0.05)
    np.testing.assert_array_equal(one.uncertainty, 0.2)


def test_a_survey_says_what_it_is():
    text = str(traverse(title="bench").without([1], "by hand"))
    assert text == "bench: traverse survey, 4 stations over 0.04 m, 4 samples in the plane, 1 set aside"


@pytest.mark.parametrize("call", ["fit_survey", "rank_models", "appraise"])
def test_a_file_name_is_no_survey(call):
    from pathlib import Path

    import vortexwidgets as vx

    more = ["lamb-oseen"] if call == "fit_survey" else []
    for given in ("bench.csv", Path("bench.csv")):
        with pytest.raises(SurveyError, match=r"got the file name 'bench\.csv'; read it first: vx\.read_survey"):
            getattr(vx, call)(given, *more)
    with pytest.raises(SurveyError, match="a survey is needed, got None; make one with"):
        getattr(vx, call)(None, *more)
