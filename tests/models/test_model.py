"""Stated closed forms proved; derived quantities against forms known by hand."""

import copy
import pickle

import mpmath as mp
import numpy as np
import pytest
import sympy as sp

from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.model import ShapeParameter, VortexModel, X

N = sp.Symbol("n", positive=True)


# Stated forms: slope and limit together are the integral ------------------------------------------------------------


@pytest.mark.parametrize("key", ["lamb-oseen", "burgers"])
def test_the_drop_of_lamb_oseen_is_proved_by_its_slope_and_limits(key):
    model = MODELS[key]
    drop = model.stated["pressure_drop"]
    assert sp.simplify(sp.diff(drop, X) + model.swirl**2 / X) == 0
    # E1(s) < exp(-s)/s for s > 0 (Abramowitz and Stegun 5.1.20), so every term vanishes far away.
    e1 = sp.Function("E")
    bounded = drop.replace(sp.expint, lambda order, s: e1(s)).replace(e1, lambda s: sp.exp(-s) / s)
    assert sp.limit(bounded, X, sp.oo) == 0
    assert sp.limit(drop, X, 0, "+") == model.stated["centre"] == sp.log(2)


def test_the_drop_of_vatistas_is_proved_by_its_series():
    """J(y) = y (1 + q)^(-2/n) Σ g_k u^k with q = y^n, u = q/(1 + q) has J' = (1 + q)^(-2/n).

    With y dq/dy = n q and y du/dy = n u (1 - u), J' (1 + q)^(2/n) = G - 2uG + n u (1 - u) G'; it is 1 when each power
    of u beyond the first term cancels.
    """
    k = sp.Symbol("k", integer=True, positive=True)
    b = 1 / N
    # G = 2F1(1, 2b; 1 + b; u) = Σ (2b)_k / (1 + b)_k u^k, so g_k / g_(k-1) = (2b + k - 1)/(b + k).
    ratio = (2 * b + k - 1) / (b + k)
    coefficient = ratio * (1 + N * k) - (2 + N * (k - 1))
    assert sp.simplify(coefficient) == 0
    inner, outer = (value for value, _ in MODELS["vatistas"].stated["pressure_drop"].args)
    # That is the series stated, outside as J(x^-2)/2 and inside as what is missing to the whole.
    for value, y in ((outer, X**-2), (sp.beta(b, b) / (2 * N) - inner, X**2)):
        (series,) = value.atoms(sp.hyper)
        assert series.ap == sp.Tuple(1, 2 * b)
        assert series.bq == sp.Tuple(1 + b)
        factor = sp.simplify(value / series / (y * (1 + y**N) ** (-2 * b) / 2))
        assert factor == 1
        assert sp.simplify(series.argument - y**N / (1 + y**N)) == 0


@pytest.mark.parametrize("n", [sp.Rational(1, 2), 1, sp.Rational(3, 2), 2, 3, 7])
def test_the_two_branches_of_vatistas_meet_at_the_core_edge(n):
    inner, outer = (value.subs({X: 1, N: n}) for value, _ in MODELS["vatistas"].pressure_drop.args)
    assert abs(sp.N(inner - outer, 40)) < sp.Float("1e-35")


def test_vatistas_with_n_2_is_the_arctangent_that_sympy_finds():
    found = sp.integrate(MODELS["vatistas"].swirl.subs(N, 2) ** 2 / X, (X, X, sp.oo))
    for x in (0.3, 1.0, 2.5):
        exact = sp.N(found.subs(X, x), 30)
        assert abs(exact - sp.N(sp.atan(sp.Float(x, 40) ** -2) / 2, 30)) < 1e-14  # physical form, ½ atan(r_c²/r²)
        assert MODELS["vatistas"].kernel("pressure_drop")(x, 2.0) == pytest.approx(float(exact), rel=1e-14)


@pytest.mark.parametrize("key", ["free", "rankine", "kaufmann", "taylor"])
def test_what_sympy_integrates_is_not_stated(key):
    assert MODELS[key].stated == {}


# Derived forms, by hand ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("key", "quantity", "form"),
    [
        ("free", "vorticity", sp.S.Zero),
        ("free", "pressure_drop", 1 / (2 * X**2)),
        ("forced", "vorticity", sp.Integer(2)),
        ("forced", "pressure_drop", sp.oo),
        ("kaufmann", "vorticity", 2 / (1 + X**2) ** 2),
        ("kaufmann", "pressure_drop", 1 / (2 * (1 + X**2))),
        ("lamb-oseen", "vorticity", 2 * sp.exp(-(X**2))),
        ("lamb-oseen", "enclosed_circulation", 1 - sp.exp(-(X**2))),
        ("taylor", "vorticity", 2 * (1 - X**2) * sp.exp(-(X**2))),
        ("taylor", "pressure_drop", sp.exp(-2 * X**2) / 4),
        ("vatistas", "vorticity", 2 * (1 + X ** (2 * N)) ** (-1 - 1 / N)),
    ],
)
def test_derived_forms_are_those_found_by_hand(key, quantity, form):
    found = getattr(MODELS[key], quantity)
    assert found == form or sp.simplify(found - form) == 0


def test_rankine_by_hand():
    inner, outer = (value for value, _ in MODELS["rankine"].pressure_drop.args)
    assert sp.expand(inner - (1 - X**2 / 2)) == 0
    assert outer == 1 / (2 * X**2)
    assert MODELS["rankine"].edges == (1,)


@pytest.mark.parametrize(
    ("key", "left_over"),
    [
        ("free", 0),
        ("forced", 0),
        ("lamb-oseen", 0),
        ("taylor", 0),
        ("burgers", 0),
        # ν dω/dr by hand: ω = 2/(1+x²)² and 2 (1+x^2n)^(-1-1/n), in units of νV/r_c²
        ("kaufmann", -8 * X / (1 + X**2) ** 3),
        ("vatistas", -4 * (N + 1) * X ** (2 * N - 1) * (1 + X ** (2 * N)) ** (-2 - 1 / N)),
    ],
)
def test_what_the_momentum_equation_leaves_over(key, left_over):
    balance = MODELS[key].balance
    assert sp.simplify(balance.left_over - left_over) == 0
    assert balance.is_exact is (left_over == 0)


def test_a_wrong_law_of_growth_leaves_something_over():
    wrong = VortexModel(
        key="w", name="W", swirl=MODELS["taylor"].swirl, source="", strength="swirl_scale", motion="growing", decay=1
    )
    assert not wrong.balance.is_exact


def test_rankine_says_that_viscosity_would_smooth_its_edge():
    assert "jumps" in MODELS["rankine"].balance.sentence


def test_the_peak_of_lamb_oseen_solves_its_own_equation():
    """exp(α) = 1 + 2α with x_p² = α (H. Lamb's profile, F' = 0)."""
    place, size = MODELS["lamb-oseen"].peak_of()
    with mp.workdps(40):
        alpha = mp.findroot(lambda a: mp.exp(a) - 1 - 2 * a, 1.25)
        assert place == pytest.approx(float(mp.sqrt(alpha)), rel=1e-15)
        assert size == pytest.approx(float((1 - mp.exp(-alpha)) / mp.sqrt(alpha)), rel=1e-15)


def test_models_without_a_peak_say_where_the_swirl_grows():
    assert MODELS["free"].peak_of() == (0.0, np.inf)
    assert MODELS["forced"].peak_of() == (np.inf, np.inf)
    assert np.isnan(MODELS["free"].pressure_constant())
    assert np.isnan(MODELS["forced"].pressure_constant())
    assert MODELS["forced"].centre_pressure() == np.inf


def test_the_largest_of_two_humps_is_the_peak():
    """Against the largest value on a fine grid."""
    profile = X * sp.exp(-(X**2)) * (X**4 + 1)
    model = VortexModel(key="h", name="H", swirl=profile, source="", strength="swirl_scale")
    place, size = model.peak_of()
    x = np.linspace(0.01, 5, 400_001)
    curve = x * np.exp(-(x**2)) * (x**4 + 1)
    assert place == pytest.approx(x[np.argmax(curve)], abs=2e-5)
    assert size == pytest.approx(curve.max(), rel=1e-9)


# The value ----------------------------------------------------------------------------------------------------------


def test_nothing_is_derived_before_it_is_asked_for():
    model = copy.copy(VortexModel(key="k", name="K", swirl=X / (1 + X**2), source=""))
    assert "vorticity" not in vars(model)
    assert model.vorticity is model.vorticity
    assert "pressure_drop" not in vars(model)


def test_a_model_is_frozen_and_equal_to_itself_only():
    model = MODELS["rankine"]
    with pytest.raises(AttributeError):
        model.name = "other"
    assert model == copy.deepcopy(model)
    assert model is copy.copy(model)
    assert hash(model) == hash(MODELS["rankine"])


def test_a_model_of_ones_own_travels_without_its_compiled_functions():
    shape = (ShapeParameter("exponent", "n", 2.0, (0.0, 9.0), (1.0, 3.0), "Sharpness"),)
    model = VortexModel(key="own", name="Own", swirl=MODELS["vatistas"].swirl, source="here", shape=shape)
    model.kernel("swirl")
    again = pickle.loads(pickle.dumps(model))
    assert again.kernel("swirl")(1.0, 2.0) == model.kernel("swirl")(1.0, 2.0)
    assert again.shape[0].name == "exponent"


def test_the_symbol_of_a_shape_parameter_is_positive():
    (parameter,) = MODELS["vatistas"].shape
    assert parameter.expression == N
    assert MODELS["vatistas"].symbols == (N,)


def test_growth_is_stated_where_there_is_one():
    assert MODELS["lamb-oseen"].growth == r"r_c^2 = r_0^2 + 4 \nu t"
    assert MODELS["rankine"].growth == ""
