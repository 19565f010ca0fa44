import pytest

from vortexwidgets.survey.facts import read_facts
from vortexwidgets.survey.samples import SurveyError


def facts(*comments):
    return read_facts(list(enumerate(comments, start=1)), "bench.csv")


def test_facts_are_si_estimates_with_their_uncertainty():
    found = facts("Temperature: 15.0 ± 0.2 degC", "ambient pressure = 101.3 kPa", "probe width [mm]: 1,5").values
    assert found["temperature"].value == pytest.approx(288.15)
    assert found["temperature"].uncertainty == pytest.approx(0.2)
    assert found["ambient_pressure"].value == pytest.approx(101300.0)
    assert found["ambient_pressure"].uncertainty == 0.0
    assert found["probe_width"].value == pytest.approx(0.0015)


@pytest.mark.parametrize("text", ["40 kPa absolute", "40 kPa (absolute)", "40 kPa abs"])
def test_a_low_pressure_may_say_that_it_is_absolute(text):
    found = facts(f"ambient pressure: {text}").values
    assert found["ambient_pressure"].value == pytest.approx(40e3)
    assert found["confirm_absolute"] == "yes"


def test_words_are_known_words():
    found = facts("orientation: free surface", "view: from upstream", "axes: x left, y downwards", "averaging: across")
    assert found.values == {
        "orientation": "surface",
        "view": "upstream",
        "axes": "x left, y down",
        "averaging": "across",
    }


@pytest.mark.parametrize(
    ("text", "uncertainty"),
    [
        ("1.000 ± 0.005", 0.005),
        ("1 +/- 0.5 %", 0.005),
        ("0.5 %", 0.005),
        ("± 0.005", 0.005),
        ("0.005", 0.005),
        ("1", 0),
    ],
)
def test_a_gain_is_one_with_its_uncertainty(text, uncertainty):
    gain = facts(f"velocity gain: {text}").values["velocity_gain"]
    assert (gain.value, gain.uncertainty) == (1.0, pytest.approx(uncertainty))


def test_a_coverage_factor_divides_every_uncertainty():
    found = facts("coverage factor: 2", "velocity gain: 1.00 ± 0.01", "temperature: 15 ± 1 degC")
    assert found.values["velocity_gain"].uncertainty == pytest.approx(0.005)
    assert found.values["temperature"].uncertainty == pytest.approx(0.5)
    assert found.notes == ("every uncertainty of the file is divided by its coverage factor 2",)


@pytest.mark.parametrize(
    ("comment", "factor"),
    [
        ("k = 2", 2.0),
        ("All uncertainties are expanded (k=2).", 2.0),
        ("coverage: 95 %", 1.96),
        ("coverage: 68.27 %", 1.0),
    ],
)
def test_coverage_as_people_state_it(comment, factor):
    assert facts(comment).values["coverage_factor"] == pytest.approx(factor, abs=1e-3)  # JCGM 100:2008, table G.1


@pytest.mark.parametrize(
    ("comment", "fact", "value"),
    [
        ("axes: x to the right, y positive downward", "axes", "x right, y down"),
        ("y axis: points down", "axes", "y down"),
        ("view: looking downstream", "view", "upstream"),
        ("seen from: downstream", "view", "downstream"),
    ],
)
def test_directions_as_people_state_them(comment, fact, value):
    assert facts(comment).values[fact] == value


def test_other_comments_stay_text_and_misspellings_are_asked_about():
    found = facts("operator: somebody", "measured on Monday", "temprature: 15 degC", "2021-03-04 12:30: windy")
    assert found.values == {"operator": "somebody", "temprature": "15 degC"}
    assert "did you mean 'temperature'?" in found.notes[0]


@pytest.mark.parametrize(
    ("comments", "message"),
    [
        (["temperature: 15"], "row 1: temperature"),
        (["temperature: 15 kPa"], "row 1: temperature"),
        (["temperature: warm"], "row 1: temperature"),
        (["orientation: sideways"], "orientation 'sideways' is not known; write one of surface, submerged, air"),
        (["axes: diagonal"], "write for example 'y down'"),
        (["velocity gain: 1.02 ± 0.01"], "1.02 is not 1; correct the velocities first"),
        (["coverage factor: 40"], "is not a coverage factor"),
        (["depth: 1 m", "depth: 2 m"], "row 2: 'depth: 2 m' contradicts row 1"),
        (["free stream: __import__('os') m/s"], "row 1: free stream"),
    ],
)
def test_refusals_name_the_row_and_the_fact(comments, message):
    with pytest.raises(SurveyError, match=message):
        facts(*comments)
