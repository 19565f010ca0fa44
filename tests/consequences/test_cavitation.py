"""Cavitation: numbers, verdicts at and around the criterion, what is said when something is missing."""

import dataclasses
import math

import pytest
from core_examples import NO_MODEL, core_of, rankine
from matplotlib.figure import Figure

from vortexwidgets.consequences import cavitation
from vortexwidgets.fluids import Fluid, Site, air
from vortexwidgets.uncertainty import Estimate

# Numbers to reckon with by hand: p_v = 2 kPa, ρ = 1000 kg/m³, a Rankine core of 10 m/s, so Δp = ρv² = 100 kPa.
LIQUID = Fluid(
    "trial water", temperature=290.0, pressure=1e5, density=1000.0, kinematic_viscosity=1e-6, vapour_pressure=2e3
)
VORTEX = rankine(10.0, 0.01)
CRITICAL = 102e3  # ambient pressure at which it cavitates: p_v + Δp


def assessed(ambient, *, site=None, relative=0.0, bound=None, fluid=LIQUID, vortex=VORTEX):
    site = site if site is not None else Site(ambient_pressure=ambient)
    core = core_of(vortex, fluid, ambient=site.axis_pressure(fluid), relative=relative, bound=bound)
    return cavitation.assess(core, fluid, site)


@pytest.mark.parametrize(("above", "verdict"), [(0.0, "met"), (-1e-3, "met"), (1e-3, "not met")])
def test_at_just_below_and_just_above_inception(above, verdict):
    found = assessed(CRITICAL + above)
    assert found.verdict == verdict
    assert found.estimate.value == pytest.approx(above, abs=1e-9)
    assert found.probability == (1.0 if verdict == "met" else 0.0)


@pytest.mark.parametrize(
    ("above", "verdict"),
    # Drop known to 1 %: 1 kPa, and 1.96 kPa bounds the 95 % interval.
    [(-1.97e3, "met"), (-1.95e3, "not decided"), (0.0, "not decided"), (1.95e3, "not decided"), (1.97e3, "not met")],
)
def test_inside_the_interval_it_is_not_decided(above, verdict):
    found = assessed(CRITICAL + above, relative=0.01)
    assert found.verdict == verdict
    assert found.probability == pytest.approx(0.5 * math.erfc(above / 1e3 / math.sqrt(2.0)), abs=1e-9)


def test_the_verdict_is_that_of_the_cavitation_number():
    """σ ≤ -C_p,min exactly where the pressure margin is not positive, whatever the speed."""
    for above in (-5e3, 5e3):
        site = Site(ambient_pressure=CRITICAL + above, speed=12.0, speed_name="nD")
        found = assessed(None, site=site)
        sigma = found.detail("Cavitation number σ (nD)").value
        inception = found.detail("Inception number of this vortex (nD)").value
        assert (sigma <= inception) == (found.verdict == "met")
        assert sigma == pytest.approx((100e3 + above) / 72e3)  # ½ρU² = 72 kPa
        assert inception == pytest.approx(100e3 / 72e3)


def test_no_speed_is_needed_and_the_note_says_what_it_adds():
    found = assessed(CRITICAL + 1.0)
    assert found.verdict == "not met"
    assert any("speed_name" in note and "adds σ" in note for note in found.notes)


def test_tensile_strength_lowers_the_critical_pressure():
    """T = 5 kPa: inception at p_v - T, so 5 kPa lower."""
    for above, verdict in ((-5e3, "met"), (-4.999e3, "not met")):
        assert assessed(None, site=Site(ambient_pressure=CRITICAL + above, tensile_strength=5e3)).verdict == verdict
    assert any("bear none" in note for note in assessed(CRITICAL).notes)


def test_the_budget_names_every_input():
    site = Site(ambient_pressure=(150e3, 300.0), tensile_strength=(1e3, 400.0))
    fluid = Fluid("trial", 290.0, 1e5, 1000.0, 1e-6, vapour_pressure=(2e3, 100.0))
    found = assessed(None, site=site, relative=0.01, fluid=fluid)
    shares = {part.name: part.uncertainty for part in found.estimate.budget}
    assert shares == pytest.approx(
        {"core pressure drop": 1e3, "reference pressure": 300.0, "vapour pressure": 100.0, "tensile strength": 400.0}
    )
    assert found.estimate.uncertainty == pytest.approx(math.sqrt(1e6 + 9e4 + 1e4 + 16e4))


def test_a_lower_bound_of_the_drop_leaves_it_open_unless_it_already_cavitates():
    """The margin is then an upper limit, with the reference pressure at the upper end of its own 95 % interval."""
    found = assessed(None, site=Site(ambient_pressure=(CRITICAL - 1e3, 400.0)), bound="lower")
    assert (found.verdict, found.estimate.bound) == ("met", "upper")
    assert found.estimate.value == pytest.approx(-1e3 + 1.95996 * 400.0, abs=0.1)
    found = assessed(None, site=Site(ambient_pressure=(CRITICAL - 700.0, 400.0)), bound="lower")
    assert (found.verdict, found.probability) == ("not decided", None)
    assert any("leaves the core open" in note and "in its size or its shape" in note for note in found.notes)


OPEN_SHAPE, OPEN_SIZE, MISSED = "more samples in and around the core", "measure nearer to the axis", "second component"


@pytest.mark.parametrize(
    ("core_radius", "missed", "highest", "said"),
    [
        (Estimate(0.01, 1e-4, "core_radius"), False, math.inf, [OPEN_SHAPE]),
        (Estimate(0.02, math.nan, "core_radius", bound="upper"), False, math.inf, [OPEN_SIZE]),
        (Estimate(0.01, 1e-4, "core_radius"), True, 100e3, [MISSED]),
        (Estimate(0.01, 1e-4, "core_radius"), True, math.inf, [MISSED, OPEN_SHAPE]),
        (Estimate(0.02, math.nan, "core_radius", bound="upper"), True, math.inf, [MISSED, OPEN_SIZE]),
    ],
)
@pytest.mark.parametrize("reference", [True, False])
def test_a_bound_says_what_leaves_the_drop_open_and_nothing_else(core_radius, missed, highest, said, reference):
    """A core whose shape is open may be well surveyed, so only an open size asks for stations nearer to the axis."""
    ambient = Estimate(150e3, 0.0, "ambient_pressure") if reference else None
    core = dataclasses.replace(
        core_of(VORTEX, LIQUID, ambient=ambient, bound="lower", missed_axis=missed),
        core_radius=core_radius,
        envelope=(90e3, highest),
    )
    for site in (Site(), Site(ambient_pressure=150e3)):  # without the core's own, the last station is the reference
        notes = " ".join(cavitation.assess(core, LIQUID, site).notes)
        assert [words for words in (MISSED, OPEN_SHAPE, OPEN_SIZE) if words in notes] == said


def test_a_criterion_inside_the_interval_is_said_first():
    assert "inside the 95 % interval" in assessed(CRITICAL, relative=0.01).notes[0]
    assert not any("inside the 95 % interval" in note for note in assessed(2.0 * CRITICAL, relative=0.01).notes)


def test_a_submerged_vortex_is_told_that_it_makes_no_dip():
    found = assessed(None, site=Site(ambient_pressure=CRITICAL, orientation="submerged"))
    assert any("draws air only if it connects with the surface" in note for note in found.notes)
    assert not any("draws air" in note for note in assessed(CRITICAL).notes)


def test_an_upper_limit_of_the_pressure_does_not_rule_gas_out():
    found = assessed(None, site=Site(ambient_pressure=CRITICAL + 200e3, gas_saturation=1.0), bound="lower")
    assert any("may lie below the 101.3 kPa" in note for note in found.notes)


def test_a_missed_axis_is_named():
    core = core_of(VORTEX, LIQUID, ambient=Estimate(150e3, 0.0, "ambient_pressure"), bound="lower", missed_axis=True)
    found = cavitation.assess(core, LIQUID, Site(ambient_pressure=150e3))
    assert any("missed the axis" in note and "second component" in note for note in found.notes)


def test_a_drop_relative_to_the_last_station_is_a_least_drop():
    core = core_of(VORTEX, LIQUID, ambient=None, relative=0.01)
    found = cavitation.assess(core, LIQUID, Site(ambient_pressure=CRITICAL + 1e3))
    assert (found.verdict, found.estimate.bound) == ("not decided", "upper")
    assert any("relative to the last station" in note for note in found.notes)


def test_without_a_reference_pressure_the_pressure_that_would_do_it_is_given():
    found = assessed(None, site=Site(), relative=0.01)
    assert (found.verdict, found.probability) == ("not decided", None)
    assert math.isnan(found.estimate.value)
    assert found.detail("Pressure far away at which it would cavitate").value == pytest.approx(CRITICAL)
    assert "Site(ambient_pressure=...)" in found.notes[0]


def test_without_a_model_nothing_is_decided():
    core = core_of(VORTEX, LIQUID, ambient=Estimate(150e3, 0.0, "ambient_pressure"), drop=NO_MODEL)
    found = cavitation.assess(core, LIQUID, Site(ambient_pressure=150e3))
    assert (found.verdict, found.probability) == ("not decided", None)
    assert "no model fits" in found.notes[0]


def test_gas_content_says_whether_a_gas_core_can_show():
    """Saturated water is in equilibrium with the atmosphere, 101 325 Pa, whatever the vapour pressure (Henry's law)."""
    lean = assessed(None, site=Site(ambient_pressure=CRITICAL + 50e3, gas_saturation=1.0))
    assert lean.detail("Pressure below which dissolved gas can come out").value == pytest.approx(101325.0)
    assert any("gaseous cavitation" in note for note in lean.notes)
    far = assessed(None, site=Site(ambient_pressure=CRITICAL + 200e3, gas_saturation=1.0))
    assert any("above the 101.3 kPa" in note for note in far.notes)


@pytest.mark.parametrize(("inception", "words"), [("incipient", "at or below"), ("desinent", "at or above")])
def test_incipient_and_desinent_are_told_apart(inception, words):
    found = assessed(None, site=Site(ambient_pressure=CRITICAL, inception=inception))
    assert any(f"observed {inception} number lies {words}" in note for note in found.notes)
    assert any("Neither incipient nor desinent" in note for note in assessed(CRITICAL).notes)


def test_a_gas_does_not_cavitate():
    fluid = air(15.0)
    assert cavitation.assess(core_of(VORTEX, fluid), fluid, Site()) is None


@pytest.mark.parametrize(
    ("density", "speed", "message"),
    [(0.0, 10.0, r"density must be positive, got 0 kg/m³"), (1000.0, 0.0, r"speed must be positive, got 0 m/s")],
)
def test_refusals(density, speed, message):
    with pytest.raises(ValueError, match=message):
        cavitation.inception_number(1e3, density=density, speed=speed)


@pytest.mark.parametrize("bound", [None, "lower"])
def test_drawn_with_units_and_the_critical_line(bound):
    axes = Figure().add_subplot()
    cavitation.draw(axes, assessed(CRITICAL, relative=0.0 if bound else 0.05, bound=bound))
    assert axes.get_xlabel() == "distance from the axis [mm]"
    assert axes.get_ylabel() == "absolute pressure [kPa]"
    assert any(line.get_ydata()[0] == 2e3 for line in axes.lines)


def test_what_is_missing_is_said_in_the_picture():
    axes = Figure().add_subplot()
    cavitation.draw(axes, assessed(None, site=Site()))
    assert "ambient_pressure" in axes.texts[0].get_text()
