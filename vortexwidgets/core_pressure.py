"""From fits and survey to the three core drops, their spread, their budget."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from vortexwidgets.uncertainty import Contribution, Estimate, from_draws

if TYPE_CHECKING:
    from vortexwidgets.fitting.ranking import Ranked
    from vortexwidgets.fitting.result import Fit
    from vortexwidgets.models.vortex import Vortex
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]

INSTANTANEOUS = "instantaneous vortex"
TAP = "mean pressure at a fixed point"
MEAN_PROFILE = "mean profile"

_CLOSED = 0.99  # weight of the models with a determined drop from which the others only widen the envelope
_DRAWS = 20_000
_SEED = 20_260_101  # fixed: the same survey gives the same record


@dataclass(frozen=True)
class CoreDrop:
    """One of the three named core pressure drops. [Pa]"""

    name: str
    estimate: Estimate
    explanation: str


@dataclass(frozen=True)
class Core:
    """What the survey says of the core, free of the fitter: the input of every consequence."""

    vortex: Vortex
    supported: tuple[Vortex, ...]
    drop: Estimate
    tap_drop: Estimate
    ambient: Estimate | None
    pressure: Estimate | None
    envelope: tuple[float, float]
    circulation: Estimate
    core_radius: Estimate
    peak_swirl: Estimate
    peak_radius: Estimate
    density: Estimate
    missed_axis: bool


# The vortex alone ---------------------------------------------------------------------------------------------------


def share_beyond(vortex: Vortex, radius: float, *, reference_radius: float | None = None) -> float:
    """Share of the core pressure drop that comes from beyond a radius.

    Parameters
    ----------
    vortex : Vortex
        With a finite core pressure drop.
    radius : float
        Distance from the axis. [m]
    reference_radius : float, optional
        Where the drop is taken from, in place of the far field. [m]

    Returns
    -------
    float
        Between 0 and 1.

    Examples
    --------
    A Rankine vortex has half of its drop outside the core (derived: 1/2 at the peak radius).

    >>> from vortexwidgets import Vortex
    >>> share_beyond(Vortex("rankine", circulation=1.0, core_radius=0.01), 0.01)
    0.5
    """
    outside, whole = (float(vortex.pressure_drop(r, density=1.0)) for r in (radius, 0.0))
    if reference_radius is not None:
        if reference_radius <= radius:
            return 0.0
        far = float(vortex.pressure_drop(reference_radius, density=1.0))
        outside, whole = outside - far, whole - far
    return outside / whole


def relative_to(drop: Estimate, vortex: Vortex, reference_radius: float | None) -> Estimate:
    """A core pressure drop from the far field, taken from the pressure at a radius instead. [Pa]"""
    if reference_radius is None or math.isnan(drop.value):
        return drop
    return drop.scaled(1.0 - share_beyond(vortex, reference_radius))


def with_contribution(drop: Estimate, name: str, uncertainty: float) -> Estimate:
    """An estimate with one more contribution; its distribution widens in proportion."""
    if not drop.is_determined or uncertainty == 0.0:
        return drop
    total = math.hypot(drop.uncertainty, uncertainty)
    ratio = total / drop.uncertainty if drop.uncertainty > 0.0 else 1.0
    quantiles = None if drop.quantiles is None else tuple(drop.value + ratio * (q - drop.value) for q in drop.quantiles)
    budget = (*drop.budget, Contribution(name, uncertainty))
    return Estimate(drop.value, total, drop.quantity, budget=budget, quantiles=quantiles)


def mean_swirl(vortex: Vortex, radius: npt.ArrayLike, *, wander: float) -> FloatArray:
    r"""Mean swirl at fixed points while the vortex wanders. [m/s]

    Parameters
    ----------
    vortex : Vortex
        The instantaneous vortex.
    radius : array_like, shape (...)
        Distance from the mean axis. [m]
    wander : float
        Standard deviation of the axis along one direction, equal in both. [m]

    Returns
    -------
    ndarray, shape of `radius`
        Mean azimuthal velocity.

    Notes
    -----
    Gaussian average of the velocity vector over the plane,
    :math:`\bar v(r) = \int_0^\infty v(s)\,(s/\sigma^2)\,e^{-(r^2+s^2)/2\sigma^2} I_1(rs/\sigma^2)\,ds`, for any
    profile.

    References
    ----------
    .. [1] W. J. Devenport, M. C. Rife, S. I. Liapis and G. J. Follin, J. Fluid Mech. 312 (1996) 67-106.
    """
    from scipy.special import ive

    points = np.atleast_1d(np.asarray(radius, dtype=float))
    if wander == 0.0:
        return np.reshape(vortex.swirl(points), np.shape(radius))
    result = np.empty(points.size)
    node, weight = np.polynomial.legendre.leggauss(24)
    for number, r in enumerate(points.ravel()):
        edges = _panels(max(r - 9.0 * wander, 0.0), r + 9.0 * wander, vortex.core_radius, 24)
        s = 0.5 * (edges[1:] + edges[:-1])[:, None] + 0.5 * np.diff(edges)[:, None] * node
        w = 0.5 * np.diff(edges)[:, None] * weight
        kernel = s / wander**2 * np.exp(-((r - s) ** 2) / (2.0 * wander**2)) * ive(1, r * s / wander**2)
        result[number] = float(np.sum(w * vortex.swirl(s) * kernel))
    return np.reshape(result, np.shape(radius))


def core_drops(vortex: Vortex, *, density: float, wander: float = 0.0) -> dict[str, float]:
    """The three core pressure drops of a vortex that wanders. [Pa]

    Parameters
    ----------
    vortex : Vortex
        The instantaneous vortex.
    density : float
        [kg/m³]
    wander : float
        Standard deviation of the axis along one direction. [m]

    Returns
    -------
    dict
        "instantaneous vortex": on the moving axis, what a bubble feels; "mean pressure at a fixed point": what a wall
        tap or a slow probe reads at the mean centre; "mean profile": what integrating the mean swirl gives.

    Notes
    -----
    The three are equal without wander. Cavitation takes the first; a measured pressure is compared with the second.
    """
    deepest = float(vortex.pressure_drop(0.0, density=density))
    if wander == 0.0:
        return {INSTANTANEOUS: deepest, TAP: deepest, MEAN_PROFILE: deepest}
    node, weight = np.polynomial.legendre.leggauss(24)
    edges = _panels(0.0, 9.0 * wander, vortex.core_radius, 24)
    s = 0.5 * (edges[1:] + edges[:-1])[:, None] + 0.5 * np.diff(edges)[:, None] * node
    w = 0.5 * np.diff(edges)[:, None] * weight
    chance = s / wander**2 * np.exp(-(s**2) / (2.0 * wander**2))
    tap = float(np.sum(w * chance * vortex.pressure_drop(s, density=density)))
    far = 40.0 * (vortex.core_radius + wander)
    log_edges = np.linspace(math.log(1e-4 * (vortex.core_radius + wander)), math.log(far), 15)
    half = 0.5 * np.diff(log_edges)[:, None]
    log_r = 0.5 * (log_edges[1:] + log_edges[:-1])[:, None] + half * node[None, :]
    mean = mean_swirl(vortex, np.exp(log_r), wander=wander)
    naive = density * float(np.sum(half * weight * mean**2)) + float(vortex.pressure_drop(far, density=density))
    return {INSTANTANEOUS: deepest, TAP: tap, MEAN_PROFILE: naive}


def _panels(low: float, high: float, break_point: float, number: int) -> FloatArray:
    """Edges of equal panels, with one at a kink of the profile."""
    edges = np.linspace(low, high, number + 1)
    if low < break_point < high:
        edges = np.unique(np.append(edges, break_point))
    return edges


# The fits -----------------------------------------------------------------------------------------------------------


def combined_drop(
    rows: Sequence[Ranked], *, density: Estimate, gain: Estimate, beyond: float | None = None
) -> tuple[Estimate, tuple[float, float]]:
    """Weighted core pressure drop of the models that are not rejected, and its envelope over them. [Pa]

    Parameters
    ----------
    rows : sequence of Ranked
        Models that the data do not reject, with their weights.
    density, gain : Estimate
        Density [kg/m³] and velocity gain, whose uncertainties are common to all samples.
    beyond : float, optional
        Reference radius; the drop is then relative to the pressure there. [m]

    Returns
    -------
    Estimate, tuple
        With u² = Σ w (u_i² + (Δp_i - mean)²) and the gain's 2 u(g), and a budget that names the contributions; the
        lowest and highest single-model drop.
    """
    drops = [row.fit.core_pressure_drop(density.value) for row in rows]
    drops = [relative_to(drop, row.fit.vortex, beyond) for drop, row in zip(drops, rows, strict=True)]
    closed = [(row, drop) for row, drop in zip(rows, drops, strict=True) if drop.is_determined]
    # Weights anew among these rows: where the best of all is rejected, theirs in the ranking may be nothing.
    least = min(row.aicc for row in rows)
    above = {row.model.key: row.aicc - least if math.isfinite(least) else 0.0 for row in rows}
    weight = {key: math.exp(-0.5 * min(value, 1400.0)) for key, value in above.items()}
    share = sum(weight[row.model.key] for row, _ in closed) / sum(weight.values())
    if len(closed) < len(rows) and share < _CLOSED:
        # Profiles that leave the core open leave the answer open: the shallowest of all lower limits stands.
        lowest = max(min(drop.interval(0.95)[0] for drop in drops), 0.0)
        relative = 1.96 * math.hypot(2.0 * gain.uncertainty, density.uncertainty / density.value)
        lowest *= max(1.0 - relative, 0.0)
        return Estimate(lowest, math.nan, "core_pressure_drop", bound="lower"), (lowest, math.inf)
    open_ended = len(closed) < len(rows)
    drops = [drop for _, drop in closed]
    values = np.array([drop.value for drop in drops])
    own = np.array([drop.uncertainty for drop in drops])
    weights = np.array([weight[row.model.key] for row, _ in closed])
    weights = weights / weights.sum()
    mean = float(weights @ values)
    budget = (
        Contribution("scatter of the samples", math.sqrt(float(weights @ own**2))),
        Contribution("choice of model", math.sqrt(float(weights @ (values - mean) ** 2))),
        Contribution("velocity gain", 2.0 * gain.uncertainty * mean),
        Contribution("density", density.uncertainty / density.value * mean),
    )
    generator = np.random.default_rng(_SEED)
    counts = np.floor(weights * _DRAWS).astype(int)
    counts[int(weights.argmax())] += _DRAWS - int(counts.sum())
    draws = np.concatenate([drop.draw(int(n), generator) for drop, n in zip(drops, counts, strict=True) if n])
    draws = draws * np.exp(2.0 * gain.uncertainty * generator.standard_normal(_DRAWS))
    draws = draws * np.exp(density.uncertainty / density.value * generator.standard_normal(_DRAWS))
    total = math.sqrt(sum(part.uncertainty**2 for part in budget))
    quantiles = from_draws(draws, "core_pressure_drop").quantiles
    estimate = Estimate(mean, total, "core_pressure_drop", budget=budget, quantiles=quantiles)
    return estimate, (float(values.min()), math.inf if open_ended else float(values.max()))


def named_drops(drop: Estimate, vortex: Vortex, *, wander: float) -> tuple[CoreDrop, CoreDrop, CoreDrop]:
    """The three core drops as estimates, each the instantaneous one times its fraction for this wander."""
    fractions = core_drops(vortex, density=1.0, wander=wander)
    deepest = fractions[INSTANTANEOUS]
    stated = "" if wander > 0.0 else " Wander is not stated, so it is taken as none and the three are equal."
    texts = {
        INSTANTANEOUS: "On the moving axis of the vortex; cavitation takes this one." + stated,
        TAP: "What a wall tap or a slow probe reads at the mean centre; fluctuation beyond wander is not included.",
        MEAN_PROFILE: "What integrating the mean swirl profile gives; too shallow where the vortex wanders.",
    }
    rows = [
        CoreDrop(name, drop.scaled(fractions[name] / deepest), texts[name])
        for name in (INSTANTANEOUS, TAP, MEAN_PROFILE)
    ]
    return rows[0], rows[1], rows[2]


def core_pressure_of(drop: Estimate, ambient: Estimate, *, heat_capacity_ratio: float | None = None) -> Estimate:
    """Absolute pressure on the axis. [Pa]

    Parameters
    ----------
    drop : Estimate
        Core pressure drop at constant density. [Pa]
    ambient : Estimate
        Absolute pressure at the elevation of the axis, far away. [Pa]
    heat_capacity_ratio : float, optional
        Of a gas: the drop is then taken through the isentropic relation of a perfect gas.

    Returns
    -------
    Estimate
        A lower bound of the drop makes it an upper bound.

    Notes
    -----
    Gas: p(0) = p∞ [1 - (γ-1)/γ · Δp/p∞]^(γ/(γ-1)), cyclostrophic balance with p/ρ^γ constant. It reaches a vacuum at a
    finite drop; beyond that the pressure is given as zero.
    """

    def pressure(far: FloatArray | float, fall: FloatArray | float) -> FloatArray:
        if heat_capacity_ratio is None:
            return np.asarray(far - np.asarray(fall))
        exponent = heat_capacity_ratio / (heat_capacity_ratio - 1.0)
        return np.asarray(far * np.maximum(1.0 - fall / (exponent * np.asarray(far)), 0.0) ** exponent)

    if drop.bound is not None:
        # Both limits at 95 %: the pressure lies below the highest reference less the smallest drop.
        return Estimate(
            float(pressure(ambient.interval(0.95)[1], drop.value)), math.nan, "core_pressure", bound="upper"
        )
    value = float(pressure(ambient.value, drop.value))
    if not math.isfinite(drop.uncertainty):
        return Estimate(value, math.nan, "core_pressure")
    step = max(1e-4 * drop.value, 1e-9)
    slope = abs(float(pressure(ambient.value, drop.value + step) - pressure(ambient.value, drop.value - step))) / (
        2 * step
    )
    reference = ambient.uncertainty
    if heat_capacity_ratio is not None:
        d = 1e-4 * ambient.value
        reference *= abs(float(pressure(ambient.value + d, drop.value) - pressure(ambient.value - d, drop.value))) / (
            2 * d
        )
    budget = tuple(Contribution(part.name, part.uncertainty * slope) for part in drop.budget)
    budget += (Contribution("reference pressure", reference),)
    generator = np.random.default_rng(_SEED)
    far = ambient.draw(_DRAWS, generator)
    draws = pressure(np.asarray(far), np.asarray(drop.draw(_DRAWS, generator)))
    return Estimate(
        value,
        math.sqrt(sum(part.uncertainty**2 for part in budget)),
        "core_pressure",
        budget=budget,
        quantiles=from_draws(draws, "core_pressure").quantiles,
    )


def circulation_at(fit: Fit, radius: float) -> Estimate:
    """Circulation within a radius, with the uncertainty of the fitted curve there. [m²/s]"""
    vortex = fit.vortex
    value = float(vortex.enclosed_circulation(radius))
    names = [name for name in fit.names if name in (fit._problem.strength_name, "core_radius", *vortex.shape)]
    gradient = np.zeros(len(fit.names))
    for name in names:
        now = getattr(vortex, name) if name not in vortex.shape else vortex.shape[name]
        step = 1e-5 * abs(now)
        up, down = replace(vortex, **{name: now + step}), replace(vortex, **{name: now - step})
        slope = float(up.enclosed_circulation(radius)) - float(down.enclosed_circulation(radius))
        gradient[fit.names.index(name)] = slope / (2.0 * step)
    used = (gradient != 0.0) & np.isfinite(fit.covariance.diagonal())
    variance = float(gradient[used] @ fit.covariance[np.ix_(used, used)] @ gradient[used])
    return Estimate(value, math.sqrt(max(variance, 0.0)), "enclosed_circulation")


def total_pressure_deficit(survey: Survey, fit: Fit, drop: Estimate, *, density: Estimate) -> Estimate | None:
    """Total pressure far away less total pressure on the axis, Δp + ½ρ(W∞² - W0²); None without an axial velocity. [Pa]

    W0 is where a parabola in r² through the samples within 1.2 peak radii, or the nearest nine, meets the axis; W∞ the
    mean beyond three peak radii. The static drop itself does not depend on the axial velocity.
    """
    chosen = survey.axial
    if not chosen.any() or not math.isfinite(drop.value):
        return None
    radius = np.hypot(survey.x[chosen] - fit.centre[0], survey.y[chosen] - fit.centre[1])
    velocity = survey.velocity[chosen]
    own = None if survey.uncertainty is None else survey.uncertainty[chosen]
    peak = fit.vortex.peak_radius
    far = radius >= 3.0 * peak
    if not far.any():
        far = radius >= np.quantile(radius, 0.8)
    near = radius <= max(1.2 * peak, float(np.sort(radius)[min(8, len(radius) - 1)]))
    inner, u_inner = _on_axis(radius[near] / peak, velocity[near], None if own is None else own[near])
    outer, u_outer = _mean(velocity[far], None if own is None else own[far])
    change = 0.5 * density.value * (outer**2 - inner**2)
    u_change = density.value * math.hypot(outer * u_outer, inner * u_inner)
    budget = (Contribution("static core pressure drop", drop.uncertainty), Contribution("axial velocity", u_change))
    return Estimate(drop.value + change, math.hypot(drop.uncertainty, u_change), "pressure_drop", budget=budget)


def _on_axis(x: FloatArray, values: FloatArray, own: FloatArray | None) -> tuple[float, float]:
    """Value on the axis of a smooth axisymmetric profile and its standard uncertainty."""
    if len(values) < 4:
        return _mean(values, own)
    terms = 3 if len(values) >= 12 else 2
    columns = np.vander(x**2, terms, increasing=True)
    level, *_ = np.linalg.lstsq(columns, values, rcond=None)
    rest = values - columns @ level
    variance = float(rest @ rest) / (len(values) - terms)
    if own is not None:
        variance = max(variance, float(np.mean(own**2)))
    return float(level[0]), math.sqrt(variance * float(np.linalg.pinv(columns.T @ columns)[0, 0]))


def _mean(values: FloatArray, own: FloatArray | None) -> tuple[float, float]:
    """Mean and its standard uncertainty: from the scatter, but no less than the samples state."""
    scatter = float(values.std(ddof=1)) / math.sqrt(values.size) if values.size > 1 else 0.0
    stated = 0.0 if own is None else float(np.sqrt(np.sum(own**2))) / values.size
    return float(values.mean()), max(scatter, stated)
