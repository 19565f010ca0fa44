"""Limits by profile likelihood: how far one quantity can move while all others follow."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from vortexwidgets.fitting.problem import CORE_RADIUS, Problem, Samples
from vortexwidgets.fitting.separable import Solution, Tie, solve

_TOLERANCE = 2e-3  # of the distance sought, in standard uncertainties
_TRIES = 12


@dataclass(frozen=True, eq=False)
class Profile:
    """Chi-square against one quantity, all else refitted.

    `value` is where the quantity stands at the minimum, `step` its linear standard uncertainty (a first guess only);
    a `positive` quantity is followed by its logarithm.
    """

    problem: Problem
    minimum: Solution
    value: float
    step: float
    positive: bool
    at: Callable[[float, list[float]], Solution]

    def excess(self, value: float, nuisance: list[float]) -> tuple[float, list[float]]:
        """Square root of the rise of chi-square above its minimum, and where the other parameters went."""
        solution = self.at(value, nuisance)
        return math.sqrt(max(solution.chi_square - self.minimum.chi_square, 0.0)), solution.nonlinear

    def limit(self, distance: float, side: int, floor: float, ceiling: float) -> float:
        """Where the root of the rise of chi-square reaches a distance; 0 or ±inf where it never does.

        Parameters
        ----------
        distance : float
            Sought rise, as a root. [standard uncertainties]
        side : {-1, +1}
            Below or above the minimum.
        floor, ceiling : float
            A positive quantity beyond these is taken as zero or infinite.
        """
        if self.positive and side > 0 and self.value >= ceiling:
            return math.inf
        if self.positive and side < 0 and self.value <= floor:
            return 0.0
        step = self.step if math.isfinite(self.step) and self.step > 0.0 else abs(self.value)
        centre = math.log(max(self.value, floor)) if self.positive else self.value
        reach = step / math.exp(centre) if self.positive else step
        reach = min(reach, 1.0) if self.positive else reach
        inner, inner_excess = 0.0, 0.0
        outer, outer_excess = math.inf, math.inf
        if self.positive:
            edge = centre - math.log(floor) if side < 0 else math.log(ceiling) - centre
        else:
            edge = ceiling - side * centre
        offset = distance * reach
        nuisance = list(self.minimum.nonlinear)
        for _ in range(_TRIES * 3):
            offset = min(offset, edge)
            value = math.exp(centre + side * offset) if self.positive else centre + side * offset
            excess, moved = self.excess(value, nuisance)
            if abs(excess - distance) < _TOLERANCE * distance:
                return value
            if excess < distance:
                if offset >= edge:
                    return 0.0 if self.positive and side < 0 else math.inf * side
                inner, inner_excess, nuisance = offset, excess, moved
            else:
                outer, outer_excess = offset, excess
            if math.isinf(outer):
                growth = distance / excess if excess > 0.0 else 4.0
                offset *= min(max(growth, 1.05), 4.0)
            else:
                share = (distance - inner_excess) / (outer_excess - inner_excess)
                offset = inner + (outer - inner) * min(max(share, 0.03), 0.97)
                if outer - inner < 1e-9 * outer:
                    return value
        return math.exp(centre + side * offset) if self.positive else centre + side * offset


def of_nonlinear(problem: Problem, minimum: Solution, index: int, step: float) -> Profile:
    """Profile of a centre coordinate, the core radius or a shape parameter."""
    rest = tuple(i for i in minimum.free if i != index)

    def at(value: float, nuisance: list[float]) -> Solution:
        start = list(nuisance)
        start[index] = value
        return solve(problem, start, rest)

    return Profile(problem, minimum, minimum.nonlinear[index], step, index >= CORE_RADIUS, at)


def of_strength(problem: Problem, minimum: Solution, step: float) -> Profile:
    """Profile of the strength itself: circulation or swirl scale."""
    still = [0.0] * (len(minimum.nonlinear) - CORE_RADIUS)
    value = minimum.swirl_scale
    if problem.by_circulation:
        value *= 2.0 * math.pi * minimum.nonlinear[CORE_RADIUS]

    def tie(target: float) -> Tie:
        if problem.by_circulation:
            return lambda core_radius, _shape: (target / (2.0 * math.pi * core_radius), [-1.0, *still[1:]])
        return lambda _core_radius, _shape: (target, still)

    def at(target: float, nuisance: list[float]) -> Solution:
        return solve(problem, nuisance, minimum.free, tie(target))

    return Profile(problem, minimum, value, step, False, at)


def of_swirl_scale(
    problem: Problem, minimum: Solution, value: float, step: float, measure: Callable[..., float]
) -> Profile:
    """Profile of a quantity q = swirl_scale · m(shape), such as peak swirl or the square root of the core drop.

    Parameters
    ----------
    measure : callable
        m(shape...), evaluated by the model's kernels.
    """
    sign = math.copysign(1.0, minimum.swirl_scale)

    def tie(target: float) -> Tie:
        def swirl_scale(_core_radius: float, shape: list[float]) -> tuple[float, list[float]]:
            slopes = [0.0, *(-log_slope(measure, shape, which) for which in range(len(shape)))]
            return sign * target / measure(*shape), slopes

        return swirl_scale

    def at(target: float, nuisance: list[float]) -> Solution:
        return solve(problem, nuisance, minimum.free, tie(target))

    return Profile(problem, minimum, value, step, True, at)


def log_slope(measure: Callable[..., float], shape: list[float], which: int) -> float:
    """D ln m / d ln (shape parameter), by a central difference."""
    h = 1e-5
    up, down = list(shape), list(shape)
    up[which] *= 1.0 + h
    down[which] *= 1.0 - h
    return float((math.log(measure(*up)) - math.log(measure(*down))) / (2.0 * h))


def null_chi_square(problem: Problem, *, uniform: bool) -> tuple[float, int]:
    """Chi-square without any vortex, of background or uniform flow alone; and how many columns the latter adds.

    A vortex far away looks like a uniform flow, so that is what a vortex of unknown centre has to beat.
    """
    return _without_vortex(problem.samples, uniform)


@lru_cache(maxsize=32)  # the same for every model and start
def _without_vortex(samples: Samples, uniform: bool) -> tuple[float, int]:
    columns = list(samples.background)
    added = 0
    if uniform and not len(columns):
        columns = [column for column in samples.toward if column.any()]
        added = len(columns)
    if not columns:
        return samples.power, 0
    if len(columns) == 1:
        column = columns[0]
        return samples.power - float(column @ samples.target) ** 2 / float(column @ column), added
    basis = np.array(columns)
    level = np.linalg.lstsq(basis.T, samples.target, rcond=None)[0]
    rest = samples.target - level @ basis
    return float(rest @ rest), added
