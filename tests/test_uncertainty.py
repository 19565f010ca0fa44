import math
import pickle
import subprocess
import sys
from dataclasses import FrozenInstanceError, replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from vortexwidgets.uncertainty import (
    PROBABILITIES,
    PROBITS,
    Contribution,
    Estimate,
    as_estimate,
    from_draws,
    propagate,
)

NAN = math.nan


def normal_table(value, uncertainty):
    return tuple(value + uncertainty * z for z in PROBITS)


# The value ----------------------------------------------------------------------------------------------------------


def test_an_estimate_is_a_frozen_hashable_value():
    one = Estimate(np.float64(1.0), np.float32(0.5), "speed", [Contribution("gain", 0.5)])
    assert one == Estimate(1.0, 0.5, "speed", (Contribution("gain", 0.5),))
    assert hash(one) == hash(replace(one))
    assert type(one.value) is float
    assert one != Estimate(1.0, 0.5, "speed")
    assert one != 1.0
    assert one.unit == "m/s"
    assert Estimate(1.0).unit == ""
    with pytest.raises(FrozenInstanceError):
        one.value = 2.0
    assert pickle.loads(pickle.dumps(one)) == one


def test_undetermined_estimates_that_say_the_same_are_equal():
    assert Estimate(NAN, float("nan"), "speed") == Estimate(float("nan"), NAN, "speed")
    assert hash(Estimate(NAN, NAN)) == hash(Estimate(float("nan"), float("nan")))
    assert Estimate(NAN, NAN) != Estimate(0.0, NAN)


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        ({"uncertainty": -1.0, "quantity": "speed"}, "standard uncertainty of speed must not be negative, got -1 m/s"),
        ({"quantity": "sped"}, "No quantity named 'sped'; did you mean 'speed'"),
        ({"bound": "left"}, "bound must be 'lower', 'upper' or None, got 'left'"),
        ({"degrees_of_freedom": 0.0}, "Degrees of freedom must be positive, got 0"),
        ({"quantiles": (1.0, 2.0)}, "quantiles must hold 161 values, one for each of PROBABILITIES, got 2"),
        ({"quantiles": tuple(-z for z in PROBITS)}, "must be finite and ascending; sort them"),
        ({"quantiles": (NAN,) * len(PROBITS)}, "must be finite and ascending"),
    ],
)
def test_a_wrong_estimate_is_refused(arguments, sentence):
    with pytest.raises(ValueError, match=sentence):
        Estimate(1.0, **arguments)


def test_a_contribution_is_not_negative():
    with pytest.raises(ValueError, match="contribution of gain must not be negative, got -1; give its absolute value"):
        Contribution("gain", -1.0)


# Intervals, probabilities, draws ------------------------------------------------------------------------------------


# Coverage factors of the normal distribution: JCGM 100:2008 table G.1 (from memory).
@pytest.mark.parametrize(("level", "factor"), [(0.6827, 1.000), (0.90, 1.645), (0.95, 1.960), (0.99, 2.576)])
def test_normal_coverage_factors(level, factor):
    low, high = Estimate(3.0, 2.0).interval(level)
    assert (high - 3.0) / 2.0 == pytest.approx(factor, abs=6e-4)
    assert low + high == pytest.approx(6.0)


# Coverage factors of Student's t: JCGM 100:2008 table G.2 (from memory).
@pytest.mark.parametrize(
    ("freedom", "level", "factor"),
    [(1, 0.95, 12.71), (5, 0.95, 2.57), (10, 0.95, 2.23), (50, 0.95, 2.01), (5, 0.99, 4.03)],
)
def test_student_coverage_factors(freedom, level, factor):
    estimate = Estimate(3.0, 2.0, degrees_of_freedom=freedom)
    assert (estimate.interval(level)[1] - 3.0) / 2.0 == pytest.approx(factor, abs=5.1e-3)
    assert estimate.probability_below(3.0 + 2.0 * factor) == pytest.approx(0.5 + 0.5 * level, abs=2e-4)


@given(st.floats(min_value=-1e3, max_value=1e3), st.floats(min_value=1e-3, max_value=1e3), st.floats(0.01, 0.99))
def test_quantiles_and_probabilities_are_inverse(value, uncertainty, probability):
    for estimate in (
        Estimate(value, uncertainty),
        Estimate(value, uncertainty, degrees_of_freedom=4.0),
        Estimate(value, uncertainty, quantiles=normal_table(value, uncertainty)),
    ):
        assert estimate.probability_below(float(estimate.quantile(probability))) == pytest.approx(probability, abs=1e-6)


def test_a_table_of_normal_quantiles_is_normal():
    table = Estimate(3.0, 2.0, quantiles=normal_table(3.0, 2.0))
    for kind in ("symmetric", "shortest"):
        assert table.interval(0.95, kind) == pytest.approx(Estimate(3.0, 2.0).interval(0.95), rel=1e-3)
    assert table.quantile([0.0, 1.0]) == pytest.approx([-5.0, 11.0])
    assert table.probability_below(-5.0) == 0.0
    assert table.probability_below(11.1) == 1.0


def test_the_shortest_interval_of_an_exponential_starts_at_zero():
    # P(X < x) = 1 - exp(-x): its shortest 95 % interval is 0 to -ln 0.05 = 2.9957 (derived).
    table = tuple(-math.log1p(-p) for p in PROBABILITIES)
    low, high = Estimate(1.0, 1.0, quantiles=table).interval(0.95, "shortest")
    assert low == pytest.approx(0.0, abs=1e-4)
    assert high == pytest.approx(2.9957, abs=2e-3)
    low, high = Estimate(1.0, 1.0, quantiles=table).interval(0.95)
    assert (low, high) == pytest.approx((-math.log(0.975), -math.log(0.025)), rel=2e-3)


def test_a_bound_gives_one_side_and_no_more():
    lower, upper = Estimate(3.0, NAN, bound="lower"), Estimate(3.0, NAN, bound="upper")
    assert lower.interval(0.95) == (3.0, math.inf)
    assert upper.interval(0.95) == (-math.inf, 3.0)
    assert lower.probability_below(2.0) == 0.0
    assert math.isnan(lower.probability_below(4.0))
    assert upper.probability_below(4.0) == 1.0
    assert math.isnan(upper.probability_below(2.0))
    assert not lower.is_determined


def test_what_is_not_determined_covers_everything():
    for estimate in (Estimate(NAN, NAN), Estimate(3.0, NAN), Estimate(NAN, NAN, bound="lower")):
        assert estimate.interval(0.5) == (-math.inf, math.inf)
        assert math.isnan(estimate.probability_below(0.0))
    assert math.isnan(Estimate(1.0, 1.0).probability_below(NAN))


def test_an_exact_value_is_below_what_is_larger():
    exact = Estimate(3.0)
    assert exact.interval(0.95) == (3.0, 3.0)
    assert exact.probability_below(3.0) == 0.0
    assert exact.probability_below(3.1) == 1.0
    assert exact.draw(3, np.random.default_rng(1)).tolist() == [3.0, 3.0, 3.0]
    assert exact.is_determined


@pytest.mark.parametrize(
    "estimate",
    [
        Estimate(3.0, 2.0),
        Estimate(3.0, 2.0, degrees_of_freedom=6.0),
        Estimate(3.0, 2.0, quantiles=normal_table(3.0, 2.0)),
    ],
)
def test_draws_follow_the_quantiles(estimate):
    draws = estimate.draw(200_000, np.random.default_rng(7))
    for probability in (0.025, 0.16, 0.5, 0.84, 0.975):
        share = float(np.mean(draws < float(estimate.quantile(probability))))
        assert share == pytest.approx(probability, abs=4.0 * math.sqrt(probability * (1 - probability) / 200_000))


@pytest.mark.parametrize(
    ("call", "sentence"),
    [
        (lambda e: e.interval(1.0), "level of an interval lies between 0 and 1, got 1; 95 % is 0.95"),
        (lambda e: e.interval(95), "got 95; 95 % is 0.95"),
        (lambda e: e.interval(0.9, "narrow"), "kind must be 'symmetric' or 'shortest', got 'narrow'"),
        (lambda e: e.quantile([0.5, 1.5]), "A probability lies between 0 and 1, got 1.5"),
        (
            lambda e: replace(e, bound="lower").quantile(0.5),
            "is only a lower bound .at least 3.00., so it has no quantiles",
        ),
        (
            lambda e: replace(e, value=NAN).draw(3, np.random.default_rng(1)),
            "is not determined .* cannot be drawn from",
        ),
        (lambda e: replace(e, uncertainty=NAN).quantile(0.5), "is not determined"),
    ],
)
def test_a_question_without_an_answer_is_refused(call, sentence):
    with pytest.raises(ValueError, match=sentence):
        call(Estimate(3.0, 2.0))


# What a person gives ------------------------------------------------------------------------------------------------


def test_numbers_pairs_and_estimates_are_taken():
    assert as_estimate(3, "speed") == Estimate(3.0, 0.0, "speed")
    assert as_estimate(np.float32(3.0), "speed") == Estimate(3.0, 0.0, "speed")
    assert as_estimate((3, 0.1), "speed") == Estimate(3.0, 0.1, "speed")
    assert as_estimate([3, 0.1], "") == Estimate(3.0, 0.1)
    assert as_estimate(Estimate(3.0, 0.1, "free_stream"), "speed") == Estimate(3.0, 0.1, "speed")
    assert as_estimate(Estimate(3.0, 0.1), "speed").quantity == "speed"
    named = Estimate(3.0, 0.1, "speed")
    assert as_estimate(named, "") is named


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        (-3.0, "speed must be positive, got -3 m/s"),
        ((3.0, -0.1), r"standard uncertainty of speed must be finite and not negative, got -0\.1 m/s; give 0 when"),
        ((3.0, NAN), "must be finite and not negative, got nan m/s"),
        ((3.0, 0.1, 0.2), "speed takes a number or .value, standard uncertainty., got 3 numbers"),
        ("3", "speed must be a number or .value, standard uncertainty., got '3'"),
        ((3.0, "k"), "the uncertainty of speed must be a number .* got 'k'"),
        (True, "speed must be a number .* got True"),
        (None, "speed must be a number .* got None"),
        (np.array([1.0, 2.0]), "speed must be a number"),
        (NAN, "speed must be a finite number in m/s, got nan"),
        (
            Estimate(3.0, 0.1, "density"),
            r"speed is in m/s, got density in kg/m³ \(3\.00 ± 0\.10 kg/m³\); give an estimate of",
        ),
        (Estimate(NAN, NAN, "speed"), "speed must be a finite number"),
    ],
)
def test_what_is_no_estimate_is_refused(given, sentence):
    with pytest.raises(ValueError, match=sentence):
        as_estimate(given, "speed")


# Draws --------------------------------------------------------------------------------------------------------------


def test_draws_are_summarised():
    draws = np.random.default_rng(5).normal(3.0, 2.0, 100_000)
    estimate = from_draws(draws, "speed", [Contribution("all", 2.0)])
    assert (estimate.value, estimate.uncertainty) == (pytest.approx(draws.mean()), pytest.approx(draws.std(ddof=1)))
    assert estimate.quantiles[80] == pytest.approx(np.median(draws))
    assert estimate.budget == (Contribution("all", 2.0),)
    assert from_draws([2.0, 2.0, 2.0], "") == Estimate(2.0)


@pytest.mark.parametrize(
    ("draws", "sentence"),
    [
        ([1.0], "was drawn 1 times; at least two"),
        ([1.0, NAN, math.inf], "is not finite in 2 of 3 draws; an input reaches"),
    ],
)
def test_draws_that_say_nothing_are_refused(draws, sentence):
    with pytest.raises(ValueError, match=sentence):
        from_draws(draws, "speed")


# Propagation --------------------------------------------------------------------------------------------------------


def dynamic_pressure(density, speed):
    return 0.5 * density * speed**2


def test_linear_propagation_against_the_formula():
    found = propagate(dynamic_pressure, {"density": (1000.0, 10.0), "speed": (2.0, 0.04)}, quantity="pressure")
    # ∂q/∂ρ = v²/2 = 2, ∂q/∂v = ρ v = 2000
    assert found.value == 2000.0
    assert found.uncertainty == pytest.approx(math.hypot(20.0, 80.0), rel=1e-9)
    assert [part.name for part in found.budget] == ["density", "speed"]
    assert [part.uncertainty for part in found.budget] == pytest.approx([20.0, 80.0], rel=1e-9)
    in_order = propagate(dynamic_pressure, [(1000.0, 10.0), (2.0, 0.04)], quantity="pressure")
    assert in_order == found


@pytest.mark.parametrize("uncertainty", [1e-9, 1e-6, 1e-3, 0.1])
def test_derivatives_hold_for_any_size_of_uncertainty(uncertainty):
    found = propagate(np.exp, [(2.0, uncertainty)])
    assert found.uncertainty == pytest.approx(math.exp(2.0) * uncertainty, rel=1e-7)


def test_monte_carlo_agrees_with_the_linear_answer_where_that_holds():
    given = {"density": (1000.0, 1.0), "speed": (2.0, 0.004)}
    linear = propagate(dynamic_pressure, given)
    drawn = propagate(dynamic_pressure, given, method="monte carlo")
    assert drawn.value == pytest.approx(linear.value, abs=0.1)
    assert drawn.uncertainty == pytest.approx(linear.uncertainty, rel=0.01)
    assert [part.uncertainty for part in drawn.budget] == pytest.approx(
        [part.uncertainty for part in linear.budget], rel=0.03
    )
    assert drawn == propagate(dynamic_pressure, given, method="monte carlo")  # seeded
    assert drawn != propagate(dynamic_pressure, given, method="monte carlo", seed=1)


def test_correlation_by_matrix_and_by_name():
    given = {"a": (1.0, 0.3), "b": (2.0, 0.4)}
    for coefficient, expected in ((1.0, 0.7), (-1.0, 0.1), (0.0, 0.5), (0.5, math.sqrt(0.25 + 0.12))):
        by_name = propagate(lambda a, b: a + b, given, correlation={("b", "a"): coefficient})
        by_matrix = propagate(lambda a, b: a + b, given, correlation=[[1.0, coefficient], [coefficient, 1.0]])
        assert by_name == by_matrix
        assert by_name.uncertainty == pytest.approx(expected, rel=1e-9)
        drawn = propagate(lambda a, b: a + b, given, correlation={("a", "b"): coefficient}, method="monte carlo")
        assert drawn.uncertainty == pytest.approx(expected, rel=0.01)


def test_welch_satterthwaite():
    # JCGM 100:2008, G.4.1, example: 0.25, 0.57 and 0.82 % with 9, 4 and 14 degrees of freedom give 1.03 % and 19.0
    # (from memory).
    given = [Estimate(1.0, u, degrees_of_freedom=v) for u, v in ((0.0025, 9), (0.0057, 4), (0.0082, 14))]
    found = propagate(lambda x1, x2, x3: x1 * x2 * x3, given)
    assert found.uncertainty == pytest.approx(0.0103, abs=5e-5)
    assert found.degrees_of_freedom == pytest.approx(19.0, abs=0.05)


def test_correlated_inputs_take_the_smallest_degrees_of_freedom():
    given = {
        "a": Estimate(1.0, 0.3, degrees_of_freedom=4),
        "b": Estimate(2.0, 0.4, degrees_of_freedom=9),
        "c": (0.0, 1.0),
    }
    found = propagate(lambda a, b, c: a + b + c, given, correlation={("a", "b"): 0.5})
    assert found.degrees_of_freedom == 4.0


def test_the_parts_of_an_input_are_kept():
    density = Estimate(1000.0, 5.0, "density", (Contribution("temperature", 3.0), Contribution("equation", 4.0)))
    given = {"density": density, "speed": (2.0, 0.04), "offset": 0.0}
    for method in ("linear", "monte carlo"):
        found = propagate(lambda density, speed, offset: density * speed**2 / 2 + offset, given, method=method)
        assert [part.name for part in found.budget] == ["density: temperature", "density: equation", "speed"]
        assert [part.uncertainty for part in found.budget] == pytest.approx([6.0, 8.0, 80.0], rel=0.03)
    lopsided = replace(density, uncertainty=6.0)  # parts that do not add up are not the whole story
    found = propagate(dynamic_pressure, {"density": lopsided, "speed": (2.0, 0.04)})
    assert [part.name for part in found.budget] == ["density", "speed"]


def test_the_distribution_of_an_input_reaches_the_result():
    table = tuple(-math.log1p(-p) for p in PROBABILITIES)  # exponential
    found = propagate(lambda x: 2.0 * x, {"x": Estimate(1.0, 1.0, quantiles=table)}, method="monte carlo")
    assert float(found.quantile(0.5)) == pytest.approx(2.0 * math.log(2.0), rel=0.02)
    student = propagate(lambda x: x, {"x": Estimate(0.0, 1.0, degrees_of_freedom=5)}, method="monte carlo")
    assert student.interval(0.95)[1] == pytest.approx(2.57, abs=0.05)
    constant = propagate(lambda x: 3.0, {"x": (1.0, 0.1)}, method="monte carlo")
    assert (constant.value, constant.uncertainty) == (3.0, 0.0)


def test_correlated_student_inputs_share_their_degrees_of_freedom():
    given = {name: Estimate(0.0, 1.0, degrees_of_freedom=4) for name in "ab"}
    found = propagate(lambda a, b: a - b, given, method="monte carlo", correlation={("a", "b"): 0.5})
    # the difference is t with the same 4 degrees of freedom and standard uncertainty 1: coverage factor 2.78 (table
    # G.2)
    assert found.interval(0.95)[1] == pytest.approx(2.78, abs=0.06)


@pytest.mark.parametrize(
    ("options", "sentence"),
    [
        ({"method": "magic"}, "method must be 'linear' or 'monte carlo', got 'magic'"),
        ({"correlation": np.eye(3)}, r"correlation has shape \(3, 3\), expected \(2, 2\)"),
        ({"correlation": [[1.0, 0.5], [0.4, 1.0]]}, "symmetric with 1 on its diagonal"),
        ({"correlation": [[4.0, 0.5], [0.5, 9.0]]}, "give coefficients, not covariances"),
        ({"correlation": {("a", "b"): 1.2}}, "The correlation is impossible: its smallest eigenvalue is -0.2"),
        ({"correlation": {("a", "c"): 0.5}}, "The correlation names 'c', which is no input; inputs are a, b"),
    ],
)
def test_options_that_make_no_sense_are_refused(options, sentence):
    with pytest.raises(ValueError, match=sentence):
        propagate(lambda a, b: a + b, {"a": (1.0, 0.1), "b": (2.0, 0.1)}, **options)


def test_a_limit_cannot_be_propagated():
    with pytest.raises(ValueError, match=r"a is at least 1\.00: a limit cannot be propagated"):
        propagate(lambda a: a, {"a": Estimate(1.0, NAN, bound="lower")})


def test_a_formula_that_does_not_hold_is_refused():
    with pytest.raises(ValueError, match="speed is nan at or near the given values"):
        propagate(lambda a: a * NAN, {"a": (1.0, 0.1)}, quantity="speed")
    with pytest.raises(
        ValueError, match=r"speed is not finite in .* draws; an input reaches where the formula does not"
    ):
        propagate(lambda a: np.where(a > 1.0, np.inf, a), {"a": (1.0, 0.1)}, quantity="speed", method="monte carlo")


def test_a_function_that_takes_no_arrays_is_told_so():
    with pytest.raises(TypeError, match=r"called with arrays of 200000 draws and failed .* write it with NumPy"):
        propagate(lambda a: math.sqrt(a), {"a": (1.0, 0.1)}, method="monte carlo")
    with pytest.raises(ValueError, match=r"returned shape \(2,\) for 200000 draws; write it with NumPy"):
        propagate(lambda a: a[:2], {"a": (1.0, 0.1)}, method="monte carlo")


def test_importing_is_cheap():
    code = (
        "import sys, numpy, vortexwidgets.uncertainty;"
        "heavy = {'scipy', 'pint', 'sympy', 'statistics'} & set(sys.modules);"
        "sys.exit(str(heavy) if heavy else 0)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
