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

# A swirl scale that is not free but follows from core radius and shape: (swirl scale, its derivatives by relative
# change of core radius and of each shape parameter, divided by itself).
Tie: TypeAlias = Callable[[float, list[float]], tuple[float, list[float]]]

_STEPS = 60
# Squared distances to the minimum, in standard uncertainties.
_QUADRATIC = 1e-6  # from here on the iteration converges linearly at a constant rate
_REMAINING = 1e-10  # predicted after the next step: the iteration ends
_LEVEL = 1e-9  # below this promise a step is taken without asking whether chi-square, by now rounding, fell
_EPSILON = 1e-15  # of the power of the data: rounding of chi-square
_ROUNDING = 1e-26  # of the power of the data: what is left when a model fits exactly
_LARGEST = 1.0  # of a relative step
_CANCELLED = 1e-8  # of the power of the data: below it chi-square as a difference of sums has too few digits
_SINGULAR = 1e-14  # of a diagonal element: what is left of it is rounding

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
    _estimate: float
    _gram: FloatArray | None

    @property
    def swirl_scale(self) -> float:
        """Γ/(2π core_radius), or V. [m/s]"""
        return self.linear[0]

    @property
    def chi_square(self) -> float:
        """Sum of squared weighted residuals, and of the prior's."""
        if self._estimate > _CANCELLED * self.problem.samples.power:
            return self._estimate
        # The difference of two nearly equal sums has lost its digits: sum the residuals themselves.
        value = float(self.residuals @ self.residuals)
        prior = self.problem.samples.prior
        return value if prior is None or prior[0] not in self.free else value + _pull(prior, self.nonlinear) ** 2

    @cached_property
    def residuals(self) -> FloatArray:
        """Weighted residuals, shape (N,)."""
        response, _ = self.problem.columns(self.nonlinear, ())
        residuals = self.problem.samples.target - self.linear[0] * response
        if len(self.problem.samples.background):
            residuals -= np.array(self.linear[1:]) @ self.problem.samples.background
        return residuals

    @property
    def normal(self) -> FloatArray:
        """Matrix of the normal equations by the scaled parameters, shape (P, P)."""
        factor = np.array(self._factors)
        return np.asarray(self._products[:-1, :-1] * factor * factor[:, None])

    @property
    def inverse(self) -> list[list[float]]:
        """Inverse of `normal` as rows; infinite where a parameter does not matter."""
        factors = self._factors
        inverse = _inverse(self._products.tolist(), len(factors))
        for row, own in zip(inverse, factors, strict=True):
            for column, other in enumerate(factors):
                row[column] /= own * other
        return inverse

    @property
    def jacobian(self) -> FloatArray:
        """Derivatives of the weighted model by the scaled parameters, shape (P, N)."""
        columns = _Columns(self.problem, self.free, None)
        columns.at(self.nonlinear)
        return np.asarray(columns.matrix[:-1] * np.array(self._factors)[:, None])

    @property
    def _products(self) -> FloatArray:
        """Inner products of the columns at the minimum itself, which the last step no longer asked for."""
        if self._gram is not None:
            return self._gram
        return _Columns(self.problem, self.free, None).at(self.nonlinear).gram

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
    here = start
    columns = _Columns(problem, free, tie)
    state = columns.at(here)
    power, unit = problem.samples.power, 1.0 / len(problem.samples.target)
    damping = 0.0
    before: _State | None = None
    last_step: list[float] = []
    last = math.inf
    linear = state.level
    gram: FloatArray | None = None
    converged = False
    steps = 0
    while steps < _STEPS:
        steps += 1
        solution, step, decrement = state.solution, state.step, state.decrement
        if len(here) > SHAPE and (stuck := _at_bounds(here, free, step)):
            solution, decrement = _without(state, stuck)
            step = _relative(solution[columns.eliminated:], state.strength)
        noise = unit * state.chi_square
        quadratic = decrement < _QUADRATIC * noise
        if decrement <= _ROUNDING * power or (quadratic and decrement > 0.25 * last):
            converged = True
            break
        if quadratic and decrement * min(decrement / last, 1.0) < _REMAINING * noise:
            # What is left after this step shrinks by a known factor: take the whole series at once.
            ratio = _ratio(step, last_step)
            series = 1.0 / (1.0 - ratio)
            if before is not None and tie is None:
                gram = state.gram + series * ratio * (state.gram - before.gram)
            here = _moved(here, free, [series * value for value in step])
            linear = [now + series * (then - now) for now, then in zip(state.level, solution, strict=False)]
            converged = True
            break
        if damping:
            step = _damped(state, damping)
        trial = _moved(here, free, step)
        new = columns.at(trial)
        if new.chi_square <= state.chi_square + _EPSILON * power or decrement < _LEVEL * noise:
            here, before, state, linear = trial, state, new, new.level
            last, last_step = (decrement, step) if not damping else (math.inf, [])
            damping = 0.1 * damping if damping > 1e-4 else 0.0
        elif damping < 1e10:
            damping = max(10.0 * damping, 1e-3)
        else:
            break
    if tie is not None:
        linear = [state.strength, *linear]
    return Solution(problem, here, free, linear, steps, converged, state.chi_square, gram)


def misfit(problem: Problem, here: list[float]) -> float:
    """Chi-square at a point, with swirl scale and background eliminated."""
    return _Columns(problem, (), None).at(here).chi_square


@dataclass(eq=False, slots=True)
class _State:
    """Where the iteration stands: everything follows from the inner products of the columns."""

    gram: FloatArray  # inner products of the columns, shape (P + 1, P + 1)
    eliminated: int
    strength: float
    level: list[float]  # what is linear, eliminated at this point
    solution: list[float]  # the same after the step, then the step times the strength
    step: list[float]  # relative, of the free nonlinear parameters
    chi_square: float
    decrement: float  # of chi-square, promised by the step


class _Columns:
    """The columns of a problem as rows of one matrix that every evaluation fills anew.

    They are [response unless tied, background..., derivatives..., target]; those before the derivatives are linear.
    """

    def __init__(self, problem: Problem, free: tuple[int, ...], tie: Tie | None) -> None:
        samples = problem.samples
        tied = tie is not None
        self.problem, self.free, self.tie = problem, free, tie
        background = len(samples.background)
        self.eliminated = background + (not tied)
        self.matrix = np.empty((self.eliminated + len(free) + 1, len(samples.target)))
        rows = list(self.matrix)
        if background:
            self.matrix[self.eliminated - background : self.eliminated] = samples.background
        rows[-1][:] = samples.target
        self.response = np.empty_like(samples.target) if tied else rows[0]
        self.filled = [self.response, *rows[self.eliminated : -1]]
        self.target = rows[-1]
        self.transposed = self.matrix.T
        self.prior = samples.prior if samples.prior is not None and samples.prior[0] in free else None

    def at(self, here: list[float]) -> _State:
        """Evaluate the columns at a point and eliminate what is linear."""
        self.problem.fill(here, self.free, self.filled)
        strength = math.nan if self.tie is None else self._tied(here, self.tie)
        gram = self.matrix.dot(self.transposed)
        if self.prior is not None:
            self._add_prior(self.prior, gram, here, strength)
        level, solution, chi_square, decrement = _solved(gram.tolist(), self.eliminated)
        if self.tie is None:
            strength = level[0]
        step = _relative(solution[self.eliminated :], strength)
        return _State(gram, self.eliminated, strength, level, solution, step, chi_square, decrement)

    def _tied(self, here: list[float], tie: Tie) -> float:
        """Take the swirl that is not free off the target, and turn the derivatives along the tie."""
        strength, slopes = tie(here[CORE_RADIUS], here[SHAPE:])
        for index, row in zip(self.free, self.filled[1:], strict=True):
            if index >= CORE_RADIUS:
                row += slopes[index - CORE_RADIUS] * self.response
        np.subtract(self.problem.samples.target, strength * self.response, out=self.target)
        return strength

    def _add_prior(
        self, prior: tuple[int, float, float], gram: FloatArray, here: list[float], strength: float
    ) -> None:
        """Add the row of a parameter that is known beforehand, as a sample of its own."""
        index, _, uncertainty = prior
        if self.tie is None:
            strength = _solved(gram.tolist(), self.eliminated)[0][0]
        off, row = _pull(prior, here), self.eliminated + self.free.index(index)
        # In units of the matrix a relative step is strength times the step.
        weight = here[CORE_RADIUS] / uncertainty / strength if strength else 0.0
        gram[row, row] += weight * weight
        gram[row, -1] += weight * off
        gram[-1, row] += weight * off
        gram[-1, -1] += off * off


def _pull(prior: tuple[int, float, float], here: list[float]) -> float:
    """How far a parameter stands below what was known beforehand, in standard uncertainties."""
    index, value, uncertainty = prior
    return (value - here[index]) / uncertainty


def _solved(matrix: list[list[float]], eliminated: int) -> tuple[list[float], list[float], float, float]:
    """Solve the normal equations, whose right side is the last row and column, from the upper left on.

    Returns
    -------
    level : list of float
        Solution of the first `eliminated` rows alone.
    solution : list of float
        Solution of all.
    chi_square : float
        What the first rows leave of the lower right element.
    decrement : float
        What the other rows take off it.

    Notes
    -----
    Gaussian elimination without pivoting, as fits a positive matrix. A row that depends on those above is left out, its
    unknown 0.
    """
    size = len(matrix) - 1
    if size == 3 and eliminated == 1 and (short := _solved_by_hand(matrix)):
        return short
    upper: list[list[float]] = []
    chi_square, decrement = matrix[size][size], 0.0
    for i in range(size):
        row = matrix[i][:]
        for j, above in enumerate(upper):
            factor = above[i] / above[j]
            for k in range(i, size + 1):
                row[k] -= factor * above[k]
        if not row[i] > _SINGULAR * matrix[i][i]:
            row[i] = math.inf
        upper.append(row)
        if i < eliminated:
            chi_square -= row[size] / row[i] * row[size]
        else:
            decrement += row[size] / row[i] * row[size]
    return _back(upper, eliminated), _back(upper, size), chi_square, decrement


def _back(upper: list[list[float]], size: int) -> list[float]:
    """Solve the first rows of an upper triangle whose last column is the right side."""
    solution = [0.0] * size
    for i in range(size - 1, -1, -1):
        row = upper[i]
        value = row[-1]
        for k in range(i + 1, size):
            value -= row[k] * solution[k]
        solution[i] = value / row[i]
    return solution


def _solved_by_hand(matrix: list[list[float]]) -> tuple[list[float], list[float], float, float] | None:
    """The same for a strength and two others, in the same order; six times faster than the loops. None if singular."""
    (a, b, c, t), (_, d, e, u), (_, _, f, v), (_, _, _, chi_square) = matrix
    if not a > 0.0:
        return None
    d_least, f_least = _SINGULAR * d, _SINGULAR * f
    factor = b / a
    d -= factor * b
    e -= factor * c
    u -= factor * t
    factor = c / a
    f -= factor * c
    v -= factor * t
    if not d > d_least:
        return None
    factor = e / d
    f -= factor * e
    v -= factor * u
    if not f > f_least:
        return None
    z = v / f
    y = (u - e * z) / d
    level = t / a
    return [level], [(t - b * y - c * z) / a, y, z], chi_square - level * t, u / d * u + z * v


def _inverse(matrix: list[list[float]], size: int) -> list[list[float]]:
    """Inverse of the upper left of a positive matrix; infinite on the diagonal of a row that depends on those above."""
    inverse = [row[:size] for row in matrix[:size]]
    left_out = []
    for i in range(size):
        row = inverse[i]
        pivot = row[i]
        if not pivot > _SINGULAR * matrix[i][i]:
            left_out.append(i)
            continue
        row[i] = 1.0
        for k in range(size):
            row[k] /= pivot
        for other in inverse:
            if other is not row:
                factor = other[i]
                other[i] = 0.0
                for k in range(size):
                    other[k] -= factor * row[k]
    for i in left_out:
        for k in range(size):
            inverse[i][k] = inverse[k][i] = 0.0
        inverse[i][i] = math.inf
    return inverse


def _damped(state: _State, damping: float) -> list[float]:
    """The step with the diagonal of the nonlinear parameters raised (Levenberg-Marquardt)."""
    products = state.gram.tolist()
    for i in range(state.eliminated, len(products) - 1):
        products[i][i] *= 1.0 + damping
    _, solution, _, _ = _solved(products, state.eliminated)
    return _relative(solution[state.eliminated :], state.strength)


def _without(state: _State, stuck: list[int]) -> tuple[list[float], float]:
    """Solution and promised decrease with some nonlinear parameters held."""
    size, eliminated = len(state.solution), state.eliminated
    keep = [row for row in range(size) if row - eliminated not in stuck]
    products = state.gram[np.ix_([*keep, size], [*keep, size])].tolist()
    _, solution, _, decrement = _solved(products, eliminated)
    solved = dict(zip(keep, solution, strict=True))
    return [solved.get(row, 0.0) for row in range(size)], decrement


def _relative(step: list[float], strength: float) -> list[float]:
    """From a step times the strength to a relative step."""
    return [value / strength for value in step] if strength else [0.0] * len(step)


def _ratio(step: list[float], last: list[float]) -> float:
    """Ratio of the geometric series of steps (Aitken); 0 where two of them do not show one."""
    size = sum([value * value for value in last])
    ratio = sum([a * b for a, b in zip(step, last, strict=True)]) / size if size else 0.0
    return ratio if abs(ratio) < 0.5 else 0.0


def _moved(here: list[float], free: tuple[int, ...], step: list[float]) -> list[float]:
    """Lengths of the centre move by core radii; positive parameters move by a factor."""
    there = here[:]
    for index, change in zip(free, step, strict=True):
        if index < CORE_RADIUS:
            there[index] += here[CORE_RADIUS] * _limited(change, 3.0 * _LARGEST)
        else:
            there[index] *= math.exp(_limited(change, _LARGEST))
            if index >= SHAPE:
                there[index] = min(max(there[index], SHAPE_BOUNDS[0]), SHAPE_BOUNDS[1])
    return there


def _limited(change: float, limit: float) -> float:
    return change if abs(change) < limit else math.copysign(limit, change)


def _at_bounds(here: list[float], free: tuple[int, ...], step: list[float]) -> list[int]:
    """Positions of shape parameters that want to leave their bounds."""
    low, high = SHAPE_BOUNDS
    return [
        position
        for position, index in enumerate(free)
        if index >= SHAPE
        and ((here[index] >= high and step[position] > 0.0) or (here[index] <= low and step[position] < 0.0))
    ]
