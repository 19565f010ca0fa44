"""A model with numbers: validated once, equal by value, and right in SI units."""

import copy
import dataclasses
import math
import pickle

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import vortexwidgets as vx
from vortexwidgets.models.catalogue import MODELS

TWO_PI = 2.0 * math.pi
FITTED = [key for key, model in MODELS.items() if model.ranked]


def make(key, strength=2.4, core_radius=0.012, **more):
    model = MODELS[key]
    numbers = {model.strength: strength, **more}
    if model.has_core:
        numbers["core_radius"] = core_radius
    return vx.Vortex(key, **numbers)


# Numbers by hand, from the closed forms of the literature -----------------------------------------------------------


def test_rankine_in_si_units():
    vortex = vx.Vortex("rankine", circulation=0.5, core_radius=0.02)
    edge = 0.5 / (TWO_PI * 0.02)  # m/s
    assert vortex.peak_radius == 0.02
    assert vortex.peak_swirl == pytest.approx(edge, rel=1e-15)
    np.testing.assert_allclose(vortex.swirl([0.0, 0.01, 0.02, 0.04]), [0.0, edge / 2, edge, edge / 2], rtol=1e-15)
    np.testing.assert_allclose(vortex.vorticity([0.0, 0.01, 0.05]), [2 * edge / 0.02, 2 * edge / 0.02, 0.0], rtol=1e-15)
    np.testing.assert_allclose(vortex.enclosed_circulation([0.01, 0.05]), [0.125, 0.5], rtol=1e-15)
    np.testing.assert_allclose(
        vortex.pressure_drop([0.0, 0.02, 0.04], density=998.0),
        998.0 * edge**2 * np.array([1, 1 / 2, 1 / 8]),
        rtol=1e-14,
    )
    assert vortex.pressure_constant == 1.0
    assert vortex.swirl_scale == pytest.approx(edge)
    assert vortex.rotation_rate == pytest.approx(edge / 0.02)


def test_lamb_oseen_core_drop_is_the_logarithm_of_two():
    """ρ Γ² ln 2/(4π² r_c²)."""
    vortex = vx.Vortex("lamb-oseen", circulation=2.4, core_radius=0.012)
    exact = 998.0 * 2.4**2 * math.log(2.0) / (4 * math.pi**2 * 0.012**2)
    assert float(vortex.pressure_drop(0.0, density=998.0)) == pytest.approx(exact, rel=1e-14)


def test_free_vortex_needs_no_core():
    vortex = vx.Vortex("free", circulation=TWO_PI)
    np.testing.assert_allclose(vortex.swirl([0.5, 1.0, 2.0]), [2.0, 1.0, 0.5], rtol=1e-15)
    np.testing.assert_allclose(vortex.pressure_drop([1.0, 2.0], density=1000.0), [500.0, 125.0], rtol=1e-15)
    assert vortex.core_radius == 0.0
    assert vortex.peak_radius == 0.0
    assert vortex.peak_swirl == math.inf
    assert math.isnan(vortex.pressure_constant)
    assert math.isnan(vortex.rotation_rate)
    assert vortex.swirl(0.0) == math.inf
    assert vortex.enclosed_circulation(0.0) == TWO_PI  # all of it sits on the axis


def test_forced_vortex_turns_as_a_bucket():
    vortex = vx.Vortex("forced", rotation_rate=-3.0)
    np.testing.assert_allclose(vortex.swirl([0.0, 0.5]), [0.0, -1.5])
    assert float(vortex.vorticity(7.0)) == -6.0
    assert vortex.circulation == -math.inf
    assert vortex.core_radius == math.inf
    assert vortex.peak_radius == math.inf
    assert math.isnan(vortex.swirl_scale)
    assert vortex.pressure_drop(0.1, density=1.0) == math.inf


def test_taylor_has_no_circulation_far_away():
    vortex = vx.Vortex("taylor", swirl_scale=-2.0, core_radius=0.1)
    assert vortex.circulation == 0.0
    assert vortex.peak_swirl == pytest.approx(-2.0 / math.sqrt(2 * math.e), rel=1e-15)
    assert vortex.peak_radius == pytest.approx(0.1 / math.sqrt(2), rel=1e-15)
    assert float(vortex.pressure_drop(0.0, density=1.0)) == pytest.approx(1.0, rel=1e-15)  # ρV²/4


def test_velocity_in_the_plane():
    vortex = vx.Vortex("rankine", circulation=TWO_PI, core_radius=1.0, centre=(1.0, -2.0))
    u, v = vortex.velocity([3.0, 1.0, 1.0], [-2.0, 0.0, -2.0])
    np.testing.assert_allclose(u, [0.0, -0.5, 0.0], atol=1e-16)
    np.testing.assert_allclose(v, [0.5, 0.0, 0.0], atol=1e-16)


@pytest.mark.parametrize("key", MODELS)
def test_the_axis_itself_is_at_rest(key):
    u, v = make(key, centre=(0.1, 0.2)).velocity(0.1, 0.2)
    assert float(u) == 0.0
    assert float(v) == 0.0


@pytest.mark.parametrize("key", MODELS)
def test_the_curl_of_the_velocity_is_the_vorticity(key):
    vortex = make(key, core_radius=1.0)
    x, y, h = 0.53, -0.41, 1e-5
    curl = (vortex.velocity(x + h, y)[1] - vortex.velocity(x - h, y)[1]) / (2 * h)
    curl -= (vortex.velocity(x, y + h)[0] - vortex.velocity(x, y - h)[0]) / (2 * h)
    size = abs(vortex.swirl(np.hypot(x, y)))
    assert float(curl) == pytest.approx(float(vortex.vorticity(np.hypot(x, y))), abs=1e-8 * size)


# Properties ---------------------------------------------------------------------------------------------------------

POSITIVE = st.floats(1e-3, 1e3)


@given(key=st.sampled_from(FITTED), strength=POSITIVE, core=POSITIVE, factor=POSITIVE, radius=POSITIVE)
@settings(max_examples=60, deadline=None)
def test_profiles_scale_with_strength_and_length(key, strength, core, factor, radius):
    one = make(key, strength, core)
    wide = dataclasses.replace(one, core_radius=core * factor)
    power = 1.0 if MODELS[key].strength == "circulation" else 0.0
    np.testing.assert_allclose(wide.swirl(radius * factor) * factor**power, one.swirl(radius), rtol=1e-9, atol=1e-290)
    assert wide.peak_radius == pytest.approx(one.peak_radius * factor)
    strong = dataclasses.replace(one, **{MODELS[key].strength: strength * factor})
    np.testing.assert_allclose(strong.swirl(radius), factor * one.swirl(radius), rtol=1e-12, atol=1e-290)
    np.testing.assert_allclose(
        strong.pressure_drop(radius, density=2.0),
        factor**2 * one.pressure_drop(radius, density=2.0),
        rtol=1e-12,
        atol=1e-290,
    )


@given(key=st.sampled_from(FITTED), strength=POSITIVE, core=POSITIVE, radius=POSITIVE)
@settings(max_examples=60, deadline=None)
def test_the_other_sense_turns_everything_but_the_pressure(key, strength, core, radius):
    one, other = make(key, strength, core), make(key, -strength, core)
    for quantity in ("swirl", "vorticity", "enclosed_circulation"):
        assert float(getattr(other, quantity)(radius)) == -float(getattr(one, quantity)(radius))
    assert other.peak_swirl == -one.peak_swirl
    assert other.pressure_drop(radius, density=1.0) == one.pressure_drop(radius, density=1.0)


@given(exponent=st.floats(0.3, 100.0), radius=st.floats(1e-6, 1e6))
@settings(max_examples=100, deadline=None)
def test_vatistas_is_even_in_the_logarithm_of_the_radius(exponent, radius):
    """F(x) = F(1/x) for the whole family, and the peak at r_c is the largest value."""
    vortex = vx.Vortex("vatistas", swirl_scale=1.0, core_radius=1.0, exponent=exponent)
    assert float(vortex.swirl(radius)) == pytest.approx(float(vortex.swirl(1.0 / radius)), rel=1e-12)
    assert float(vortex.swirl(radius)) <= vortex.peak_swirl * (1 + 1e-14)


# The value itself ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("key", MODELS)
def test_equal_by_value_hashable_and_fit_to_travel(key):
    one, two = make(key, centre=(0.1, 0.2)), make(key, centre=(0.1, 0.2))
    assert one == two
    assert hash(one) == hash(two)
    assert pickle.loads(pickle.dumps(one)) == one
    assert pickle.loads(pickle.dumps(one)).model is one.model
    assert copy.deepcopy(one) == one
    assert dataclasses.replace(one) == one
    assert one != make(key, strength=2.5, centre=(0.1, 0.2))
    assert eval(repr(one), {"Vortex": vx.Vortex}) == one


def test_replace_changes_one_number():
    vortex = vx.Vortex("vatistas", circulation=2.4, core_radius=0.012, exponent=2.5)
    assert dataclasses.replace(vortex, exponent=3).shape == {"exponent": 3.0}
    assert dataclasses.replace(vortex, circulation=1.0) == vx.Vortex(
        "vatistas", circulation=1.0, core_radius=0.012, exponent=2.5
    )
    assert dataclasses.replace(vortex, core_radius=0.02).circulation == 2.4
    assert dataclasses.replace(vortex, swirl_scale=1.0).circulation == pytest.approx(TWO_PI * 0.012, rel=1e-15)
    assert dataclasses.replace(vortex, centre=(1, 2)).centre == (1.0, 2.0)
    assert dataclasses.replace(vortex, model="lamb-oseen").model.key == "lamb-oseen"


def test_frozen_down_to_its_shape():
    vortex = make("vatistas")
    with pytest.raises(dataclasses.FrozenInstanceError):
        vortex.core_radius = 1.0
    with pytest.raises(TypeError):
        vortex.shape["exponent"] = 1.0


def test_the_same_vortex_by_scale_or_by_circulation():
    by_scale = vx.Vortex("lamb-oseen", swirl_scale=1.0, core_radius=0.5)
    assert by_scale.circulation == pytest.approx(math.pi, rel=1e-15)
    assert by_scale == vx.Vortex("lamb-oseen", circulation=by_scale.circulation, core_radius=0.5)


def test_a_default_shape_is_filled_in():
    assert make("vatistas").shape == {"exponent": 2.0}
    assert make("vatistas") == make("vatistas", exponent=2)


def test_no_strength_is_no_flow():
    for key in MODELS:
        vortex = make(key, strength=0.0)
        assert float(vortex.swirl(0.0)) == 0.0
        assert vortex.peak_swirl == 0.0
        assert float(vortex.pressure_drop(0.0, density=1.0)) == 0.0


# Growth -------------------------------------------------------------------------------------------------------------


def test_growth_keeps_the_circulation_of_lamb_oseen():
    """r_c² = r_0² + 4νt (Lamb, art. 334a), by hand: 0.01² + 4·1e-6·100 = 5e-4 m²."""
    grown = vx.Vortex("lamb-oseen", circulation=1.0, core_radius=0.01).grown(viscosity=1e-6, time=100.0)
    assert grown.core_radius == pytest.approx(math.sqrt(5e-4), rel=1e-15)
    assert grown.circulation == 1.0


def test_growth_keeps_the_angular_momentum_of_taylor():
    """The angular momentum 2π ∫ v r² dr, by hand π V R³, is what diffusion cannot change."""
    vortex = vx.Vortex("taylor", swirl_scale=1.0, core_radius=0.01)
    grown = vortex.grown(viscosity=1e-6, time=75.0)
    assert grown.core_radius == pytest.approx(0.02, rel=1e-15)
    assert grown.swirl_scale * grown.core_radius**3 == pytest.approx(vortex.swirl_scale * 0.01**3, rel=1e-14)


def test_growth_obeys_the_diffusion_equation():
    """∂v/∂t = ν ∂ω/∂r by differences in time and space."""
    nu, r, dt, dr = 1e-6, 0.013, 1e-3, 1e-6
    for vortex in (make("lamb-oseen"), make("taylor")):
        later, sooner = (vortex.grown(viscosity=nu, time=1.0 + s * dt).swirl(r) for s in (1, -1))
        now = vortex.grown(viscosity=nu, time=1.0)
        right = nu * (now.vorticity(r + dr) - now.vorticity(r - dr)) / (2 * dr)
        assert float(later - sooner) / (2 * dt) == pytest.approx(float(right), rel=1e-5)


# Refusals -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("model", "numbers", "message"),
    [
        ("lamb-oseen", {"circulation": 1.0}, "Lamb-Oseen needs core_radius"),
        ("lamb-oseen", {"core_radius": 1.0}, "takes circulation or swirl_scale, got neither; give one"),
        ("taylor", {"core_radius": 1.0}, "Taylor takes swirl_scale, got none; give one"),
        (
            "lamb-oseen",
            {"circulation": 1.0, "swirl_scale": 1.0, "core_radius": 1.0},
            "got circulation and swirl_scale; give one",
        ),
        ("taylor", {"circulation": 1.0, "core_radius": 1.0}, "Taylor takes swirl_scale, got circulation = 1.0"),
        ("forced", {"circulation": 1.0}, "Forced takes rotation_rate, got circulation"),
        ("free", {"swirl_scale": 1.0}, "Free takes circulation, got swirl_scale"),
        ("free", {"circulation": 1.0, "core_radius": 0.1}, "A free vortex has no core radius, got 0.1 m; leave it out"),
        ("rankine", {"circulation": 1.0, "core_radius": 0.0}, "core_radius must be positive, got 0 m"),
        ("rankine", {"circulation": 1.0, "core_radius": -0.1}, "core_radius must be positive, got -0.1 m"),
        ("rankine", {"circulation": math.nan, "core_radius": 1.0}, "circulation must be a finite number"),
        ("rankine", {"circulation": math.inf, "core_radius": 1.0}, "circulation must be a finite number"),
        ("rankine", {"circulation": "1", "core_radius": 1.0}, "circulation must be a number in m²/s, got '1'"),
        (
            "vatistas",
            {"circulation": 1.0, "core_radius": 1.0, "exponent": 0.0},
            "exponent of Vatistas must lie between",
        ),
        (
            "vatistas",
            {"circulation": 1.0, "core_radius": 1.0, "exponent": "two"},
            "exponent of Vatistas must lie between",
        ),
        ("vatistas", {"circulation": 1.0, "core_radius": 1.0, "exponnt": 2.0}, "did you mean 'exponent'"),
        ("rankine", {"circulaton": 1.0, "core_radius": 1.0}, "did you mean 'circulation'"),
        ("rankine", {"circulation": 1.0, "core_radius": 1.0, "exponent": 2.0}, "It has no shape parameter"),
        (
            "rankine",
            {"circulation": 1.0, "core_radius": 1.0, "centre": 3.0},
            r"centre must be two numbers \(x, y\) in m",
        ),
        ("rankin", {"circulation": 1.0, "core_radius": 1.0}, "No model named 'rankin'; did you mean 'rankine'"),
    ],
)
def test_refusals(model, numbers, message):
    with pytest.raises(ValueError, match=message):
        vx.Vortex(model, **numbers)


def test_refusals_of_the_fields():
    vortex = make("rankine")
    for quantity in ("swirl", "vorticity", "enclosed_circulation"):
        with pytest.raises(ValueError, match="radius must not be negative, got -1 m"):
            getattr(vortex, quantity)([1.0, -1.0])
    with pytest.raises(ValueError, match="radius must not be negative"):
        vortex.pressure_drop(-1.0, density=1.0)
    with pytest.raises(ValueError, match="density must be positive"):
        vortex.pressure_drop(1.0, density=0.0)
    with pytest.raises(ValueError, match="Rankine has no law by which its core grows"):
        vortex.grown(viscosity=1e-6, time=1.0)
    with pytest.raises(ValueError, match="time must not be negative, got -1"):
        make("lamb-oseen").grown(viscosity=1e-6, time=-1.0)
    with pytest.raises(ValueError, match="kinematic_viscosity must be positive"):
        make("lamb-oseen").grown(viscosity=0.0, time=1.0)


def test_text_is_no_radius():
    vortex = vx.Vortex("lamb-oseen", circulation=1.0, core_radius=0.01)
    with pytest.raises(ValueError, match="radius must be a number or an array of numbers in m, got 'a'"):
        vortex.swirl("a")
    with pytest.raises(ValueError, match="y must be a number"):
        vortex.velocity(0.0, ["a"])
