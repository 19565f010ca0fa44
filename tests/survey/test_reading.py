"""Signs, scales and markers; every expected value is worked by hand from the lines of the file beside it."""

import numpy as np
import pytest

from vortexwidgets.survey.reading import read_survey
from vortexwidgets.survey.survey import SurveyError


@pytest.fixture
def survey_of(tmp_path):
    def read(text, **options):
        path = tmp_path / "bench.csv"
        path.write_text(text, encoding="utf-8")
        return read_survey(path, **options)

    return read


def component(survey, *direction):
    return survey.velocity[np.all(survey.direction == direction, axis=1)]


ACROSS, ALONG, AXIAL = (0.0, 1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)
# A counter-clockwise vortex about (0, 0) seen at (10, 0), (0, 10), (-10, 0) and (0, -10) mm, x right and y up.
COUNTER_CLOCKWISE = {
    (0.01, 0.0): (0.0, 1.0),
    (0.0, 0.01): (-1.0, 0.0),
    (-0.01, 0.0): (0.0, -1.0),
    (0.0, -0.01): (1.0, 0.0),
}


def field(survey):
    u, v = component(survey, *ALONG), component(survey, *ACROSS)
    return {
        (x, y): (a, b)
        for x, y, a, b in zip(survey.x[: u.size] + 0.0, survey.y[: u.size] + 0.0, u + 0.0, v + 0.0, strict=True)
    }


@pytest.mark.parametrize(
    "text",
    [
        "x [mm],y [mm],u [m/s],v [m/s]\n10,0,0,1\n0,10,-1,0\n-10,0,0,-1\n0,-10,1,0\n",
        # y downwards: the point below the axis has y = 10, and its flow to the right stays u = 1
        "# axes: y down\nx [mm],y [mm],u [m/s],v [m/s]\n10,0,0,-1\n0,-10,-1,0\n-10,0,0,1\n0,10,1,0\n",
        # seen from upstream, right and left are exchanged
        "# view: upstream\nx [mm],y [mm],u [m/s],v [m/s]\n-10,0,0,1\n0,10,1,0\n10,0,0,-1\n0,-10,-1,0\n",
        # x up and y left is the picture turned by a quarter
        "# axes: x up, y left\nx [mm],y [mm],u [m/s],v [m/s]\n0,-10,1,0\n10,0,0,1\n0,10,-1,0\n-10,0,0,-1\n",
        # a plane across an axis along x: y right, z up
        "y [mm],z [mm],v [m/s],w [m/s],x [mm]\n10,0,0,1,5\n0,10,-1,0,5\n-10,0,0,-1,5\n0,-10,1,0,5\n",
        # an axis along y, seen against it: z right, x up
        "x [mm],z [mm],u [m/s],w [m/s]\n0,10,1,0\n10,0,0,-1\n0,-10,-1,0\n-10,0,0,1\n",
        # normalised by a chord of 100 mm and a free stream of 10 m/s
        "# chord: 100 mm\n# free stream: 10 m/s\nx/c,y/c,u/U∞,v/U∞\n.1,0,0,.1\n0,.1,-.1,0\n-.1,0,0,-.1\n0,-.1,.1,0\n",
    ],
)
def test_a_plane_ends_counter_clockwise_positive(survey_of, text):
    found = field(survey_of(text))
    assert len(found) == 4
    for place, flow in COUNTER_CLOCKWISE.items():
        match = [value for key, value in found.items() if key == pytest.approx(place)]
        assert match == [pytest.approx(flow)]


@pytest.mark.parametrize(
    ("text", "across"),
    [
        ("position [mm],velocity [m/s]\n-10,-1\n0,0\n10,1\n", [-1, 0, 1]),
        ("x [mm],v [m/s]\n-10,-1\n0,0\n10,1\n", [-1, 0, 1]),
        # along y the left is -x: a counter-clockwise vortex has u = -1 above the axis
        ("y [mm],u [m/s]\n-10,1\n0,0\n10,-1\n", [-1, 0, 1]),
        # an axis along x: a line along z sees -v to its left, one along y sees w
        ("z [mm],v [m/s]\n-10,1\n0,0\n10,-1\n", [-1, 0, 1]),
        ("y [mm],w [m/s]\n-10,-1\n0,0\n10,1\n", [-1, 0, 1]),
        ("# axes: y down\nx [mm],v [m/s]\n-10,1\n0,0\n10,-1\n", [-1, 0, 1]),
        ("# view: upstream\nposition [mm],velocity [m/s]\n-10,1\n0,0\n10,-1\n", [-1, 0, 1]),
        ("# free stream: 10 m/s\nposition [mm],V/Uinf\n-10,-.1\n0,0\n10,.1\n", [-1, 0, 1]),
        ("# free stream: 10 m/s\nposition [mm],V/Uinf [%]\n-10,-10\n0,0\n10,10\n", [-1, 0, 1]),
        ("x [mm],u [m/s]\n-10,-1\n0,0\n10,1\n", [-1, 0, 1]),  # the only velocity there is
        ("position [mm],velocity [m/s]\n10,1\n0,0\n-10,-1\n", [1, 0, -1]),
    ],
)
def test_a_traverse_is_positive_to_the_left(survey_of, text, across):
    survey = survey_of(text)
    assert survey.geometry == "traverse"
    np.testing.assert_allclose(component(survey, *ACROSS), across, atol=1e-12)
    np.testing.assert_allclose(sorted(survey.x), [-0.01, 0.0, 0.01], atol=1e-12)


def test_a_traverse_takes_its_other_components(survey_of):
    survey = survey_of("x [mm],u [m/s],v [m/s],w [m/s]\n-10,.1,-1,8\n0,.2,0,7\n10,.1,1,8\n")
    np.testing.assert_array_equal(component(survey, *ALONG), [0.1, 0.2, 0.1])
    np.testing.assert_array_equal(component(survey, *AXIAL), [8, 7, 8])
    named = survey_of("position [mm],velocity [m/s],along [m/s],axial [m/s]\n-10,-1,.1,8\n0,0,.2,7\n10,1,.1,8\n")
    np.testing.assert_array_equal(named.velocity, survey.velocity)
    assert survey.provenance.columns[3] == "w [m/s] -> velocity along the axis of the vortex"


def test_an_axis_that_the_file_names_counts(survey_of):
    text = "# vortex axis: x\ny [mm],u [m/s],v [m/s],w [m/s]\n-10,8,.1,-1\n0,7,.2,0\n10,8,.1,1\n"
    survey = survey_of(text)
    np.testing.assert_array_equal(component(survey, *ACROSS), [-1, 0, 1])
    np.testing.assert_array_equal(component(survey, *AXIAL), [8, 7, 8])
    with pytest.raises(SurveyError, match="the line runs along y, and so does the axis"):
        survey_of(text.replace("axis: x", "axis: y"))


def test_a_radius_has_its_centre(survey_of):
    survey = survey_of("# length scale: 0.1 m\n# free stream: 20 m/s\nr/c,V/U∞\n.1,.5\n.2,.4\n.4,.2\n")
    assert survey.geometry == "radial"
    np.testing.assert_allclose(survey.x, [0.01, 0.02, 0.04])
    np.testing.assert_allclose(survey.velocity, [10, 8, 4])
    signed = survey_of("radius [mm],velocity [m/s]\n-10,-1\n0,0\n10,1\n")
    assert signed.geometry == "traverse"
    mirrored = survey_of("# view: upstream\nr [mm],swirl [m/s]\n1,-1\n2,-2\n3,-1\n")
    np.testing.assert_array_equal(mirrored.velocity, [1, 2, 1])


def test_a_ratio_finds_the_scale_it_names(survey_of):
    survey = survey_of("# R: 50 mm\n# V_tip: 30 m/s\n# free stream: 2 m/s\nr/R,V/V_tip\n.1,.5\n.2,.4\n.4,.2\n")
    np.testing.assert_allclose(survey.x, [0.005, 0.01, 0.02])
    np.testing.assert_allclose(survey.velocity, [15, 12, 6])
    assert survey.provenance.columns[1] == "V/V_tip -> swirl, positive counter-clockwise, times the v tip"


def test_an_uncertain_scale_is_common_to_all_samples(survey_of):
    survey = survey_of(
        "# free stream: 10.0 ± 0.3 m/s\n# velocity gain: 1 ± 0.04\n# chord: 50.0 ± 0.5 mm\nx/c,V/U\n-1,-.1\n0,0\n1,.1\n"
    )
    assert survey.velocity_gain.uncertainty == pytest.approx(0.05)  # 3 % and 4 %, root sum of squares
    assert survey.position_scale.uncertainty == pytest.approx(0.01)


def test_rms_with_samples_is_an_uncertainty_of_the_mean(survey_of):
    text = "position [mm],velocity [m/s],rms [m/s]{more}\n-10,-1,2{a}\n0,0,2{a}\n10,1,3{a}\n"
    fact = survey_of("# samples: 400\n" + text.format(more="", a=""))
    np.testing.assert_allclose(fact.uncertainty, [0.1, 0.1, 0.15])  # 2/√400
    column = survey_of(text.format(more=",samples", a=",100"))
    np.testing.assert_allclose(column.uncertainty, [0.2, 0.2, 0.3])
    fewer = survey_of("# samples: 400\n# effective samples: 100\n" + text.format(more="", a=""))
    np.testing.assert_allclose(fewer.uncertainty, [0.2, 0.2, 0.3])
    alone = survey_of(text.format(more="", a=""))
    assert alone.uncertainty is None
    assert any("rms without a number of samples" in note for note in alone.provenance.notes)


@pytest.mark.parametrize(
    ("heading", "said"),
    [
        ("U95 [m/s]", "after division by k = 2, the usual coverage factor of an expanded uncertainty"),
        ("expanded uncertainty [m/s]", "after division by k = 2, the usual coverage factor of an expanded uncertainty"),
        ("U (k=2) [m/s]", "after division by k = 2"),
    ],
)
def test_an_expanded_uncertainty_is_halved_and_said(survey_of, heading, said):
    survey = survey_of(f"position [mm],velocity [m/s],{heading}\n-10,-1,0.2\n0,0,0.2\n10,1,0.4\n")
    np.testing.assert_allclose(survey.uncertainty, [0.1, 0.1, 0.2])
    assert survey.provenance.columns[2] == f"{heading} -> standard uncertainty {said}"


def test_the_coverage_factor_of_the_file_counts_more_than_the_usual_one(survey_of):
    survey = survey_of("# coverage factor: 4\nx [mm],v [m/s],U95 [m/s]\n-10,-1,0.2\n0,0,0.2\n10,1,0.4\n")
    np.testing.assert_allclose(survey.uncertainty, [0.05, 0.05, 0.1])


def test_what_looks_like_an_uncertainty_is_never_passed_over_in_silence(survey_of):
    survey = survey_of("position [mm],velocity [m/s],U95 (velocity) [m/s]\n-10,-1,0.2\n0,0,0.2\n10,1,0.4\n")
    assert survey.uncertainty is None
    assert any("looks like an uncertainty but is not understood" in note for note in survey.provenance.notes)


@pytest.mark.parametrize(
    ("text", "lines"),
    [
        (
            "# view: upstream\nr [mm],swirl [m/s]\n1,1\n2,2\n3,1\n",
            (
                "distance from the axis",
                "swirl, positive counter-clockwise (sign turned, because the view is from upstream)",
            ),
        ),
        (
            "# axes: y down\nposition [mm],velocity [m/s]\n-1,1\n0,0\n1,-1\n",
            (
                "position along the line, the centre is fitted",
                "component across the line, positive to the left of increasing position (sign turned, because the axes "
                "are 'y down')",
            ),
        ),
        (
            "# view: upstream\n# axes: y down\nx [mm],y [mm],u [m/s],v [m/s]\n10,0,0,1\n0,10,-1,0\n-10,0,0,-1\n",
            (
                "position along x (sign turned, because the view is from upstream)",
                "position along y (sign turned, because the axes are 'y down')",
                "component along x (sign turned, because the view is from upstream)",
                "component along y (sign turned, because the axes are 'y down')",
            ),
        ),
        (
            "# axes: x up, y left\nx [mm],y [mm],u [m/s],v [m/s]\n0,-10,1,0\n10,0,0,1\n0,10,-1,0\n",
            (
                "position along x (taken as pointing up, because the axes are 'x up')",
                "position along y (taken as pointing left, because the axes are 'y left')",
                "component along x (taken as pointing up, because the axes are 'x up')",
                "component along y (taken as pointing left, because the axes are 'y left')",
            ),
        ),
    ],
)
def test_the_line_of_a_column_says_what_was_turned_and_why(survey_of, text, lines):
    assert tuple(line.partition(" -> ")[2] for line in survey_of(text).provenance.columns) == lines


def test_uncertainties_per_component_and_common_ones(survey_of):
    survey = survey_of(
        "x [mm],y [mm],u [m/s],v [m/s],u uncertainty [m/s],v uncertainty (k=2) [cm/s]\n"
        "0,0,1,1,.1,40\n1,0,1,2,.1,40\n0,1,1,3,.1,40\n"
    )
    np.testing.assert_allclose(survey.uncertainty, [0.1] * 3 + [0.2] * 3)
    common = survey_of("# uncertainty: 5 cm/s\n# coverage factor: 2\nposition [mm],velocity [m/s]\n0,1\n1,2\n2,3\n")
    np.testing.assert_allclose(common.uncertainty, 0.025)


def test_markers_flags_and_gaps_are_dropped_with_a_reason(survey_of):
    survey = survey_of(
        "position [mm],velocity [m/s],valid,CHC,remark\n1,1,1,1,\n2,9.99e9,1,1,\n3,-999,1,1,\n4,2,0,1,\n5,2,1,-3,\n"
        "6,,1,1,dirt\n7,1,1,1,\n8,2,1,4,\n"
    )
    assert {item.row: item.reason for item in survey.provenance.dropped} == {
        3: "velocity [m/s] is 9.99e+09, a marker of an invalid value",
        4: "velocity [m/s] is -999, a marker of an invalid value",
        5: "valid is '0'",
        6: "CHC is '-3'",
        7: "a position or velocity is missing (remark: dirt)",
    }
    assert survey.points == 3
    assert "column 'CHC': the meaning of 4 is not known; those rows are kept" in survey.provenance.notes


def test_an_ordinary_minus_999_is_data(survey_of):
    survey = survey_of("position [mm],velocity [mm/s]\n1,-999\n2,-1200\n3,-800\n")
    assert survey.points == 3


def test_units_given_by_the_caller_override_the_header(survey_of):
    text = "position [mm],velocity\n-10,-1\n0,0\n10,1\n"
    survey = survey_of(text, units={"position": "cm", "velocity": "ft/s"})
    np.testing.assert_allclose(survey.x, [-0.1, 0.0, 0.1])
    np.testing.assert_allclose(survey.velocity, [-0.3048, 0.0, 0.3048])  # a foot is 0.3048 m by definition
    assert survey.provenance.columns[1].endswith("[ft/s]")
    with pytest.raises(
        SurveyError, match="has no column 'radius' to give the unit 'mm'; its columns are 'position', 've"
    ):
        survey_of(text, units={"radius": "mm"})


def test_a_pressure_column_is_kept(survey_of):
    survey = survey_of("position [mm],velocity [m/s],static pressure [kPa]\n-10,-1,100\n0,0,90\n10,1,\n")
    np.testing.assert_array_equal(survey.pressure, [100e3, 90e3, np.nan])


def test_facts_travel_with_the_survey(survey_of):
    survey = survey_of("# title: bench 3\n# depth: 1.2 m\n# miss distance: 2 ± 1 mm\nx [mm],v [m/s]\n-1,-1\n0,0\n1,1\n")
    assert survey.facts["title"] == "bench 3"
    assert survey.facts["depth"].value == 1.2
    assert (survey.miss_distance.value, survey.miss_distance.uncertainty) == pytest.approx((0.002, 0.001))
    assert len(survey.provenance.sha256) == 64


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("position [mm]\n1\n2\n3\n", "has one column"),
        (
            "position,velocity [m/s]\n1,1\n2,2\n3,3\n",
            r"column 'position' has no unit; write 'position \[mm\]' .*--units",
        ),
        ("position [mm],velocity [mm]\n1,1\n2,2\n3,3\n", r"column 'velocity \[mm\]'"),
        ("position [s],velocity [m/s]\n1,1\n2,2\n3,3\n", r"column 'position \[s\]'"),
        (
            "Position (MM),velocity [m/s]\n1,1\n2,2\n3,3\n",
            r"'Position \(MM\)': 'MM' is not .* case sensitive, mm is meant\?\); write 'Position \[mm\]' in the header",
        ),
        ("# uncertainty: 2 %\nposition [mm],velocity [m/s]\n1,1\n2,2\n3,3\n", r"'uncertainty: 0\.05 m/s', or one that"),
        ("position [mm],velocity [wurst]\n1,1\n2,2\n3,3\n", r"column 'velocity \[wurst\]'"),
        ("alpha,beta\n1,1\n2,2\n3,3\n", "no column holds a velocity .* the headings are 'alpha', 'beta'"),
        ("alpha,velocity [m/s]\n1,1\n2,2\n3,3\n", "no column holds a position"),
        ("r/c,v [m/s]\n1,1\n2,2\n3,3\n", "column 'r/c' is a ratio; .*'# length scale: 50 mm'"),
        ("r [mm],v/U\n1,1\n2,2\n3,3\n", "column 'v/U' is a ratio; .*'# free stream: 12 m/s'"),
        ("x [mm],y [mm],v [m/s]\n1,1,1\n2,2,2\n3,3,3\n", "needs two velocity components"),
        ("x [mm],y [mm],z [mm],u [m/s],v [m/s]\n1,1,1,1,1\n2,2,2,2,2\n3,3,3,3,3\n", "x, y and z all vary"),
        ("position [mm],x [mm],velocity [m/s],vel [m/s]\n1,1,1,1\n2,2,2,2\n3,3,3,3\n", "both hold the velocity"),
        ("position [mm],speed [m/s]\n1,1\n2,2\n3,3\n", "a speed has no sign"),
        (
            "position [mm],velocity [m/s]\n1,NaN\n2,\n3,nan\n",
            r"0 of 3 rows are usable \(row 2: a position or velocity is",
        ),
        ("position [mm],velocity [m/s]\n1,1\n1,2\n1,3\n", "all 3 samples are at the same position"),
        (
            "position [mm],velocity [m/s],uncertainty [m/s]\n1,1,1\n2,2,0\n3,3,1\n",
            "row 3, .*the uncertainty is 0, and must",
        ),
        (
            "position [mm],velocity [m/s],uncertainty [%]\n1,1,1\n2,2,2\n3,3,1\n",
            "a percentage of something it does not",
        ),
        ("position [mm],velocity [m/s]\n1,1\n2,2e7\n3,3\n", r"row 3, column 'velocity \[m/s\]': 2e\+07 m/s is beyond"),
        ("position [km],velocity [m/s]\n1,1\n2e7,2\n3,3\n", r"row 3, column 'position \[km\]': 2e\+07 km is beyond"),
        ("# axes: x right, y left\nx [mm],v [m/s]\n1,1\n2,2\n3,3\n", "point along the same line"),
        ("# samples: 0.2\nx [mm],v [m/s],rms [m/s]\n1,1,1\n2,2,1\n3,3,1\n", "samples must be at least 1"),
        ("# uncertainty: 0 m/s\nx [mm],v [m/s]\n1,1\n2,2\n3,3\n", "uncertainty must be positive"),
    ],
)
def test_refusals(survey_of, text, message):
    with pytest.raises(SurveyError, match=message) as caught:
        survey_of(text)
    assert str(caught.value).startswith("bench.csv")
    assert "\n" not in str(caught.value)
