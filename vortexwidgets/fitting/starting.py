"""First estimate of centre, core radius and shape, by a coarse search that eliminates what is linear."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

if TYPE_CHECKING:
    from vortexwidgets.fitting.problem import Problem

FloatArray = npt.NDArray[np.float64]

_MOST_POINTS = 240  # of a planar field, for the search only


def search(problem: Problem, *, centre: tuple[float | None, float | None], several: int = 1) -> list[list[float]]:
    """Likeliest (centre_x, centre_y, peak_radius), best first.

    Every candidate is a Kaufmann profile, whose strength and background are eliminated; it needs no exponential and
    lies between the published profiles.

    Parameters
    ----------
    problem : Problem
        The samples.
    centre : tuple
        What is known of the centre; None is searched. [m]
    several : int
        How many different candidates are wanted.
    """
    x, y = problem.samples.position
    toward_x, toward_y = problem.samples.toward
    target, background = problem.samples.target, problem.samples.background
    if len(target) > 2 * _MOST_POINTS:
        chosen = np.random.default_rng(0).choice(len(target), 2 * _MOST_POINTS, replace=False)
        x, y, toward_x, toward_y, target = (a[chosen] for a in (x, y, toward_x, toward_y, target))
        background = background[:, chosen]
    if len(background):
        basis = np.linalg.qr(background.T)[0]
        target = target - basis @ (basis.T @ target)
    else:
        basis = None
    extent = float(max(np.ptp(x), np.ptp(y)))
    if extent == 0.0:
        extent = float(max(np.abs(x).max(), np.abs(y).max(), 1e-12))
    step_x = _grid(x, centre[0], 41 if centre[1] is not None else 13)
    step_y = _grid(y, centre[1], 13) if np.ptp(y) > 0.0 else _missed(extent, centre[1])
    radii = extent * np.geomspace(0.008, 1.0, 15)
    found: list[tuple[float, float, float, float]] = []
    for level in range(3 if centre[0] is None else 1):
        table = _misfits(step_x, step_y, radii, x, y, toward_x, toward_y, target, basis)
        found = _best(table, step_x, step_y, radii, several if level == 0 else 1) + (found if level else [])
        _, best_x, best_y, best_r = min(found)
        width = best_r if level else max(best_r, 0.5 * _pitch(step_x))
        step_x = step_x if centre[0] is not None else best_x + width * np.linspace(-0.5, 0.5, 7) / (1 + level)
        if centre[1] is None:
            step_y = best_y + width * np.linspace(-0.5, 0.5, 7) / (1 + level)
        radii = best_r * np.geomspace(0.6, 1.7, 7)
    found = sorted(set(found))
    kept: list[list[float]] = []
    for _, here_x, here_y, peak in found:
        if all(math.hypot(here_x - a, here_y - b) > 0.5 * (peak + c) for a, b, c in kept):
            kept.append([here_x, here_y, peak])
    return kept[:several]


def _grid(values: FloatArray, known: float | None, count: int) -> FloatArray:
    if known is not None:
        return np.array([known])
    low, high = float(values.min()), float(values.max())
    margin = 0.25 * (high - low)  # a survey of the outer flow has its centre beyond its end
    return np.linspace(low - margin, high + margin, count)


def _missed(extent: float, known: float | None) -> FloatArray:
    if known is not None:
        return np.array([known])
    half = extent * np.geomspace(0.01, 0.3, 5)
    return np.concatenate([-half[::-1], [0.0], half])


def _pitch(grid: FloatArray) -> float:
    return float(grid[1] - grid[0]) if len(grid) > 1 else 0.0


def _misfits(
    step_x: FloatArray,
    step_y: FloatArray,
    radii: FloatArray,
    x: FloatArray,
    y: FloatArray,
    toward_x: FloatArray,
    toward_y: FloatArray,
    target: FloatArray,
    basis: FloatArray | None,
) -> FloatArray:
    """Chi-square of every candidate, shape (radii, x, y)."""
    dx = x - step_x[:, None, None]
    dy = y - step_y[:, None]
    across = dx * toward_y - dy * toward_x
    r2 = dx * dx + dy * dy
    table = np.empty((len(radii), len(step_x), len(step_y)))
    for row, radius in zip(table, radii, strict=True):
        response = across / (r2 + radius * radius)
        overlap = response @ target
        size = np.einsum("ijk,ijk->ij", response, response)
        if basis is not None:
            projected = response @ basis
            size = size - np.einsum("ijk,ijk->ij", projected, projected)
        row[:] = overlap * overlap / np.maximum(size, 1e-300)
    return np.asarray(float(target @ target) - table)


def _best(
    table: FloatArray, step_x: FloatArray, step_y: FloatArray, radii: FloatArray, several: int
) -> list[tuple[float, float, float, float]]:
    """The lowest entries, each the lowest over the radii at its centre."""
    by_centre = table.min(axis=0)
    order = np.argsort(by_centre, axis=None)[: max(8 * several, 1)]
    rows: list[tuple[float, float, float, float]] = []
    for flat in order:
        i, j = np.unravel_index(flat, by_centre.shape)
        k = int(table[:, i, j].argmin())
        rows.append((float(table[k, i, j]), float(step_x[i]), float(step_y[j]), float(radii[k])))
    return rows
