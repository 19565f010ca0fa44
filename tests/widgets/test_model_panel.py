import json
import math

import numpy as np
import pytest

import vortexwidgets as vx
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.widgets.model_panel import ModelPanel


@pytest.fixture
def panel():
    panel = ModelPanel(Vortex("lamb-oseen", circulation=2.4, core_radius=0.012), density=998.0, front_end="image")
    yield panel
    panel.close()


def swirl_line(panel):
    """The curve in the axes of the swirl."""
    return panel.figure.plot.artists[0].get_ydata()


def test_the_controls_move_the_vortex(panel):
    panel.controls.numbers["core_radius"].value = 0.02
    panel.controls.numbers["circulation"].value = -1.0
    assert panel.vortex == Vortex("lamb-oseen", circulation=-1.0, core_radius=0.02)


def test_the_vortex_moves_the_controls(panel):
    panel.vortex = Vortex("lamb-oseen", circulation=3.5, core_radius=7.0)
    assert panel.controls.numbers["circulation"].value == 3.5
    assert panel.controls.numbers["core_radius"].value == 7.0
    assert panel.vortex.core_radius == 7.0


def test_one_turn_is_one_change_of_the_vortex(panel):
    events = []
    panel.state.observe(events.append, "vortex")
    panel.controls.numbers["core_radius"].value = 0.02
    assert len(events) == 1


def test_the_plot_shows_the_vortex(panel):
    before = np.array(swirl_line(panel), copy=True)
    panel.controls.numbers["circulation"].value = 4.8
    after = np.asarray(swirl_line(panel))
    assert np.nanmax(abs(after)) == pytest.approx(2 * np.nanmax(abs(before)), rel=1e-6)  # swirl is proportional to Γ


def test_the_readouts_are_those_of_the_vortex(panel):
    # Lamb-Oseen: the swirl peaks at 1.12091 core radii (root of exp(s) = 1 + 2 s, s = x²)
    peak = 0.012 * math.sqrt(1.2564312086)
    assert f"{1e3 * peak:.2f}" in panel.readouts.value
    assert "peak swirl" in panel.readouts.value


def test_another_model_brings_its_own_controls(panel):
    panel.controls.model.dropdown.value = "vatistas"
    assert panel.state.error == ""
    assert list(panel.controls.numbers) == ["circulation", "core_radius", "exponent"]
    panel.controls.numbers["exponent"].value = 3.0
    assert panel.vortex == Vortex("vatistas", circulation=2.4, core_radius=0.012, exponent=3.0)


@pytest.mark.parametrize("model", ["free", "forced", "taylor", "rankine", "kaufmann", "burgers"])
def test_every_kind_of_model_can_be_chosen_and_left_again(panel, model):
    panel.controls.model.dropdown.value = model
    assert panel.state.error == ""
    assert panel.vortex.model.key == model
    panel.controls.model.dropdown.value = "lamb-oseen"
    assert panel.state.error == ""
    assert panel.vortex.model.key == "lamb-oseen"


def test_the_python_makes_the_same_vortex(panel):
    panel.controls.model.dropdown.value = "vatistas"
    panel.controls.numbers["circulation"].value = 0.1 + 0.2
    names = {"vx": vx}
    exec(panel.python, names)
    assert names["vortex"] == panel.vortex
    assert panel.python in panel.python_line.value.replace("&quot;", '"').replace("&#x27;", "'")


def test_parameters_are_saved_loaded_and_reset(panel):
    start = panel.vortex
    panel.vortex = Vortex("vatistas", circulation=1.0, core_radius=0.05, exponent=2.5)
    panel.density.value = 1025.0
    text = panel.save_parameters()
    panel.reset()
    assert panel.vortex == start
    assert panel.density.value == 998.0
    panel.load_parameters(text)
    assert panel.vortex == Vortex("vatistas", circulation=1.0, core_radius=0.05, exponent=2.5)
    assert panel.state.density == 1025.0


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("{", "not JSON"),
        ("[1]", "names a"),
        ('{"circulation": 1}', "names a"),
        (json.dumps({"model": "rankin", "circulation": 1, "core_radius": 1}), "rankine"),
        (json.dumps({"model": "rankine", "circulation": "1", "core_radius": 1}), "must be a number"),
        (json.dumps({"model": "rankine", "circulation": 1, "core_radius": -1}), "must be positive"),
    ],
)
def test_parameters_that_are_none_are_refused_in_the_panel(panel, text, sentence):
    start = panel.vortex
    panel.text.area.value = text
    panel.text.children[1].children[1].click()
    assert sentence in panel.state.error
    assert panel.vortex == start


def test_an_error_of_a_callback_is_shown(panel, monkeypatch):
    def fail(*_):
        raise ZeroDivisionError("no luck")

    monkeypatch.setattr(panel.figure.plot, "update", fail)
    panel.controls.numbers["core_radius"].value = 0.03
    assert "ZeroDivisionError: no luck" in panel.error_line.value
    assert panel.error_line.layout.display is None


def test_derivation_and_agreement_are_made_when_they_are_opened(panel):
    assert panel.steps.value == ""
    derivation, agreement = panel.children[-3:-1]
    derivation.selected_index = 0
    agreement.selected_index = 0
    assert panel.state.error == ""
    assert "$$" in panel.steps.value
    assert "<table" in panel.agreement.value


def test_the_panel_brings_a_picture_for_readers_without_a_kernel(panel):
    data, _ = panel.freeze()._repr_mimebundle_()
    assert "image/png" in data


def test_closing_closes_every_widget(panel):
    import ipywidgets

    before = set(ipywidgets.Widget._instances) if hasattr(ipywidgets.Widget, "_instances") else set()
    other = ModelPanel("rankine", front_end="image")
    other.close()
    if hasattr(ipywidgets.Widget, "_instances"):
        left = set(ipywidgets.Widget._instances) - before
        kinds = {type(ipywidgets.Widget._instances[name]).__name__ for name in left}
        assert kinds <= {
            "Layout",
            "HTMLStyle",
            "HTMLMathStyle",
            "TextStyle",
            "SliderStyle",
            "DescriptionStyle",
            "ButtonStyle",
        }
