"""Verdicts, scaling and the registry."""

import math

import pytest
from matplotlib.figure import Figure

from vortexwidgets import consequences
from vortexwidgets.consequences.consequence import Consequence, Criterion, decide, draw_sentence, scaled
from vortexwidgets.uncertainty import Contribution, Estimate

CRITERION = Criterion("Something reached", "common practice")


def consequence(**changes):
    given = {
        "name": "Trial",
        "question": "Does it?",
        "estimate": Estimate(1.0, 0.1, "dip_depth"),
        "criterion": CRITERION,
        "verdict": "met",
        "probability": 0.99,
        "source": "by hand",
        "caution": "None.",
    }
    return Consequence(**{**given, **changes})


@pytest.mark.parametrize(
    ("value", "side", "verdict"),
    [
        (10.0, "at or below", "met"),
        (10.0, "at or above", "met"),
        (math.nextafter(10.0, 0.0), "at or below", "met"),
        (math.nextafter(10.0, 0.0), "at or above", "not met"),
        (math.nextafter(10.0, 20.0), "at or below", "not met"),
        (math.nextafter(10.0, 20.0), "at or above", "met"),
    ],
)
def test_an_exact_value_at_just_below_and_just_above_its_criterion(value, side, verdict):
    assert decide(Estimate(value), 10.0, met_when=side) == (verdict, 1.0 if verdict == "met" else 0.0)


@pytest.mark.parametrize(
    ("deviates", "verdict"),
    # 1.95996 standard deviations bound 95 % of a normal distribution (any table).
    [(1.9599, "not decided"), (1.9600, "not met"), (-1.9599, "not decided"), (-1.9600, "met")],
)
def test_the_criterion_inside_the_interval_is_not_decided(deviates, verdict):
    found, probability = decide(Estimate(10.0 + 2.0 * deviates, 2.0), 10.0, met_when="at or below")
    assert found == verdict
    assert probability == pytest.approx(0.5 * math.erfc(deviates / math.sqrt(2.0)), abs=1e-12)


@pytest.mark.parametrize(
    ("bound", "value", "side", "expected"),
    [
        ("lower", 11.0, "at or above", ("met", 1.0)),
        ("lower", 9.0, "at or above", ("not decided", None)),
        ("lower", 11.0, "at or below", ("not met", 0.0)),
        ("upper", 9.0, "at or below", ("met", 1.0)),
        ("upper", 11.0, "at or below", ("not decided", None)),
        ("upper", 9.0, "at or above", ("not met", 0.0)),
    ],
)
def test_a_bound_decides_only_on_its_safe_side(bound, value, side, expected):
    assert decide(Estimate(value, math.nan, bound=bound), 10.0, met_when=side) == expected


def test_nothing_known_is_not_decided():
    assert decide(Estimate(math.nan, math.nan), 10.0, met_when="at or below") == ("not decided", None)
    assert decide(Estimate(9.0, math.nan), 10.0, met_when="at or below") == ("not decided", None)


def test_scaling_keeps_the_budget_and_takes_off_what_cancels():
    drop = Estimate(
        100.0, 5.0, "core_pressure_drop", budget=(Contribution("scatter", 4.0), Contribution("density", 3.0))
    )
    half = scaled(drop, 0.5, "dip_depth", without="density")
    assert (half.value, half.uncertainty, half.quantity) == (50.0, pytest.approx(2.0), "dip_depth")
    assert half.budget == (Contribution("scatter", 2.0),)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"verdict": "perhaps"}, "A verdict is 'met', 'not met' or 'not decided', got 'perhaps'"),
        ({"probability": 1.2}, "A probability lies between 0 and 1, got 1.2"),
    ],
)
def test_refusals(changes, message):
    with pytest.raises(ValueError, match=message):
        consequence(**changes)


def test_details_and_curves_by_name():
    one = consequence(details=(("Depth", Estimate(2.0)),), curves=(("radius", (0.0, 1.0)),))
    assert one.detail("Depth").value == 2.0
    assert one.curve("radius").tolist() == [0.0, 1.0]
    assert one.curve("nothing").size == 0
    with pytest.raises(KeyError, match="Trial has no detail 'Width'; it has Depth"):
        one.detail("Width")
    assert one == consequence(details=(("Depth", Estimate(2.0)),), curves=(("radius", (0.0, 1.0)),))
    assert hash(one)


def test_printed_with_verdict_probability_caution_and_sources():
    text = str(consequence(notes=("A note.",)))
    for part in ("Trial: 1.00 ± 0.10 m", "Something reached: met (probability 0.99)", "A note.", "None.", "by hand"):
        assert part in text


def test_every_file_with_an_assess_is_found_in_a_stable_order():
    names = [module.NAME for module in consequences.all_consequences()]
    assert names == [module.NAME for module in consequences.all_consequences()]
    assert {"Cavitation", "Free-surface dip", "Wind"} <= set(names)
    assert len(set(names)) == len(names)


def test_a_consequence_of_an_unknown_name_is_not_drawn():
    with pytest.raises(ValueError, match="No file draws a consequence named 'Trial'; known are Cavitation"):
        consequences.draw(Figure().add_subplot(), consequence())


def test_what_is_missing_is_drawn_as_a_sentence():
    axes = Figure().add_subplot()
    draw_sentence(axes, consequence(notes=("Give the depth.",)))
    assert [text.get_text() for text in axes.texts] == ["Give the depth."]
