"""The dip: shape, volume, capillary limit, and the verdict on air at and around the intake."""

import math

import numpy as np
import pytest
from core_examples import NO_MODEL, core_of, rankine
from matplotlib.figure import Figure

from vortexwidgets.consequences import free_surface
from vortexwidgets.fluids import Fluid, Site, air, water
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.uncertainty import Contribution, Estimate

# Numbers to reckon with by hand: g = 10 m/s², a Rankine core of 1 m/s, so the dip is v²/g = 0.1 m.
LIQUID = Fluid("trial water", 290.0, 1e5, 1000.0, 1e-6, vapour_pressure=2e3, surface_tension=0.07)
VORTEX = rankine(1.0, 0.1)


def assessed(*, submergence=None, relative=0.0, bound=None, orientation="surface", fluid=LIQUID, vortex=VORTEX):
    site = Site(gravity=10.0, submergence=submergence, orientation=orientation)
    return free_surface.assess(core_of(vortex, fluid, relative=relative, bound=bound), fluid, site)


@pytest.mark.parametrize(
    ("submergence", "verdict"),
    [
        (0.1, "met"),  # the dip reaches the intake exactly
        (0.0999, "met"),
        (0.1001, "not decided"),  # short of it, but half the core radius would do
        (0.3999, "not decided"),
        (0.4, "not decided"),  # four times the dip reaches it exactly
        (0.4001, "not met"),
    ],
)
def test_at_just_below_and_just_above_the_intake(submergence, verdict):
    found = assessed(submergence=submergence)
    assert found.estimate.value == pytest.approx(0.1)
    assert found.verdict == verdict


@pytest.mark.parametrize(
    ("submergence", "verdict"),
    # Dip known to 10 %: 95 % interval from 0.0804 to 0.1196 m.
    [(0.0803, "met"), (0.0805, "not decided"), (0.4782, "not decided"), (0.4786, "not met")],
)
def test_inside_the_interval_it_is_not_decided(submergence, verdict):
    assert assessed(submergence=submergence, relative=0.1).verdict == verdict


def test_the_note_says_how_far_the_core_would_have_to_thin():
    """Dip 0.1 m, intake 2.5 m: the drop goes with 1/r_c², so r_c to √(0.1/2.5) = 20 %."""
    assert any("thin to 20 % of its radius" in note for note in assessed(submergence=2.5).notes)


def test_a_lower_bound_of_the_drop_leaves_it_open_unless_it_reaches_the_intake():
    assert assessed(submergence=0.0999, bound="lower").verdict == "met"
    found = assessed(submergence=5.0, bound="lower")
    assert (found.verdict, found.probability, found.estimate.bound) == ("not decided", None, "lower")


def test_the_density_cancels_and_the_rest_of_the_budget_stays():
    drop = Estimate(
        1000.0, 50.0, "core_pressure_drop", budget=(Contribution("scatter", 40.0), Contribution("density", 30.0))
    )
    site = Site(gravity=10.0, orientation="surface")
    found = free_surface.assess(core_of(VORTEX, LIQUID, drop=drop), LIQUID, site)
    assert found.estimate.uncertainty == pytest.approx(0.004)
    assert [part.name for part in found.estimate.budget] == ["scatter"]


def test_how_the_vortex_stands_to_the_surface_is_asked_for():
    found = assessed(orientation=None, submergence=0.01)
    assert (found.verdict, found.probability) == ("not decided", None)
    assert math.isnan(found.estimate.value)
    assert "give Site(orientation='surface')" in found.notes[0]


def test_a_submerged_vortex_has_no_dip():
    assert assessed(orientation="submerged", submergence=0.01) is None


def test_without_the_depth_of_the_intake_it_asks_for_it():
    found = assessed()
    assert found.verdict == "not decided"
    assert found.estimate.value == pytest.approx(0.1)
    assert any("Site(submergence=...)" in note for note in found.notes)


def test_without_a_model_nothing_is_decided():
    site = Site(orientation="surface", submergence=0.5)
    found = free_surface.assess(core_of(VORTEX, LIQUID, drop=NO_MODEL), LIQUID, site)
    assert found.verdict == "not decided"
    assert "no model fits" in found.notes[0]


def test_an_interval_that_reaches_zero_is_said():
    assert any("reaches zero" in note for note in assessed(relative=0.6).notes)


def test_there_is_no_surface_in_a_gas():
    fluid = air(15.0)
    assert free_surface.assess(core_of(VORTEX, fluid), fluid, Site(orientation="air")) is None


@pytest.mark.parametrize(("core_radius", "printed"), [(5e-3, 0.87), (10e-3, 0.22), (20e-3, 0.05)])
def test_capillary_rise_as_a_share_of_the_dip(core_radius, printed):
    """Lamb-Oseen of 0.05 m²/s in water at 15 °C; the ratio S ω0²/(2ρg²) over Δp/(ρg) recomputed by hand (derived)."""
    fluid = water(15.0)
    vortex = Vortex("lamb-oseen", circulation=0.05, core_radius=core_radius)
    share = free_surface.capillary_ratio(
        vortex, surface_tension=fluid.surface_tension.value, density=fluid.density.value
    )
    assert share == pytest.approx(printed, abs=0.005)


@pytest.mark.parametrize(("share", "given"), [(0.1999, True), (0.2001, False)])
def test_the_dip_is_refused_where_capillary_rise_exceeds_a_fifth_of_it(share, given):
    """Rankine: S ω0²/(2ρg²) / (v²/g) = 2S/(ρ g r_c²), with ω0 = 2v/r_c."""
    tension = share * 1000.0 * 10.0 * 0.1**2 / 2.0
    fluid = Fluid("trial", 290.0, 1e5, 1000.0, 1e-6, vapour_pressure=2e3, surface_tension=tension)
    found = assessed(fluid=fluid, submergence=0.01)
    assert found.detail("Capillary rise as a share of the dip").value == pytest.approx(share)
    assert (found.verdict == "met") is given
    assert math.isnan(found.estimate.value) is not given
    assert ("The dip is not given" in found.notes[0]) is not given


def test_without_surface_tension_the_note_says_it_was_not_checked():
    fluid = Fluid("trial", 290.0, 1e5, 1000.0, 1e-6, vapour_pressure=2e3)
    assert any("capillary rise is not checked" in note for note in assessed(fluid=fluid).notes)


def test_rise_from_the_axis_and_depth_from_afar_are_one_surface():
    for vortex in (VORTEX, Vortex("kaufmann", circulation=1.0, core_radius=0.05)):
        radius = np.array([0.0, 0.02, 0.1, 1.0])
        depth = free_surface.dip_depth(vortex, radius)
        rise = free_surface.surface_rise(vortex, radius)
        np.testing.assert_allclose(rise, depth[0] - depth, rtol=1e-9, atol=1e-15)


def test_the_volume_is_the_integral_of_the_shape():
    """Inside a Rankine core the surface is a paraboloid, half of the cylinder around it (by hand)."""
    rise = float(free_surface.surface_rise(VORTEX, 0.1))
    volume = free_surface.dip_volume(VORTEX, 0.1)
    assert volume == pytest.approx(0.5 * math.pi * 0.1**2 * rise, rel=1e-9)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: free_surface.dip_depth(VORTEX, -0.1), "radius must not be negative, got -0.1 m"),
        (lambda: free_surface.dip_depth(VORTEX, 0.1, gravity=0.0), "gravity must be positive, got 0 m/s²"),
        (lambda: free_surface.surface_rise(VORTEX, -1.0), "radius must not be negative, got -1 m"),
        (
            lambda: free_surface.surface_rise(Vortex("free", circulation=1.0), 1.0),
            "does not vanish on the axis .* use dip_depth at a radius",
        ),
        (
            lambda: free_surface.capillary_rise(VORTEX, surface_tension=0.07, density=0.0),
            "density must be positive, got 0 kg/m³",
        ),
        (lambda: free_surface.dip_of_swirl(1.0, pressure_constant=0.0), "pressure_constant must be positive, got 0"),
    ],
)
def test_refusals(call, message):
    with pytest.raises(ValueError, match=message):
        call()


@pytest.mark.parametrize(("submergence", "words"), [(0.2, "depth of the intake"), (2.0, "below this picture")])
def test_drawn_with_units_and_the_intake(submergence, words):
    axes = Figure().add_subplot()
    free_surface.draw(axes, assessed(submergence=submergence, relative=0.05))
    texts = [text.get_text() for text in (*axes.texts, *axes.get_legend().get_texts())]
    assert any(words in text for text in texts)
    assert axes.get_xlabel().endswith("[mm]")
    assert axes.get_ylabel() == "height above the still level [mm]"
