"""Separable least squares: what is linear is eliminated, what is not is iterated on, with exact derivatives."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from vortexwidgets.fitting.elimination import back, bent, inverted, reduced, solved
from vortexwidgets.fitting.kept import Kept
from vortexwidgets.fitting.problem import CORE_RADIUS, SHAPE, Problem

FloatArray = npt.NDArray[np.float64]

# A swirl scale that is not free but follows from core radius and shape: (swirl scale, its derivatives by relative
# change of core radius and of each shape parameter, divided by itself).
Tie: TypeAlias = Callable[[float, list[float]], tuple[float, list[float]]]

Bounds: TypeAlias = tuple[float, float]

_STEPS = 60
# Squared distances to the minimum, in standard uncertainties.
_QUADRATIC = 1e-6  # from here on the model of chi-square is taken at its word
_SLOW = 3  # steps in a row that hardly came closer, though all is but quadratic: a kink of the profile is there
_NEAR = 9.0  # closer than this the curvature beyond first derivatives is learnt from the steps
_REMAINING = 1e-11  # predicted after the next step: the iteration ends
_LEVEL = 1e-9  # below this promise a step is taken without asking whether chi-square, by now rounding, fell
_EPSILON = 1e-15  # of the power of the data: rounding of chi-square
_ROUNDING = 1e-26  # of the power of the data: what is left when a model fits exactly
_LARGEST = 1.0  # of a relative step
_CANCELLED = 1e-8  # of the power of the data: below it chi-square as a difference of sums has too few digits

# A core radius beyond these multiples of the survey's extent is solid-body rotation, or no core at all.
_CORE = (1e-7, 1e5)

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

    @Kept
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
        inverse = inverted(self._products.tolist(), len(factors))
        return [
            [value / (own * other) for value, other in zip(row, factors, strict=True)]
            for row, own in zip(inverse, factors, strict=True)
        ]

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
    core_bounds = (_CORE[0] * problem.samples.extent, _CORE[1] * problem.samples.extent)
    damping = 0.0
    before: _State | None = None
    last = math.inf
    bend: list[list[float]] | None = None
    linear = state.level
    fallen = 0.0  # by which the last step, that asked for no evaluation, lowers chi-square
    gram: FloatArray | None = None
    converged = False
    steps = slow = 0
    while steps < _STEPS:
        steps += 1
        noise = unit * state.chi_square
        step, decrement = solved(state.reduced)
        on_edge = len(here) > SHAPE or not core_bounds[0] < here[CORE_RADIUS] < core_bounds[1]
        if on_edge and (stuck := _at_bounds(here, free, step, core_bounds)):
            step, decrement = _without(state.reduced, stuck)
        elif before is not None and last < _NEAR * noise:
            bend = _bent(bend, before, state, free)
            other, promise = solved(state.reduced, bend)
            if 0.25 * decrement < promise < 4.0 * decrement:
                step = other
        quadratic = decrement < _QUADRATIC * noise
        slow = slow + 1 if quadratic and decrement > 0.25 * last else 0
        if decrement <= _ROUNDING * power or slow == _SLOW:
            converged = True
            break
        if quadratic and decrement * min(decrement / last, 1.0) < _REMAINING * noise:
            if before is not None and tie is None:
                further = _share(step, _step_between(before.here, here, free))
                gram = state.gram + further * (state.gram - before.gram)
            here = _moved(here, free, step, core_bounds)
            linear = back(state.upper, [state.strength * value for value in step])
            fallen = decrement
            converged = True
            break
        if damping:
            step = _damped(state.reduced, damping)
        trial = _moved(here, free, step, core_bounds)
        new = columns.at(trial)
        if new.chi_square <= state.chi_square + _EPSILON * power or decrement < _LEVEL * noise:
            if damping:
                before, last, bend = None, math.inf, None
            else:
                before, last = state, decrement
            here, state, linear = trial, new, new.level
            damping = 0.1 * damping if damping > 1e-4 else 0.0
        elif damping < 1e10:
            damping = max(10.0 * damping, 1e-3)
        else:
            break
    if tie is not None:
        linear = [tie(here[CORE_RADIUS], here[SHAPE:])[0], *linear]
    return Solution(problem, here, free, linear, steps, converged, state.chi_square - fallen, gram)


def misfit(problem: Problem, here: list[float]) -> float:
    """Chi-square at a point, with swirl scale and background eliminated."""
    return _Columns(problem, (), None).at(here).chi_square


@dataclass(eq=False, slots=True)
class _State:
    """Where the iteration stands: everything follows from the inner products of the columns."""

    here: list[float]
    gram: FloatArray  # inner products of the columns, shape (P + 1, P + 1)
    strength: float
    level: list[float]  # what is linear, eliminated at this point
    upper: list[list[float]]  # the rows that did it
    reduced: list[list[float]]  # curvature of chi-square/2 by the nonlinear parameters, and last in each row its fall
    chi_square: float


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
        strength = None if self.tie is None else self._tied(here, self.tie)
        gram = self.matrix.dot(self.transposed)
        if self.prior is not None:
            self._add_prior(self.prior, gram, here, strength)
        return _State(here, gram, *reduced(gram.tolist(), self.eliminated, strength))

    def _tied(self, here: list[float], tie: Tie) -> float:
        """Take the swirl that is not free off the target, and turn the derivatives along the tie."""
        strength, slopes = tie(here[CORE_RADIUS], here[SHAPE:])
        for index, row in zip(self.free, self.filled[1:], strict=True):
            if index >= CORE_RADIUS:
                row += slopes[index - CORE_RADIUS] * self.response
        np.subtract(self.problem.samples.target, strength * self.response, out=self.target)
        return strength

    def _add_prior(
        self, prior: tuple[int, float, float], gram: FloatArray, here: list[float], strength: float | None
    ) -> None:
        """Add the row of a parameter that is known beforehand, as a sample of its own."""
        index, _, uncertainty = prior
        if strength is None:
            strength = reduced(gram.tolist(), self.eliminated, None)[0]
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


def _bent(bend: list[list[float]] | None, before: _State, state: _State, free: tuple[int, ...]) -> list[list[float]]:
    """The bend, with what the last step showed of it."""
    # Lengths of the centre were counted in another core radius before.
    ratio = state.here[CORE_RADIUS] / before.here[CORE_RADIUS]
    units = [ratio if index < CORE_RADIUS else 1.0 for index in free]
    return bent(bend, before.reduced, state.reduced, units, _step_between(before.here, state.here, free))


def _damped(equations: list[list[float]], damping: float) -> list[float]:
    """The step with the diagonal raised (Levenberg-Marquardt)."""
    raised = [row[:] for row in equations]
    for i, row in enumerate(raised):
        row[i] *= 1.0 + damping
    return solved(raised)[0]


def _without(equations: list[list[float]], stuck: list[int]) -> tuple[list[float], float]:
    """Step and promised decrease with some parameters held."""
    keep = [position for position in range(len(equations)) if position not in stuck]
    short, decrement = solved([[equations[row][column] for column in [*keep, -1]] for row in keep])
    step = [0.0] * len(equations)
    for position, value in zip(keep, short, strict=True):
        step[position] = value
    return step, decrement


def _share(step: list[float], last: list[float]) -> float:
    """How much further along the last step this one goes."""
    size = sum([value * value for value in last])
    return sum([a * b for a, b in zip(step, last, strict=True)]) / size if size else 0.0


def _step_between(here: list[float], there: list[float], free: tuple[int, ...]) -> list[float]:
    """The relative step that was taken, in core radii of where it went."""
    return [
        (there[index] - here[index]) / there[CORE_RADIUS]
        if index < CORE_RADIUS
        else math.log(there[index] / here[index])
        for index in free
    ]


def _moved(here: list[float], free: tuple[int, ...], step: list[float], core_bounds: Bounds) -> list[float]:
    """Lengths of the centre move by core radii; positive parameters move by a factor, within their bounds."""
    there = here[:]
    for index, change in zip(free, step, strict=True):
        limit = 3.0 * _LARGEST if index < CORE_RADIUS else _LARGEST
        if not abs(change) < limit:
            change = math.copysign(limit, change)
        if index < CORE_RADIUS:
            there[index] += here[CORE_RADIUS] * change
        else:
            low, high = core_bounds if index == CORE_RADIUS else SHAPE_BOUNDS
            there[index] = min(max(there[index] * math.exp(change), low), high)
    return there


def _at_bounds(here: list[float], free: tuple[int, ...], step: list[float], core_bounds: Bounds) -> list[int]:
    """Positions of parameters that want to leave their bounds."""
    stuck = []
    for position, index in enumerate(free):
        if index >= CORE_RADIUS:
            low, high = core_bounds if index == CORE_RADIUS else SHAPE_BOUNDS
            outward = (here[index] >= high and step[position] > 0.0) or (here[index] <= low and step[position] < 0.0)
            if outward:
                stuck.append(position)
    return stuck
