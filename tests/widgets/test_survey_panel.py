import json

import numpy as np
import pytest

from vortexwidgets.models.vortex import Vortex
from vortexwidgets.survey.instrument import Instrument
from vortexwidgets.survey.survey import Survey
from vortexwidgets.widgets.survey_panel import SurveyPanel, sample_numbers

VORTEX = Vortex("lamb-oseen", circulation=0.5, core_radius=0.01)


@pytest.fixture
def survey():
    return Survey.simulated(VORTEX, position=np.linspace(-0.05, 0.05, 15), noise=0.05, seed=3)


@pytest.fixture
def panel(survey):
    panel = SurveyPanel(survey, front_end="image")
    yield panel
    panel.close()


def test_a_click_sets_a_point_aside_and_another_puts_it_back(panel):
    panel.points.toggle(4)
    assert panel.survey.set_aside == {4: "set aside by hand"}
    panel.points.toggle(4)
    assert panel.survey.set_aside == {}


def test_a_survey_set_from_python_is_listed(panel, survey):
    panel.survey = survey.without([2, 3], reason="probe <touched> the wall")
    assert "probe &lt;touched&gt; the wall" in panel.points.list.value
    assert "2 set aside" in panel.summary.value


def test_the_figure_shows_the_survey_in_use(panel, survey):
    panel.points.toggle(7)
    assert 7 in panel.survey.set_aside


def test_samples_are_set_aside_by_number_with_a_reason(panel):
    panel.points.numbers.value = "3, 5-6"
    panel.points.reason.value = "seeding was thin"
    panel.points.set_aside()
    assert panel.survey.set_aside == dict.fromkeys((3, 5, 6), "seeding was thin")
    panel.points.numbers.value = "5"
    panel.points.put_back()
    assert sorted(panel.survey.set_aside) == [3, 6]
    panel.points.put_all_back()
    assert panel.survey.set_aside == {}


@pytest.mark.parametrize("typed", ["", "x", "5-3", "1.5", "3,-"])
def test_samples_that_are_no_numbers_are_refused(typed):
    with pytest.raises(ValueError, match="Samples are named by number"):
        sample_numbers(typed)


def test_a_refused_action_is_shown_and_changes_nothing(panel, survey):
    panel.points.numbers.value = "99"
    panel.state.reported(panel.points.set_aside)()
    assert "99" in panel.state.error
    assert "99" in panel.error_line.value
    assert panel.survey == survey


def test_the_controls_move_the_instrument(panel):
    panel.instrument_controls.wander.value = 0.0008
    panel.instrument_controls.averaging.dropdown.value = "square"
    assert panel.instrument == Instrument(wander=0.0008, averaging="square")


def test_the_instrument_moves_the_controls(panel):
    panel.instrument = Instrument(wander=0.002, probe_width=0.001, averaging="across")
    assert panel.instrument_controls.wander.value == 0.002
    assert panel.instrument_controls.probe_width.value == 0.001
    assert panel.instrument_controls.averaging.dropdown.value == "across"
    assert panel.instrument == Instrument(wander=0.002, probe_width=0.001, averaging="across")


def test_the_python_makes_the_same_survey(panel, survey):
    panel.points.toggle(2)
    panel.points.reason.value = "a gust"
    panel.points.toggle(9)
    panel.instrument = Instrument(wander=0.001)
    import vortexwidgets as vx

    names = {"vx": vx, "survey": survey}
    exec(panel.python, names)
    assert names["survey"] == panel.survey
    assert names["instrument"] == panel.instrument


def test_parameters_are_saved_and_loaded(panel, survey):
    panel.points.toggle(2)
    panel.instrument = Instrument(probe_width=0.003, averaging="across")
    text = panel.save_parameters()
    shown = panel.survey
    panel.reset()
    assert panel.survey == survey
    panel.load_parameters(text)
    assert panel.survey == shown
    assert panel.instrument == Instrument(probe_width=0.003, averaging="across")


@pytest.mark.parametrize(
    "text", ["", "{", "[]", "{}", json.dumps({"set_aside": {"0": "x"}, "instrument": {"wonder": 1}})]
)
def test_parameters_that_are_none_are_refused(panel, text):
    with pytest.raises(ValueError, match="Paste what 'Save' wrote"):
        panel.load_parameters(text)


def test_a_planar_survey_is_shown_as_a_plane():
    grid = np.linspace(-0.03, 0.03, 7)
    panel = SurveyPanel(Survey.simulated(VORTEX, x=grid, y=grid[:-1], noise=0.02), front_end="image")
    panel.points.toggle(3)
    assert panel.state.error == ""
    assert sorted(panel.survey.set_aside) == [3]
    panel.close()
