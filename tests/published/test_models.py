"""Numbers about vortex models that are printed elsewhere, through public functions.

Provenance: "opened" was read in the source, "second-hand" where somebody quotes it, "from memory" is what it says, and
"derived" means that the formula is published and its number is our own arithmetic. The tolerance is half a unit of the
last digit printed.
"""

import math

import pytest

import vortexwidgets as vx
from vortexwidgets.models.catalogue import MODELS

UNIT = {"circulation": 2.0 * math.pi, "core_radius": 1.0}  # V = 1 m/s at r_c = 1 m


def test_lamb_oseen_alpha():
    """Devenport et al., J. Fluid Mech. 312 (1996) 67-106: α = 1.25643 (quoted second-hand)."""
    assert vx.Vortex("lamb-oseen", **UNIT).peak_radius ** 2 == pytest.approx(1.25643, abs=5e-6)


def test_lamb_oseen_peak_swirl():
    """v_peak = 0.715 Γ/(2π r_peak) (derived: 1 - exp(-α), α of Devenport et al. 1996)."""
    vortex = vx.Vortex("lamb-oseen", **UNIT)
    assert vortex.peak_swirl * vortex.peak_radius == pytest.approx(0.715, abs=5e-4)


def test_lamb_oseen_growth_of_the_peak_radius():
    """r_peak = 2.24 √(νt), the laminar growth law as wake-vortex texts print it (derived)."""
    point = vx.Vortex("lamb-oseen", circulation=1.0, core_radius=1e-12)
    assert point.grown(viscosity=1e-6, time=100.0).peak_radius / math.sqrt(1e-4) == pytest.approx(2.24, abs=5e-3)


@pytest.mark.parametrize(
    ("key", "shape", "constant", "tolerance"),
    [
        (
            "rankine",
            {},
            1.0,
            1e-12,
        ),  # half inside and half outside the core (derived; US NRC RG 1.76 uses it, from memory)
        ("kaufmann", {}, 2.0, 1e-9),  # Scully, Burnham-Hallock (derived)
        ("vatistas", {"exponent": 1.0}, 2.0, 1e-9),  # n = 1 is Kaufmann (derived)
        ("vatistas", {"exponent": 2.0}, 1.570796327, 1e-9),  # π/2 (derived)
        ("lamb-oseen", {}, 1.702, 5e-4),  # ln 2 over the square of the peak (derived)
        ("burgers", {}, 1.702, 5e-4),
        ("taylor", {}, 1.3591409142295225, 1e-12),  # e/2 (derived)
    ],
)
def test_pressure_constant(key, shape, constant, tolerance):
    """K in p∞ - p(0) = K ρ v_peak²."""
    strength = "circulation" if MODELS[key].strength == "circulation" else "swirl_scale"
    vortex = vx.Vortex(key, core_radius=0.03, **{strength: -1.7}, **shape)
    assert vortex.pressure_constant == pytest.approx(constant, abs=tolerance)
    drop = float(vortex.pressure_drop(0.0, density=1.2))
    assert drop / (1.2 * vortex.peak_swirl**2) == pytest.approx(constant, abs=tolerance)


@pytest.mark.parametrize(
    ("key", "shape", "drop"),
    [
        ("rankine", {}, 1 / (4 * math.pi**2)),
        ("kaufmann", {}, 1 / (8 * math.pi**2)),
        ("vatistas", {"exponent": 2.0}, 1 / (16 * math.pi)),
        ("lamb-oseen", {}, math.log(2) / (4 * math.pi**2)),
    ],
)
def test_core_deficit_in_terms_of_the_circulation(key, shape, drop):
    """Core deficit over ρΓ²/r_c² (derived from the published profiles)."""
    vortex = vx.Vortex(key, circulation=3.0, core_radius=0.2, **shape)
    assert float(vortex.pressure_drop(0.0, density=998.0)) == pytest.approx(drop * 998.0 * 9.0 / 0.04, rel=1e-13)


def test_every_published_peak_and_constant_of_the_catalogue_has_a_source():
    for model in MODELS.values():
        if model.published_peak is not None:
            assert model.published_source
