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

    The scaled parameters are [swirl scale, background..., free nonlinear...]; the swirl scale and the nonlinear ones by
    relative change, and `scale` turns them into parameters.
    """

    problem: Problem
    nonlinear: list[float]
    free: tuple[int, ...]
    linear: list[float]  # swirl scale, background...
    steps: int
    converged: bool
    _state: _State
    _matrix: list[list[float]] | None

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
        factor = np.array(self._factors)
        return np.array([row[: len(factor)] for row in self._products]) * factor * factor[:, None]

    @cached_property
    def inverse(self) -> list[list[float]]:
        """Inverse of `normal` as rows; infinite where a parameter does not matter."""
        factor = self._factors
        lower, _ = _factored(self._products, [0.0] * len(factor))
        return [
            [value / (f * g) for value, g in zip(row, factor, strict=True)]
            for row, f in zip(_inverted(lower), factor, strict=True)
        ]

    @cached_property
    def jacobian(self) -> FloatArray:
        """Derivatives of the weighted model by the scaled parameters, shape (P, N)."""
        rows = _state(self.problem, self.nonlinear, self.free, None).rows
        return np.array(rows) * np.array(self._factors)[:, None]

    @cached_property
    def _products(self) -> list[list[float]]:
        """Inner products of the columns at the minimum itself, which the last step no longer asked for."""
        if self._matrix is not None:
            return self._matrix
        return _state(self.problem, self.nonlinear, self.free, None).products

    @property
    def _factors(self) -> list[float]:
        strength = self.linear[0]
        return [strength, *([1.0] * (len(self.linear) - 1)), *([strength] * len(self.free))]

    @property
    def scale(self) -> list[float]:
        """Parameter change per scaled change."""
        lengths = [self.nonlinear[max(index, CORE_RADIUS)] for index in self.free]
        return [self.linear[0], *([1.0] * (len(self.linear) - 1)), *lengths]


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
    linear: list[float] = []
    before: _State | None = None
    matrix: list[list[float]] | None = None
    last = math.inf
    converged = False
    steps = 0
    while steps < _STEPS:
        steps += 1
        step, decrement = state.step, state.decrement
        if len(here) > SHAPE and (stuck := _at_bounds(here, free, step)):
            step, decrement = _step_without(state, stuck)
        noise = unit * state.chi_square
        quadratic = decrement < _QUADRATIC * noise
        if decrement <= _ROUNDING * problem.samples.power or (quadratic and decrement > 0.25 * last):
            converged = True
            break
        if quadratic and decrement * min(decrement / last, 1.0) < _REMAINING * noise:
            # What is left after this step shrinks by a known factor: take the whole series at once.
            ratio = _ratio(step, last_step)
            series = 1.0 / (1.0 - ratio)
            if before is not None and tie is None:
                matrix = _ahead(before.products, state.products, series * ratio)
            here = _moved(here, free, [series * value for value in step])
            now, then = state.linear(tied=tie is not None), state.linear_after(tied=tie is not None)
            linear = [a + series * (b - a) for a, b in zip(now, then, strict=True)]
            converged = True
            break
        if damping:
            step = _damped(state, damping)
        trial = _moved(here, free, step)
        new = _state(problem, trial, free, tie)
        if new.chi_square <= state.chi_square + _EPSILON * problem.samples.power or decrement < _LEVEL * noise:
            here, before, state = trial, state, new
            last, last_step = (decrement, step) if not damping else (math.inf, [])
            damping = 0.1 * damping if damping > 1e-4 else 0.0
        elif damping < 1e10:
            damping = max(10.0 * damping, 1e-3)
        else:
            break
    if not linear:
        linear = state.linear(tied=tie is not None)
    return Solution(problem, here, free, linear, steps, converged, state, matrix)


def misfit(problem: Problem, here: list[float]) -> float:
    """Chi-square at a point, with swirl scale and background eliminated."""
    return _state(problem, here, (), None).chi_square


@dataclass(eq=False, slots=True)
class _State:
    """Where the iteration stands: everything follows from the inner products of the columns.

    The columns are [response unless tied, background..., derivatives...]; the first `eliminated` of them are linear.
    """

    rows: list[FloatArray]
    products: list[list[float]]
    overlap: list[float]
    eliminated: int
    lower: list[list[float]]
    half: list[float]
    strength: float
    step: list[float]  # relative, of the free nonlinear parameters
    chi_square: float
    decrement: float

    def linear(self, *, tied: bool) -> list[float]:
        """Swirl scale and background, eliminated at this point."""
        level = _back(self.lower[: self.eliminated], self.half[: self.eliminated])
        return [self.strength, *level] if tied else level

    def linear_after(self, *, tied: bool) -> list[float]:
        """The same after the step."""
        level = _back(self.lower, self.half)[: self.eliminated]
        return [self.strength, *level] if tied else level


def _state(problem: Problem, here: list[float], free: tuple[int, ...], tie: Tie | None) -> _State:
    samples = problem.samples
    response, rows = problem.columns(here, free)
    eliminated = len(samples.background)
    target = samples.target
    strength = math.nan
    if tie is not None:
        strength, slopes = tie(here[CORE_RADIUS], here[SHAPE:])
        rows = [
            column if index < CORE_RADIUS else column + slopes[index - CORE_RADIUS] * response
            for index, column in zip(free, rows, strict=True)
        ]
        target = target - strength * response
    if eliminated:
        rows = [*samples.background, *rows]
    if tie is None:
        rows.insert(0, response)
        eliminated += 1
    matrix = np.array([*rows, target])
    products: list[list[float]] = (matrix @ matrix.T).tolist()
    overlap = products.pop()  # the last row and column are the target's
    chi_square = overlap.pop()
    lower: list[list[float]] = []
    half: list[float] = []
    if samples.prior is None or samples.prior[0] not in free:
        _factor(products, overlap, lower, half, len(overlap))
        if tie is None:
            strength = half[0] / lower[0][0] if eliminated == 1 else _back(lower[:eliminated], half[:eliminated])[0]
    else:
        _factor(products, overlap, lower, half, eliminated)
        if tie is None:
            strength = _back(lower, half)[0]
        # In units of the matrix a relative step is strength times the step.
        index, value, uncertainty = samples.prior
        off, weight = (value - here[index]) / uncertainty, here[CORE_RADIUS] / uncertainty
        row = eliminated + free.index(index)
        chi_square += off * off
        if strength:
            products[row][row] += (weight / strength) ** 2
            overlap[row] += weight * off / strength
        _factor(products, overlap, lower, half, len(overlap))
    chi_square -= sum([value * value for value in half[:eliminated]])
    decrement = sum([value * value for value in half[eliminated:]])
    step = _relative(_back(lower, half)[eliminated:], strength)
    return _State(rows, products, overlap, eliminated, lower, half, strength, step, chi_square, decrement)


_SINGULAR = 1e-14  # of a diagonal element: what is left of it is rounding


def _factor(
    matrix: list[list[float]], right: list[float], lower: list[list[float]], half: list[float], last: int
) -> None:
    """Continue a Cholesky factor L and L⁻¹ right up to a row; a row that depends on the others is left out."""
    for i in range(len(half), last):
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
        if pivot > _SINGULAR * source[i]:
            pivot = math.sqrt(pivot)
            row.append(pivot)
            half.append(value / pivot)
        else:
            row.append(math.inf)
            half.append(0.0)
        lower.append(row)


def _inverted(lower: list[list[float]]) -> list[list[float]]:
    """Inverse of L Lᵀ; infinite on the diagonal of a row that was left out."""
    size = len(lower)
    columns = []
    for i in range(size):
        unit = [0.0] * size
        unit[i] = 1.0
        for j in range(i, size):
            row = lower[j]
            value = unit[j]
            for k in range(i, j):
                value -= row[k] * unit[k]
            unit[j] = value / row[j]
        columns.append(_back(lower, unit))
        if lower[i][i] == math.inf:
            columns[i][i] = math.inf
    return columns


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


def _damped(state: _State, damping: float) -> list[float]:
    """The step with the diagonal of the nonlinear parameters raised (Levenberg-Marquardt)."""
    products = [list(row) for row in state.products]
    for i in range(state.eliminated, len(products)):
        products[i][i] *= 1.0 + damping
    lower, half = _factored(products, state.overlap)
    return _relative(_back(lower, half)[state.eliminated :], state.strength)


def _step_without(state: _State, stuck: list[int]) -> tuple[list[float], float]:
    """Step and promised decrease with some nonlinear parameters held."""
    size, eliminated = len(state.overlap), state.eliminated
    keep = [row for row in range(size) if row - eliminated not in stuck]
    lower, half = _factored(
        [[state.products[row][column] for column in keep] for row in keep], [state.overlap[row] for row in keep]
    )
    solved = dict(zip(keep, _back(lower, half), strict=True))
    step = _relative([solved.get(row, 0.0) for row in range(eliminated, size)], state.strength)
    return step, sum([value * value for value in half[eliminated:]])


def _factored(matrix: list[list[float]], right: list[float]) -> tuple[list[list[float]], list[float]]:
    lower: list[list[float]] = []
    half: list[float] = []
    _factor(matrix, right, lower, half, len(right))
    return lower, half


def _relative(step: list[float], strength: float) -> list[float]:
    """From a step times the strength to a relative step."""
    return [value / strength for value in step] if strength else [0.0] * len(step)


def _ratio(step: list[float], last: list[float]) -> float:
    """Ratio of the geometric series of steps (Aitken); 0 where two of them do not show one."""
    size = sum([value * value for value in last])
    ratio = sum([a * b for a, b in zip(step, last, strict=True)]) / size if size else 0.0
    return ratio if abs(ratio) < 0.5 else 0.0


def _ahead(before: list[list[float]], now: list[list[float]], further: float) -> list[list[float]]:
    """Matrix after one more step, `further` times the last one, along the same line."""
    return [[b + further * (b - a) for a, b in zip(old, new, strict=True)] for old, new in zip(before, now, strict=True)]


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
