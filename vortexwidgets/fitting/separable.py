"""Separable least squares: what is linear is eliminated, what is not is iterated on, with exact derivatives."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from vortexwidgets.fitting.problem import CORE_RADIUS, Problem

FloatArray = npt.NDArray[np.float64]

# A strength that is not free but follows from core radius and shape: (strength, its derivatives by relative change of
# core radius and of each shape parameter, divided by the strength).
Tie: TypeAlias = Callable[[float, list[float]], tuple[float, list[float]]]

_STEPS = 60
_DECREMENT = 1e-15  # squared distance to the minimum, in standard uncertainties, at which the iteration ends
_QUADRATIC = 1e-10  # of chi-square: below this promise a step is taken without asking whether chi-square fell
_ROUNDING = 1e-26  # of the power of the data: what is left when a model fits exactly
_LARGEST = 1.0  # of a relative step


@dataclass(frozen=True, eq=False)
class Solution:
    """A minimum, or where the iteration stopped.

    `normal` is the matrix of normal equations by the scaled parameters [strength?, background..., free nonlinear...];
    `scale` turns their relative steps into parameters.
    """

    nonlinear: list[float]
    free: tuple[int, ...]
    linear: FloatArray  # strength, background...
    chi_square: float
    residuals: FloatArray
    normal: FloatArray
    scale: FloatArray
    jacobian: FloatArray  # (parameters, N), scaled
    steps: int
    converged: bool
    tied: bool

    @property
    def strength(self) -> float:
        """The strength, free or tied."""
        return float(self.linear[0])


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
        Makes the strength a function of core radius and shape, for the profile of a derived quantity.

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
    count = len(problem.target)
    damping = 0.0
    last = math.inf
    converged = False
    steps = 0
    while steps < _STEPS and not converged:
        steps += 1
        step, decrement = _step(state.normal, state.gradient, damping)
        if decrement <= max(_DECREMENT * state.chi_square / count, _ROUNDING * state.power):
            converged = True
            break
        trial = _moved(here, free, step)
        new = _state(problem, trial, free, tie)
        if decrement < _QUADRATIC * state.chi_square:  # so near that chi-square itself is only rounding
            here, state = trial, new
            converged = decrement > 0.25 * last
            last = decrement
        elif new.chi_square <= state.chi_square:
            here, state = trial, new
            damping = 0.1 * damping if damping > 1e-4 else 0.0
        elif damping < 1e10:
            damping = max(10.0 * damping, 1e-3)
        else:
            break
    return Solution(
        nonlinear=here,
        free=free,
        linear=state.linear,
        chi_square=state.chi_square,
        residuals=state.residuals,
        normal=state.normal,
        scale=_scale(here, free, state, tied=tie is not None),
        jacobian=state.rows,
        steps=steps,
        converged=converged,
        tied=tie is not None,
    )


@dataclass(frozen=True, eq=False, slots=True)
class _State:
    linear: FloatArray
    residuals: FloatArray
    chi_square: float
    power: float
    rows: FloatArray
    normal: FloatArray
    gradient: FloatArray


def _state(problem: Problem, here: list[float], free: tuple[int, ...], tie: Tie | None) -> _State:
    response, derivatives = problem.columns(here, free)
    target, background = problem.target, problem.background
    number = len(background)
    if tie is None:
        strength, level = _eliminate(response, background, target)
        fixed = 0
    else:
        strength, slopes = tie(here[CORE_RADIUS], here[3:])
        level = _linear(background, target - strength * response) if number else _NOTHING
        derivatives = [
            column if index < CORE_RADIUS else column + slopes[index - CORE_RADIUS] * response
            for index, column in zip(free, derivatives, strict=True)
        ]
        fixed = 1
    rows = np.empty((1 - fixed + number + len(free), len(target)))
    residuals = target - strength * response
    first = 0
    if not fixed:
        np.multiply(response, strength, out=rows[0])
        first = 1
    if number:
        residuals -= level @ background
        rows[first : first + number] = background
    for row, column in enumerate(derivatives, first + number):
        np.multiply(column, strength, out=rows[row])
    normal = rows @ rows.T
    gradient = rows @ residuals
    chi_square = float(residuals @ residuals)
    power = float(target @ target)
    if problem.prior is not None and problem.prior[0] in free:
        index, value, uncertainty = problem.prior
        off = (value - here[index]) / uncertainty
        weight = here[CORE_RADIUS] / uncertainty
        row = first + number + free.index(index)
        chi_square += off * off
        normal[row, row] += weight * weight
        gradient[row] += weight * off
    linear = np.empty(1 + number)
    linear[0] = strength
    linear[1:] = level
    return _State(linear, residuals, chi_square, power, rows, normal, gradient)


_NOTHING = np.empty(0)


def _eliminate(response: FloatArray, background: FloatArray, target: FloatArray) -> tuple[float, FloatArray]:
    if len(background) == 0:
        weight = float(response @ response)
        return (float(response @ target) / weight if weight > 0.0 else 0.0), _NOTHING
    size = math.sqrt(float(response @ response))
    if size == 0.0:
        return 0.0, _linear(background, target)
    basis = np.vstack([response / size, background])
    level = _linear(basis, target)
    return float(level[0]) / size, level[1:]


def _linear(basis: FloatArray, target: FloatArray) -> FloatArray:
    size = np.sqrt(np.einsum("ij,ij->i", basis, basis))
    size[size == 0.0] = 1.0
    basis = basis / size[:, None]
    try:
        level = np.linalg.solve(basis @ basis.T, basis @ target)
    except np.linalg.LinAlgError:
        level = np.linalg.lstsq(basis.T, target, rcond=None)[0]
    return np.asarray(level / size)


def _step(normal: FloatArray, gradient: FloatArray, damping: float) -> tuple[FloatArray, float]:
    """Step in the scaled parameters and the decrease of chi-square that it promises."""
    size = np.sqrt(normal.diagonal())
    if not size.all():
        size = np.where(size > 0.0, size, 1.0)
    matrix = normal / size / size[:, None]
    if damping:
        matrix = matrix + damping * np.eye(len(size))
    right = gradient / size
    try:
        step = np.linalg.solve(matrix, right)
    except np.linalg.LinAlgError:
        step = np.linalg.lstsq(matrix, right, rcond=1e-12)[0]
    return step / size, float(step @ right)


def _moved(here: list[float], free: tuple[int, ...], step: FloatArray) -> list[float]:
    """Lengths of the centre move by core radii; positive parameters move by a factor."""
    there = list(here)
    core_radius = here[CORE_RADIUS]
    for index, change in zip(free, step[len(step) - len(free) :].tolist(), strict=True):
        if index < CORE_RADIUS:
            limit = 3.0 * _LARGEST
            there[index] = here[index] + core_radius * max(-limit, min(limit, change))
        else:
            there[index] = here[index] * math.exp(max(-_LARGEST, min(_LARGEST, change)))
    return there


def _scale(here: list[float], free: tuple[int, ...], state: _State, *, tied: bool) -> FloatArray:
    core_radius = here[CORE_RADIUS]
    strength = [] if tied else [state.linear[0]]
    background = [1.0] * (len(state.linear) - 1)
    return np.array(strength + background + [core_radius if index <= CORE_RADIUS else here[index] for index in free])
