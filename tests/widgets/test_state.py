import subprocess
import sys

import pytest

from vortexwidgets.models.vortex import Vortex
from vortexwidgets.widgets.state import JobState, PanelState, VortexState, sentence_of


def test_an_exception_of_a_callback_becomes_the_error():
    state = PanelState()
    callback = state.reported(lambda: 1 / 0)
    callback()
    assert state.error.startswith("ZeroDivisionError: division by zero (test_state.py, line ")


def test_the_next_action_that_goes_well_clears_the_error():
    state = PanelState(error="something was wrong")
    state.reported(lambda: None)()
    assert state.error == ""


def test_a_sentence_of_the_package_is_shown_as_it_is():
    from vortexwidgets.widgets.canvas import LiveFigure

    state = PanelState()
    state.reported(lambda: LiveFigure(None, front_end="paper"))()
    assert state.error == "front_end must be 'auto', 'canvas' or 'image', got 'paper'."


def test_an_exception_without_words_is_named():
    assert sentence_of(RuntimeError()) == "RuntimeError: no message"


def test_progress_is_said_while_the_work_lasts_and_no_longer():
    state = PanelState()
    seen = []
    state.observe(lambda change: seen.append(change.new), "progress")
    with pytest.raises(ValueError, match="broken off"), state.working("Ranking the models …"):
        raise ValueError("broken off")
    assert seen == ["Ranking the models …", ""]


def test_the_state_needs_no_toolkit():
    code = (
        "import sys, vortexwidgets.widgets.state; sys.exit('ipywidgets' in sys.modules or 'matplotlib' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_an_action_that_goes_well_does_not_hide_the_error_of_what_it_set_off():
    state = VortexState(vortex=Vortex("rankine", circulation=1.0, core_radius=1.0))
    state.observe(state.showing(lambda: 1 / 0), "vortex")
    state.reported(lambda: state.change(core_radius=2.0))()
    assert state.error.startswith("ZeroDivisionError")


def test_a_defect_of_the_package_is_named_as_one():
    state = VortexState(vortex=Vortex("rankine", circulation=1.0, core_radius=1.0))
    state.reported(lambda: state.change(**{5: 1.0}))()
    assert state.error.startswith("TypeError")


def test_an_appraisal_is_forgotten_when_its_input_changes():
    state = JobState(appraisal="the old one")
    state.models = ("rankine",)
    assert state.appraisal is None
