"""Separable least squares: what is linear is eliminated, what is not is iterated on, with exact derivatives."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from vortexwidgets.fitting.problem import CORE_RADIUS, SHAPE, Problem

FloatArray = npt.NDArray[np.float64]

# A swirl scale that is not free but follows from core radius and shape: (swirl scale, its derivatives by relative change
# of core radius and of each shape parameter, divided by itself).
Tie: TypeAlias = Callable[[float, list[float]], tuple[float, list[float]]]

_STEPS = 60
# Squared distances to the minimum, in standard uncertainties.
_QUADRATIC = 1e-6  # from here on the iteration converges linearly at a constant rate
_REMAINING = 1e-10  # predicted after the next step: the iteration ends
_LEVEL = 1e-9  # below this promise a step is taken without asking whether chi-square, by now rounding, fell
_EPSILON = 1e-15  # of the power of the data: rounding of chi-square
_ROUNDING = 1e-26  # of the power of the data: what is left when a model fits exactly
_LARGEST = 1.0  # of a relative step

# A shape parameter beyond these no longer changes a profile that anyone could measure.
SHAPE_BOUNDS = (0.02, 200.0)


@dataclass(eq=False)
class Solution:
    """A minimum, or where the iteration stopped.

    The scaled parameters are [swirl scale (unless tied), background..., free nonlinear...]; the swirl scale and the
    nonlinear ones by relative change, and `scale` turns them into parameters.
    """

    problem: Problem
    nonlinear: list[float]
    free: tuple[int, ...]
    linear: list[float]  # swirl scale, background...
    steps: int
    converged: bool
    tied: bool
    _state: _State

    @property
    def swirl_scale(self) -> float:
        """Γ/(2π core_radius), or V. [m/s]"""
        return self.linear[0]

    @cached_property
    def chi_square(self) -> float:
        """Sum of squared weighted residuals, and of the prior's."""
        value = self._state.chi_square
        if value > 1e-8 * self.problem.samples.power:
            return value
        # The difference of two nearly equal sums has lost its digits: sum the residuals themselves.
        return float(self.residuals @ self.residuals)

    @cached_property
    def residuals(self) -> FloatArray:
        """Weighted residuals, shape (N,)."""
        response, _ = self.problem.columns(self.nonlinear, ())
        residuals = self.problem.samples.target - self.linear[0] * response
        if len(self.problem.samples.background):
            residuals -= np.array(self.linear[1:]) @ self.problem.samples.background
        return residuals

    @cached_property
    def normal(self) -> FloatArray:
        """Matrix of the normal equations by the scaled parameters, shape (P, P)."""
        factor = self._factors
        size = len(factor)
        return np.array(self._state.products)[:, :size] * factor * factor[:, None]

    @cached_property
    def jacobian(self) -> FloatArray:
        """Derivatives of the weighted model by the scaled parameters, shape (P, N)."""
        return np.array(self._state.columns) * self._factors[:, None]

    @property
    def _factors(self) -> FloatArray:
        strength = self.linear[0]
        return np.array([strength] * (not self.tied) + [1.0] * (len(self.linear) - 1) + [strength] * len(self.free))

    @cached_property
    def scale(self) -> FloatArray:
        """Parameter change per scaled change, shape (P,)."""
        strength = [] if self.tied else [self.linear[0]]
        lengths = [self.nonlinear[max(index, CORE_RADIUS)] for index in self.free]
        return np.array(strength + [1.0] * (len(self.linear) - 1) + lengths)


def solve(problem: Problem, start: list[float], free: tuple[int, ...], tie: Tie | None = None) -> Solution:
    """Minimise chi-square from a start, by Gauss-Newton on the eliminated problem, damped where it must be.

    Parameters
    ----------
    problem : Problem
        The samples and the model.
    start : list of float
        centre_x, centre_y, core_radius, shape...
    free : tuple of int
        Which of them may move.
    tie : callable, optional
        Makes the swirl scale a function of core radius and shape, for the profile of a derived quantity.

    Returns
    -------
    Solution
        At the last accepted point.

    References
    ----------
    .. [1] G. H. Golub and V. Pereyra, SIAM J. Numer. Anal. 10 (1973) 413-432; L. Kaufman, BIT 15 (1975) 49-57.
    """
    here = list(start)
    state = _state(problem, here, free, tie)
    unit = 1.0 / len(problem.samples.target)
    damping = 0.0
    last_step: list[float] = []
    last = math.inf
    converged = False
    steps = 0
    while steps < _STEPS:
        steps += 1
        step, decrement = state.step, state.decrement
        if len(here) > SHAPE and (stuck := _at_bounds(here, free, step)):
            step, decrement = _step_without(state, stuck, len(free))
        noise = unit * state.chi_square
        quadratic = decrement < _QUADRATIC * noise
        if decrement <= _ROUNDING * problem.samples.power or (quadratic and decrement > 0.25 * last):
            converged = True
            break
        if quadratic and decrement * min(decrement / last, 1.0) < _REMAINING * noise:
            # What is left after this step shrinks by a known factor: take the whole series at once.
            series = _series(step, last_step)
            here = _moved(here, free, [series * value for value in step])
            state.linear = [a + series * (b - a) for a, b in zip(state.linear, state.full, strict=True)]
            converged = True
            break
        if damping:
            step = _damped(state, damping, len(free))
        trial = _moved(here, free, step)
        new = _state(problem, trial, free, tie)
        if new.chi_square <= state.chi_square + _EPSILON * problem.samples.power or decrement < _LEVEL * noise:
            here, state = trial, new
            last, last_step = (decrement, step) if not damping else (math.inf, [])
            damping = 0.1 * damping if damping > 1e-4 else 0.0
        elif damping < 1e10:
            damping = max(10.0 * damping, 1e-3)
        else:
            break
    return Solution(problem, here, free, state.linear, steps, converged, tie is not None, state)


def misfit(problem: Problem, here: list[float]) -> float:
    """Chi-square at a point, with swirl scale and background eliminated."""
    return _state(problem, here, (), None).chi_square


@dataclass(eq=False, slots=True)
class _State:
    """Where the iteration stands: everything follows from the inner products of the columns."""

    response: FloatArray
    columns: list[FloatArray]  # background and derivatives, not yet times the strength
    products: list[list[float]]
    overlap: list[float]
    strength: float
    linear: list[float]  # eliminated at this point
    full: list[float]  # the same after the step
    step: list[float]  # relative, of the free nonlinear parameters
    chi_square: float
    decrement: float


def _state(problem: Problem, here: list[float], free: tuple[int, ...], tie: Tie | None) -> _State:
    response, derivatives = problem.columns(here, free)
    number = len(problem.samples.background)
    if tie is None:
        rows = [response, *problem.samples.background, *derivatives] if number else [response, *derivatives]
        target = problem.samples.target
        eliminated = 1 + number
        strength = math.nan
    else:
        strength, slopes = tie(here[CORE_RADIUS], here[3:])
        derivatives = [
            column if index < CORE_RADIUS else column + slopes[index - CORE_RADIUS] * response
            for index, column in zip(free, derivatives, strict=True)
        ]
        rows = [*problem.samples.background, *derivatives]
        target = problem.samples.target - strength * response
        eliminated = number
    matrix = np.array([*rows, target])
    products: list[list[float]] = (matrix @ matrix.T).tolist()
    overlap = products.pop()  # the last row and column are the target's
    power = overlap.pop()
    lower, half = _factor(products, overlap, 0, eliminated, [], [])
    linear = _back(lower, half)
    if tie is None:
        strength = linear[0]
    chi_square = power - sum([value * value for value in half])
    if problem.samples.prior is not None and problem.samples.prior[0] in free:
        # In units of the matrix a relative step is strength times the step.
        index, value, uncertainty = problem.samples.prior
        off, weight = (value - here[index]) / uncertainty, here[CORE_RADIUS] / uncertainty
        row = eliminated + free.index(index)
        chi_square += off * off
        products[row][row] += (weight / strength) ** 2
        overlap[row] += weight * off / strength
    lower, half = _factor(products, overlap, eliminated, len(overlap), lower, half)
    solved = _back(lower, half)
    decrement = sum([value * value for value in half[eliminated:]])
    step = [value / strength for value in solved[eliminated:]] if strength else [0.0] * len(free)
    full = solved[:eliminated]
    if tie is not None:
        linear, full = [strength, *linear], [strength, *full]
    return _State(response, rows, products, overlap, strength, linear, full, step, chi_square, decrement)


_SINGULAR = 1e-14  # of a diagonal element: what is left of it is rounding


def _factor(
    matrix: list[list[float]], right: list[float], first: int, last: int, lower: list[list[float]], half: list[float]
) -> tuple[list[list[float]], list[float]]:
    """Continue a Cholesky factor L and L⁻¹ right by the rows first to last; a singular row is left out of the solution."""
    lower, half = list(lower), list(half)
    for i in range(first, last):
        source = matrix[i]
        row: list[float] = []
        value = right[i]
        pivot = source[i]
        for j in range(i):
            above = lower[j]
            entry = source[j]
            for k in range(j):
                entry -= row[k] * above[k]
            entry /= above[j]
            row.append(entry)
            pivot -= entry * entry
            value -= entry * half[j]
        if pivot <= _SINGULAR * source[i]:
            row.append(math.inf)
            half.append(0.0)
        else:
            pivot = math.sqrt(pivot)
            row.append(pivot)
            half.append(value / pivot)
        lower.append(row)
    return lower, half


def _back(lower: list[list[float]], half: list[float]) -> list[float]:
    """Solve the transposed factor."""
    result = list(half)
    for i in range(len(result) - 1, -1, -1):
        row = lower[i]
        value = result[i] / row[i]
        result[i] = value
        for k in range(i):
            result[k] -= row[k] * value
    return result


def _damped(state: _State, damping: float, free: int) -> list[float]:
    """The step with the diagonal of the nonlinear parameters raised (Levenberg-Marquardt)."""
    products = [list(row) for row in state.products]
    for i in range(len(products) - free, len(products)):
        products[i][i] *= 1.0 + damping
    lower, half = _factor(products, state.overlap, 0, len(products), [], [])
    return (
        [value / state.strength for value in _back(lower, half)[len(products) - free :]]
        if state.strength
        else [0.0] * free
    )


def _series(step: list[float], last: list[float]) -> float:
    """Sum of the geometric series of steps over its first term, where two of them show the ratio (Aitken)."""
    size = sum([value * value for value in last])
    ratio = sum([a * b for a, b in zip(step, last, strict=True)]) / size if size else 0.0
    return 1.0 / (1.0 - ratio) if abs(ratio) < 0.5 else 1.0


def _moved(here: list[float], free: tuple[int, ...], step: list[float]) -> list[float]:
    """Lengths of the centre move by core radii; positive parameters move by a factor."""
    there = list(here)
    core_radius = here[CORE_RADIUS]
    for index, change in zip(free, step, strict=True):
        if index < CORE_RADIUS:
            limit = 3.0 * _LARGEST
            there[index] = here[index] + core_radius * max(-limit, min(limit, change))
        else:
            there[index] = here[index] * math.exp(max(-_LARGEST, min(_LARGEST, change)))
            if index >= SHAPE:
                there[index] = min(max(there[index], SHAPE_BOUNDS[0]), SHAPE_BOUNDS[1])
    return there


def _at_bounds(here: list[float], free: tuple[int, ...], step: list[float]) -> list[int]:
    """Positions of shape parameters that want to leave their bounds."""
    low, high = SHAPE_BOUNDS
    return [
        position
        for position, index in enumerate(free)
        if index >= SHAPE
        and ((here[index] >= high and step[position] > 0.0) or (here[index] <= low and step[position] < 0.0))
    ]


def _step_without(state: _State, stuck: list[int], free: int) -> tuple[list[float], float]:
    """Step and promised decrease with some nonlinear parameters held."""
    eliminated = len(state.overlap) - free
    keep = [row for row in range(len(state.overlap)) if row - eliminated not in stuck]
    products = [[state.products[row][column] for column in keep] for row in keep]
    lower, half = _factor(products, [state.overlap[row] for row in keep], 0, len(keep), [], [])
    solved = dict(zip(keep, _back(lower, half), strict=True))
    step = [solved.get(eliminated + k, 0.0) / state.strength if state.strength else 0.0 for k in range(free)]
    return step, sum([value * value for value in half[eliminated:]])
