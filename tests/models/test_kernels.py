"""Kernels against formulas written out here with mpmath at 50 digits."""

import mpmath as mp
import numpy as np
import pytest
import sympy as sp

from vortexwidgets.models import kernels
from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.model import X

AT = np.unique(
    np.concatenate([np.logspace(-9, 6, 121), np.linspace(0.5, 2.0, 31), [1.0, 1 - 1e-9, 1 + 1e-9, 20.0, 26.0]])
)
EPS = np.finfo(float).eps


def rankine(x):
    inside = x <= 1
    return {
        "swirl": x if inside else 1 / x,
        "vorticity": mp.mpf(2) if inside else mp.mpf(0),
        "enclosed_circulation": x**2 if inside else mp.mpf(1),
        "pressure_drop": 1 - x**2 / 2 if inside else 1 / (2 * x**2),
    }


def kaufmann(x):
    return {
        "swirl": x / (1 + x**2),
        "vorticity": 2 / (1 + x**2) ** 2,
        "enclosed_circulation": x**2 / (1 + x**2),
        "pressure_drop": 1 / (2 * (1 + x**2)),
    }


def vatistas(x, n):
    # The classical form of the drop: Gauss's series in -x^-2n outside, the rest of the complete integral inside.
    def part(y):
        return y * mp.hyp2f1(2 / n, 1 / n, 1 + 1 / n, -(y**n))

    whole = mp.gamma(1 / n) ** 2 / (n * mp.gamma(2 / n))
    return {
        "swirl": x * (1 + x ** (2 * n)) ** (-1 / n),
        "vorticity": 2 * (1 + x ** (2 * n)) ** (-1 / n - 1),
        "enclosed_circulation": x**2 * (1 + x ** (2 * n)) ** (-1 / n),
        "pressure_drop": part(x**-2) / 2 if x > 1 else (whole - part(x**2)) / 2,
    }


def lamb_oseen(x):
    s = x**2
    return {
        "swirl": (1 - mp.exp(-s)) / x,
        "vorticity": 2 * mp.exp(-s),
        "enclosed_circulation": 1 - mp.exp(-s),
        "pressure_drop": ((1 - mp.exp(-s)) ** 2 / s + 2 * mp.e1(s) - 2 * mp.e1(2 * s)) / 2,
    }


def taylor(x):
    s = x**2
    return {
        "swirl": x * mp.exp(-s),
        "vorticity": 2 * (1 - s) * mp.exp(-s),
        "enclosed_circulation": s * mp.exp(-s),
        "pressure_drop": mp.exp(-2 * s) / 4,
    }


def free(x):
    return {"swirl": 1 / x, "vorticity": mp.mpf(0), "enclosed_circulation": mp.mpf(1), "pressure_drop": 1 / (2 * x**2)}


def forced(x):
    return {"swirl": x, "vorticity": mp.mpf(2), "enclosed_circulation": x**2, "pressure_drop": mp.inf}


CASES = [
    ("free", free, ()),
    ("forced", forced, ()),
    ("rankine", rankine, ()),
    ("kaufmann", kaufmann, ()),
    *[("vatistas", vatistas, (n,)) for n in (0.5, 1.0, 1.5, 2.0, 3.0, 10.0, 100.0)],
    ("lamb-oseen", lamb_oseen, ()),
    ("taylor", taylor, ()),
    ("burgers", lamb_oseen, ()),
]

# |d ln f / d ln x| of the factors exp(-x²) and exp(-2x²): how much a rounding of x² is magnified.
CONDITION = {
    ("lamb-oseen", "vorticity"): 2,
    ("burgers", "vorticity"): 2,
    ("taylor", "swirl"): 2,
    ("taylor", "vorticity"): 2,
    ("taylor", "enclosed_circulation"): 2,
    ("taylor", "pressure_drop"): 4,
}


@pytest.mark.parametrize("quantity", ["swirl", "vorticity", "enclosed_circulation", "pressure_drop"])
@pytest.mark.parametrize(("key", "formula", "shape"), CASES, ids=lambda value: str(value) if value != () else None)
def test_twelve_digits_from_the_axis_to_a_million_core_radii(key, formula, shape, quantity):
    values = MODELS[key].kernel(quantity)(AT, *shape)
    with mp.workdps(60):
        reference = [formula(mp.mpf(float(x)), *map(mp.mpf, shape))[quantity] for x in AT]
        widened = CONDITION.get((key, quantity), 0) * AT**2 * EPS
        for x, value, exact, more in zip(AT, values, reference, widened, strict=True):
            if exact == mp.inf:
                assert value == np.inf
                continue
            assert abs(mp.mpf(float(value)) - exact) <= max(1e-12, more) * abs(exact) + mp.mpf(10) ** -300, (x, exact)


@pytest.mark.parametrize("exponent", [0.5, 1.0, 2.0, 3.7, 10.0, 100.0])
def test_derivative_by_the_exponent_keeps_its_digits(exponent):
    """∂F/∂n against the logarithmic derivative F [ln(1 + x^2n)/n² - (2/n) x^2n ln x/(1 + x^2n)], by hand."""
    _, _, slope = MODELS["vatistas"].fit_kernel()(AT, exponent)
    with mp.workdps(80 + int(14 * exponent)):  # the two terms cancel down to x^-2n far out
        n = mp.mpf(exponent)
        for x, value in zip(AT, slope, strict=True):
            t = mp.mpf(float(x))
            q = t ** (2 * n)
            exact = t * (1 + q) ** (-1 / n) * (mp.log1p(q) / n**2 - 2 / n * q * mp.log(t) / (1 + q))
            # ln x near x = 1 and the small power are each good to a few ulp of their own condition number.
            allowed = 1e-12 + 4 * EPS * exponent * abs(np.log(x))
            assert abs(mp.mpf(float(value)) - exact) <= allowed * abs(exact) + mp.mpf(10) ** -300, x


@pytest.mark.parametrize("key", [key for key, model in MODELS.items() if model.ranked])
def test_the_fit_kernel_equals_the_kernels(key):
    model = MODELS[key]
    shape = [parameter.default for parameter in model.shape]
    swirl, vorticity, *slopes = model.fit_kernel()(AT, *shape)
    np.testing.assert_allclose(swirl, model.kernel("swirl")(AT, *shape), rtol=1e-14, atol=1e-300)
    np.testing.assert_allclose(vorticity, model.kernel("vorticity")(AT, *shape), rtol=1e-14, atol=1e-300)
    assert len(slopes) == len(shape)
    assert all(part.dtype == float and part.shape == AT.shape for part in (swirl, vorticity, *slopes))


@pytest.mark.parametrize("key", MODELS)
def test_shapes_of_arrays_and_numbers_are_kept(key):
    model = MODELS[key]
    shape = [parameter.default for parameter in model.shape]
    for quantity in ("swirl", "vorticity", "enclosed_circulation", "pressure_drop"):
        kernel = model.kernel(quantity)
        assert np.shape(kernel(1.5, *shape)) == ()
        assert kernel([[1.0, 2.0, 3.0]], *shape).shape == (1, 3)
        assert kernel(np.empty((0, 2)), *shape).shape == (0, 2)
        many = np.linspace(0.1, 5.0, 20_001)
        np.testing.assert_array_equal(
            kernel(many, *shape)[[0, 9_999, 20_000]], kernel(many[[0, 9_999, 20_000]], *shape)
        )
        strided = np.linspace(0.1, 5.0, 40).reshape(2, 20).T
        np.testing.assert_array_equal(kernel(strided, *shape), kernel(strided.copy(), *shape))


@pytest.mark.parametrize("key", [key for key, model in MODELS.items() if model.ranked])
def test_limits_on_the_axis_beyond_double_precision_and_far_out(key):
    model = MODELS[key]
    shape = [parameter.default for parameter in model.shape]
    at = np.array([0.0, 1e-310, 1e-200, 1e-150, 1e60, 1e300, np.inf, np.nan])
    swirl = model.kernel("swirl")(at, *shape)
    slope = float(model.kernel("vorticity")(0.0, *shape)) / 2  # half the vorticity is the rate of turning
    np.testing.assert_allclose(swirl[:4], slope * at[:4], rtol=1e-12)
    np.testing.assert_allclose(swirl[4:7], 0.0, atol=2e-60)
    for quantity in ("vorticity", "pressure_drop"):
        values = model.kernel(quantity)(at, *shape)
        np.testing.assert_allclose(values[1:4], values[0], rtol=1e-13)
        np.testing.assert_allclose(values[4:7], 0.0, atol=1e-100)
    assert np.isnan(swirl[-1])


def test_unknown_kernels_are_refused():
    with pytest.raises(ValueError, match="No kernel for 'speed'; choose one of swirl, vorticity"):
        MODELS["rankine"].kernel("speed")


def test_lambdify_is_called_in_one_place_only():
    from pathlib import Path

    package = Path(kernels.__file__).parents[1]
    assert [p.name for p in package.rglob("*.py") if "lambdify(" in p.read_text(encoding="utf-8")] == ["kernels.py"]


@pytest.mark.parametrize(
    ("expression", "x", "exact"),
    [
        (1 - sp.exp(-(X**2)), 1e-12, 1e-24),  # by series, x²
        (sp.log(1 + X**2), 1e-12, 1e-24),
        ((sp.exp(-X) - 1) / X, 1e-15, -1.0),
    ],
)
def test_small_differences_are_rewritten(expression, x, exact):
    (value,) = kernels.together((kernels.prepare(expression, X),), X, ())(np.array([x]))
    np.testing.assert_allclose(value, exact, rtol=1e-14)


def test_powers_neither_overflow_nor_underflow():
    n = sp.Symbol("n", positive=True)
    prepared = kernels.prepare((1 + X ** (2 * n)) ** (-1 / n), X)
    (value,) = kernels.together((prepared,), X, (n,))(np.array([1e-6, 1e6]), 200.0)
    np.testing.assert_allclose(value, [1.0, 1e-12], rtol=1e-14)  # by hand: x^-2 far out


def test_a_constant_fills_the_array():
    one, two = kernels.together((sp.S.One, X), X, ())(np.array([3.0, 4.0]))
    np.testing.assert_array_equal(one, [1.0, 1.0])
    np.testing.assert_array_equal(two, [3.0, 4.0])
