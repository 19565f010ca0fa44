import math

import pytest

from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.uncertainty import Estimate
from vortexwidgets.widgets.controls import NumberControl, QuantityField, Scale


@pytest.fixture
def core_radius():
    control = NumberControl(Scale.of_quantity("core_radius"), 0.012)
    yield control
    control.close()


def typed(control, text):
    """Type a text into the field, as the browser reports it after Enter."""
    control.field.set_state({"value": text})


def dragged(control, position):
    control.slider.set_state({"value": position})


def test_the_number_moves_the_slider_and_the_field(core_radius):
    core_radius.value = 0.025
    assert core_radius.slider.value * core_radius.scale.factor == pytest.approx(0.025, rel=0.02)  # the nearest step
    assert Scale.of_quantity("core_radius").read(core_radius.field.value) == 0.025


def test_the_slider_moves_the_number_and_the_field(core_radius):
    dragged(core_radius, 0.02 / core_radius.scale.factor)
    assert core_radius.value == pytest.approx(0.02, rel=1e-3)
    assert Scale.of_quantity("core_radius").read(core_radius.field.value) == core_radius.value


def test_the_step_that_the_browser_reports_back_does_not_replace_an_exact_number(core_radius):
    typed(core_radius, "1.2345678 mm")
    dragged(core_radius, core_radius.slider.value * (1 + 1e-12))
    assert core_radius.value == pytest.approx(1.2345678e-3, rel=1e-15)


def test_one_drag_is_one_event(core_radius):
    events = []
    core_radius.observe(events.append, "value")
    dragged(core_radius, 0.02 / core_radius.scale.factor)
    assert len(events) == 1


@pytest.mark.parametrize(
    ("text", "metres"),
    [
        ("1.5 mm", 0.0015),
        ("1,5 mm", 0.0015),
        ("1e-6 m", 1e-6),
        ("0.5 ft", 0.1524),  # 1 ft = 0.3048 m: NIST SP 811 (2008), Appendix B
        ("1.23456789 m", 1.23456789),
    ],
)
def test_a_typed_number_is_kept_exactly(core_radius, text, metres):
    typed(core_radius, text)
    assert core_radius.value == pytest.approx(metres, rel=1e-15)
    assert core_radius.refusal.layout.display == "none"


def test_a_number_without_a_unit_is_in_the_unit_shown(core_radius):
    typed(core_radius, "1,5")
    assert core_radius.value == pytest.approx(1.5 * core_radius.scale.factor, rel=1e-15)


@pytest.mark.parametrize("text", ["abc", "1,5,0", "-3 mm", "5 kg", "__import__('os')", "nan", "", "3 ± 1 mm"])
def test_what_cannot_be_read_is_answered_and_changes_nothing(core_radius, text):
    typed(core_radius, text)
    assert core_radius.value == 0.012
    assert core_radius.refusal.layout.display is None
    assert len(core_radius.refusal.value) > 40


def test_the_answer_goes_when_the_number_is_right_again(core_radius):
    typed(core_radius, "abc")
    typed(core_radius, "12 mm")
    assert core_radius.refusal.value == ""


def test_what_was_typed_is_escaped(core_radius):
    typed(core_radius, "<script>alert(1)</script>")
    assert "<script>" not in core_radius.refusal.value


@pytest.mark.parametrize("metres", [1e-9, 5000.0])
def test_the_slider_widens_and_never_clamps(core_radius, metres):
    core_radius.value = metres
    assert core_radius.value == metres
    assert core_radius.slider.value * core_radius.scale.factor == pytest.approx(metres, rel=0.02)
    typed(core_radius, f"{2 * metres!r} m")
    assert core_radius.value == 2 * metres


def test_a_negative_number_keeps_its_sign_when_it_is_dragged():
    control = NumberControl(Scale.of_quantity("circulation"), -2.0)
    dragged(control, 3.0 / control.scale.factor)
    assert control.value == pytest.approx(-3.0, rel=1e-3)


def test_zero_is_kept_although_no_factor_leads_there():
    control = NumberControl(Scale.of_quantity("wander"), 0.0)
    assert control.value == 0.0
    typed(control, "0.8 mm")
    assert control.value == pytest.approx(0.0008, rel=1e-15)
    typed(control, "0")
    assert control.value == 0.0


def test_a_wide_range_slides_by_factors_and_a_narrow_one_by_steps():
    assert Scale.of_quantity("core_radius").is_logarithmic
    assert not Scale.of_shape(MODELS["vatistas"].shape[0]).is_logarithmic


def test_a_shape_parameter_is_refused_outside_its_range():
    scale = Scale.of_shape(MODELS["vatistas"].shape[0])
    assert scale.read("2,5") == 2.5
    with pytest.raises(ValueError, match="must lie between"):
        scale.read("-1")


def test_the_label_says_name_and_symbol():
    assert Scale.of_quantity("core_radius").label.startswith("core radius")


def test_a_field_keeps_the_uncertainty():
    field = QuantityField("ambient_pressure")
    typed(field, "101.3 ± 0.2 kPa")
    assert isinstance(field.value, Estimate)
    assert field.value.value == pytest.approx(101300.0)
    assert field.value.uncertainty == pytest.approx(200.0)


def test_a_field_shows_what_it_is_given_and_reads_it_back():
    field = QuantityField("temperature")
    field.value = 288.15
    assert "15" in field.field.value
    typed(field, "59 degF")
    assert float(getattr(field.value, "value", field.value)) == pytest.approx(288.15)


def test_an_emptied_field_is_not_stated():
    field = QuantityField("depth", 1.2)
    typed(field, " ")
    assert field.value is None


def test_a_field_answers_a_wrong_unit():
    field = QuantityField("depth", 1.2)
    typed(field, "3 kPa")
    assert field.value == 1.2
    assert "kPa" in field.refusal.value


def test_not_a_number_has_no_place_on_a_slider():
    control = NumberControl(Scale.of_quantity("circulation"), 1.0)
    control.value = math.inf
    assert control.slider.value == pytest.approx(1.0, rel=0.02)
