"""Symbolic against numeric, for one model, with the worst disagreement found."""

from __future__ import annotations

import html
import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from vortexwidgets.formatting import table
from vortexwidgets.models.catalogue import model_named
from vortexwidgets.models.model import X

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel

FloatArray = npt.NDArray[np.float64]
Function = Callable[[FloatArray], FloatArray]

_FROM, _TO = 1e-9, 1e6  # range of x compared
_SMALLEST = 1e-140  # its square is still a normal number
_STEPS = np.array([1.0, 2.0, 3.0, 4.0])
_WEIGHTS = np.array([4 / 5, -1 / 5, 4 / 105, -1 / 280])  # central difference of eighth order
_LONGEST_STEP = 0.03  # of ln x
_COARSE, _FINE = np.polynomial.legendre.leggauss(12), np.polynomial.legendre.leggauss(24)


@dataclass(frozen=True)
class AgreementRow:
    """One comparison.

    Attributes
    ----------
    quantity, compared_with : str
        What the formula gives, and how it was found without the formula.
    worst : float
        Largest relative difference.
    at : float
        x = r/r_c at which it was found.
    """

    quantity: str
    compared_with: str
    worst: float
    at: float


@dataclass(frozen=True)
class Agreement:
    """How well the formulas of a model agree with plain quadrature and differentiation of its profile.

    Attributes
    ----------
    model : str
        Name, with the shape parameters used.
    rows : tuple of AgreementRow
    """

    model: str
    rows: tuple[AgreementRow, ...]

    @property
    def worst(self) -> float:
        """Largest relative difference of all."""
        return self._worst_row.worst

    @property
    def where(self) -> float:
        """Distance x = r/r_c at which it was found."""
        return self._worst_row.at

    @property
    def what(self) -> str:
        """Quantity in which it was found."""
        return self._worst_row.quantity

    @property
    def _worst_row(self) -> AgreementRow:
        return max(self.rows, key=lambda row: row.worst)

    def __str__(self) -> str:
        body = table(_cells(self.rows), _HEADER)
        return f"{self.model}\n{body}\n{self._summary}"

    def _repr_html_(self) -> str:
        head = "".join(f"<th>{html.escape(cell)}</th>" for cell in _HEADER)
        body = "".join(
            f"<tr>{''.join(f'<td>{html.escape(cell)}</td>' for cell in cells)}</tr>" for cells in _cells(self.rows)
        )
        title, summary = html.escape(self.model), html.escape(self._summary)
        return f"<table><caption>{title}</caption><tr>{head}</tr>{body}</table><p>{summary}</p>"

    @property
    def _summary(self) -> str:
        return f"Worst relative difference {self.worst:.1e}, in the {self.what} at x = {self.where:.3g}."


_HEADER = ("by formula", "compared with", "worst relative difference", "at x = r/r_c")


def _cells(rows: tuple[AgreementRow, ...]) -> list[list[str]]:
    return [[row.quantity, row.compared_with, f"{row.worst:.1e}", f"{row.at:.3g}"] for row in rows]


def check_agreement(model: str | VortexModel, **shape: float) -> Agreement:
    """Compare what was derived for a model with quadrature and differentiation of its declared profile.

    Parameters
    ----------
    model : str or VortexModel
    **shape
        Shape parameters by name; the model's defaults where not given.

    Returns
    -------
    Agreement
        Over x = r/r_c from 1e-9 to 1e6. A difference is relative to the sum of the sizes of the terms that make up the
        compared number, which is the number itself wherever nothing cancels.

    Raises
    ------
    ValueError
        If there is no such model or shape parameter.

    Examples
    --------
    >>> check_agreement("lamb-oseen").worst < 1e-11
    True
    """
    entry = model_named(model)
    unknown = [name for name in shape if name not in [parameter.name for parameter in entry.shape]]
    if unknown:
        raise ValueError(f"{entry.name} has no shape parameter '{unknown[0]:.60}'; leave it out.")
    return _compare(entry, tuple(float(shape.get(p.name, p.default)) for p in entry.shape))


@lru_cache(maxsize=64)
def _compare(model: VortexModel, shape: tuple[float, ...]) -> Agreement:
    at = np.unique(np.concatenate([np.logspace(math.log10(_FROM), math.log10(_TO), 61), np.logspace(-1.0, 1.0, 42)]))
    for edge in map(float, model.edges):
        at = at[np.abs(np.log(at / edge)) > 4.1 * _LONGEST_STEP]  # a difference must not straddle the edge
    swirl = _of(model, "swirl", shape)
    at = at[swirl(at) > _SMALLEST]
    rows = [_vorticity(model, shape, at), _circulation(model, shape, at), _balance(model, shape, at)]
    if math.isfinite(float(_of(model, "pressure_drop", shape)(np.array([1.0]))[0])):
        rows += _pressure(model, shape, at)
    if model.peak is not None and not model.edges:
        rows.append(_peak(model, shape))
    numbers = ", ".join(f"{p.name} = {value:g}" for p, value in zip(model.shape, shape, strict=True))
    return Agreement(f"{model.name} ({numbers})" if numbers else model.name, tuple(rows))


def _vorticity(model: VortexModel, shape: tuple[float, ...], at: FloatArray) -> AgreementRow:
    swirl, vorticity = _of(model, "swirl", shape), _of(model, "vorticity", shape)
    value = swirl(at)
    slope = _slope(swirl, at)
    return _row(
        "vorticity", "differentiation of x·swirl", at, vorticity(at), (value + slope) / at, (value + abs(slope)) / at
    )


def _circulation(model: VortexModel, shape: tuple[float, ...], at: FloatArray) -> AgreementRow:
    vorticity, circulation = _of(model, "vorticity", shape), _of(model, "enclosed_circulation", shape)
    start = np.array([_FROM / 100.0])
    ends = np.concatenate([start, at])
    steps = _integrals(lambda u: vorticity(np.exp(u)) * np.exp(2.0 * u), np.log(ends), model)
    total = circulation(start) + np.cumsum(steps)
    size = circulation(start) + np.cumsum(abs(steps))
    return _row("enclosed circulation", "quadrature of the vorticity", at, circulation(at), total, size)


def _pressure(model: VortexModel, shape: tuple[float, ...], at: FloatArray) -> list[AgreementRow]:
    swirl, drop = _of(model, "swirl", shape), _of(model, "pressure_drop", shape)
    value, square = drop(at), swirl(at) ** 2
    last = math.log(at[-1])
    # An algebraic tail needs room; an exponential one ends by itself.
    ends = np.append(np.log(at), last + (60.0 if at[-1] > 0.5 * _TO else 0.1))
    steps = _integrals(lambda u: swirl(np.exp(u)) ** 2, ends, model)
    inward = np.cumsum(steps[::-1])[::-1]
    if at[-1] <= 0.5 * _TO:
        inward += drop(np.exp(ends[-1:]))
    rows = [_row("pressure drop", "quadrature of swirl²/x", at, value, inward, value)]
    slope = _slope(drop, at)
    rows.append(_row("pressure drop", "differentiation, radial equilibrium", at, -square, slope, square + value))
    centre = model.centre_pressure(*shape)
    if math.isfinite(centre):
        rows.append(
            AgreementRow("drop on the axis", "quadrature from axis to infinity", abs(inward[0] / centre - 1.0), 0.0)
        )
    return rows


def _peak(model: VortexModel, shape: tuple[float, ...]) -> AgreementRow:
    swirl = _of(model, "swirl", shape)
    place = model.peak_of(*shape)[0]

    def slope(u: float) -> float:
        return float(_slope(swirl, np.exp(np.array([u])))[0])

    low, high = math.log(place) - 0.5, math.log(place) + 0.5
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if slope(middle) > 0.0 else (low, middle)
    return AgreementRow("peak radius", "search for the largest swirl", abs(math.exp(low) / place - 1.0), place)


def _balance(model: VortexModel, shape: tuple[float, ...], at: FloatArray) -> AgreementRow:
    """What the momentum equation leaves over, against differentiation of the vorticity."""
    at = at[(at > 1e-3) & (at < 5.0)]
    vorticity, swirl = _of(model, "vorticity", shape), _of(model, "swirl", shape)
    left, *terms = (
        _evaluated(part, model, shape, at)
        for part in (model.balance.left_over, model.balance.unsteady, model.balance.inflow, model.balance.viscous)
    )
    numeric = _slope(vorticity, at) / at
    if model.motion == "growing":
        numeric = numeric + 2.0 * (at * vorticity(at) + (model.decay - 1) * swirl(at))
    elif model.motion == "strained":
        numeric = numeric + 2.0 * at * vorticity(at)
    size = sum(map(np.abs, terms)) + np.abs(vorticity(at)) / at + 1e-300
    return _row("momentum left over", "differentiation of the vorticity", at, left, numeric, size)


def _of(model: VortexModel, quantity: str, shape: tuple[float, ...]) -> Function:
    kernel = model.kernel(quantity)  # type: ignore[arg-type]
    return lambda at: kernel(at, *shape)


def _evaluated(expression: object, model: VortexModel, shape: tuple[float, ...], at: FloatArray) -> FloatArray:
    import sympy as sp

    fixed = sp.sympify(expression).subs(dict(zip(model.symbols, shape, strict=True)))
    return np.array([float(fixed.subs(X, float(x)).evalf(20)) for x in at])


def _row(
    quantity: str, compared_with: str, at: FloatArray, formula: FloatArray, numeric: FloatArray, size: FloatArray
) -> AgreementRow:
    difference = np.abs(formula - numeric) / size
    worst = int(np.argmax(difference))
    return AgreementRow(quantity, compared_with, float(difference[worst]), float(at[worst]))


def _slope(function: Function, at: FloatArray) -> FloatArray:
    """Derivative by ln x, from halved steps where two consecutive ones agree best."""
    estimates = []
    for number in range(12):
        step = _LONGEST_STEP / 2.0**number
        factors = np.exp(step * _STEPS)
        rise = function(np.outer(at, factors)) - function(np.outer(at, 1.0 / factors))
        estimates.append(rise @ _WEIGHTS / step)
    found = np.array(estimates)
    best = np.argmin(np.abs(np.diff(found, axis=0)), axis=0)
    result: FloatArray = found[best, np.arange(at.size)]
    return result


def _integrals(function: Function, ends: FloatArray, model: VortexModel) -> FloatArray:
    """Integral over each interval between consecutive ends, halved until two Gauss rules agree on every part."""
    edges = np.log([float(edge) for edge in model.edges])
    cuts = np.unique(np.concatenate([ends, edges[(edges > ends[0]) & (edges < ends[-1])]]))
    low, high = cuts[:-1], cuts[1:]
    owner = np.searchsorted(ends, low, side="right") - 1
    result = np.zeros(len(ends) - 1)
    for depth in range(14):
        coarse, fine = _gauss(function, low, high, _COARSE), _gauss(function, low, high, _FINE)
        open_ = np.abs(coarse - fine) > 1e-14 * np.abs(fine)
        if depth == 13:
            open_[:] = False
        np.add.at(result, owner[~open_], fine[~open_])
        if not open_.any():
            break
        low, high, owner = low[open_], high[open_], owner[open_]
        middle = 0.5 * (low + high)
        low, high, owner = np.append(low, middle), np.append(middle, high), np.append(owner, owner)
    return result


def _gauss(function: Function, low: FloatArray, high: FloatArray, rule: tuple[FloatArray, FloatArray]) -> FloatArray:
    nodes, weights = rule
    half = 0.5 * (high - low)
    at = (0.5 * (low + high))[:, None] + half[:, None] * nodes
    result: FloatArray = half * (function(at) @ weights)
    return result
