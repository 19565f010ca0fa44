"""Screening: is the survey good enough: gaps, outliers, points inside the core, reach outside it."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vortexwidgets.survey.samples import BoolArray, FloatArray
from vortexwidgets.survey.survey import Survey

Trend = tuple[FloatArray, FloatArray]
"""What the neighbours make one expect, shape (N,), and how far each of them is from that, shape (N, neighbours)."""

_LIMIT = 4.0
"""Twice the published 2: of the thousands of vectors of one survey, no good one should go."""

_FEWEST_FOR_OUTLIERS = 8
_FEWEST_SAMPLES = 10
_FEWEST_INSIDE = 3
_REACH = 3.0  # peak radii; a Lamb-Oseen vortex has 6 % of its drop beyond
_UNRESOLVED = 8.0  # times the largest neighbour: what one station inside an unresolved core may show


@dataclass(frozen=True, repr=False)
class Screening:
    """What a survey can carry; `survey` has the outliers set aside with the reason.

    Attributes
    ----------
    points : int
        Samples in use after the outliers are set aside.
    inside_core : int or None
        Stations nearer to the centre than the peak radius; None when centre or peak radius is not known.
    reach : float
        Distance of the farthest station from the centre in peak radii; NaN when it is not known.
    outliers : tuple of int
        Samples found to be outliers.
    survey : Survey
        The survey without them.
    sentences : tuple of str
        What is worth knowing before the survey is used.
    """

    points: int
    inside_core: int | None
    reach: float
    outliers: tuple[int, ...]
    survey: Survey
    sentences: tuple[str, ...]

    def __str__(self) -> str:
        return " ".join(self.sentences)

    def __repr__(self) -> str:
        return f"<Screening: {self}>"


def screen(survey: Survey, centre: tuple[float, float] | None = None, peak_radius: float | None = None) -> Screening:
    """Look for outliers and gaps, and, once the centre is known, count the points inside the core.

    Parameters
    ----------
    survey : Survey
    centre : (float, float), optional
        Where the axis is, from a fit; known to be (0, 0) for a radial survey. [m]
    peak_radius : float, optional
        Where swirl is largest, from a fit. [m]

    Returns
    -------
    Screening

    Notes
    -----
    A sample is an outlier when its distance from the median of its neighbours exceeds 4 (r_m + ε), where r_m is the
    median of the neighbours' own distances from that median (at least what the noise explains) and ε the noise level
    [1]_. The published limit is 2. The noise level is the stated uncertainty or the scatter of the samples about the
    straight line between their neighbours, whichever is larger. A sample that lies on the trend of its neighbours is no
    outlier, which matters at the ends of a survey. Where the neighbours turn sign the core lies between them, and r_m
    is their second largest distance; a lone station inside a core that the stations do not resolve is kept as well.
    Only gross errors are found; smaller ones are a robust loss's job.

    References
    ----------
    .. [1] J. Westerweel and F. Scarano, Universal outlier detection for PIV data, Experiments in Fluids 39 (2005),
       1096-1100, doi:10.1007/s00348-005-0016-6.

    Examples
    --------
    >>> position = np.linspace(-0.1, 0.1, 21)
    >>> velocity = position / (position**2 + 0.02**2)
    >>> velocity[3] = 400.0
    >>> screen(Survey.traverse(position=position, velocity=velocity)).outliers
    (3,)
    """
    outliers = _plane_outliers(survey) if survey.geometry == "plane" else _line_outliers(survey)
    sentences = _masked(survey)
    if outliers.size:
        sentences.append(_listed(survey, outliers))
        survey = survey.without(outliers.tolist(), "outlier: normalised median test of Westerweel and Scarano (2005)")
    if survey.geometry == "radial" and centre is None:
        centre = (0.0, 0.0)
    used = survey.in_plane
    if used.sum() < _FEWEST_SAMPLES:
        sentences.append(f"{used.sum()} samples leave little to test a model with; add points.")
    inside, reach = None, math.nan
    if (
        centre is not None
        and peak_radius is not None
        and math.isfinite(peak_radius)
        and peak_radius > 0.0
        and used.any()
    ):
        radius = np.unique(np.hypot(survey.x[used] - centre[0], survey.y[used] - centre[1]))
        inside = int((_stations(survey, used, centre) < peak_radius).sum())
        reach = float(radius.max() / peak_radius)
        sentences += _about_core(survey, used, centre, peak_radius, inside, reach)
    return Screening(survey.points, inside, reach, tuple(outliers.tolist()), survey, tuple(sentences))


def _line_outliers(survey: Survey) -> NDArray[np.intp]:
    found: list[int] = []
    for vector in ((0.0, 1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)):
        component = np.flatnonzero(survey.included & np.all(survey.direction == vector, axis=1))
        if component.size < _FEWEST_FOR_OUTLIERS:
            continue
        order = component[np.argsort(survey.x[component], kind="stable")]
        position, velocity = survey.x[order], survey.velocity[order]
        neighbours = _window(order.size, 3 if order.size >= 20 else 2)
        noise = _stated_or(survey, order, _noise(position, velocity))
        trend = _theil_sen(position, velocity, neighbours)
        suspect = np.flatnonzero(_ratio(velocity, neighbours, noise, trend) > _LIMIT)
        found += [int(order[i]) for i in suspect if not _lone_core_station(velocity, int(i))]
    return np.array(sorted(found), dtype=np.intp)


def _plane_outliers(survey: Survey) -> NDArray[np.intp]:
    """Test whole vectors in the plane, and the axial component by itself."""
    found: list[int] = []
    rows = [np.flatnonzero(survey.included & (np.abs(survey.direction[:, kind]) == 1.0)) for kind in (0, 1, 2)]
    if np.array_equal(survey.x[rows[0]], survey.x[rows[1]]) and np.array_equal(survey.y[rows[0]], survey.y[rows[1]]):
        groups = [rows[:2], rows[2:]]
    else:  # a component is missing here and there: each by itself
        groups = [[component] for component in rows]
    for group in groups:
        if group[0].size < 2 * _FEWEST_FOR_OUTLIERS:
            continue
        points = np.column_stack([survey.x[group[0]], survey.y[group[0]]])
        neighbours = _nearest(points, 8)
        ratios = []
        for component in group:
            velocity = survey.velocity[component]
            residual = velocity - np.median(velocity[neighbours], axis=1)
            noise = _stated_or(survey, component, float(1.4826 * np.median(np.abs(residual))))
            ratios.append(_ratio(velocity, neighbours, noise, _flat_trend(points, velocity, neighbours)))
        suspect = np.flatnonzero(np.sqrt(np.sum(np.square(ratios), axis=0)) > _LIMIT)
        vectors = np.column_stack([survey.velocity[component] for component in group])
        vectors = vectors - np.median(vectors, axis=0)
        for i in suspect:
            if len(group) < 2 or not _core_vector(points, vectors, neighbours[i], int(i)):
                found += [int(component[i]) for component in group]
    return np.array(sorted(found), dtype=np.intp)


def _ratio(velocity: FloatArray, neighbours: NDArray[np.intp], noise: FloatArray, trend: Trend) -> FloatArray:
    """Normalised distance from the neighbours' median or from their trend, whichever is nearer."""
    around = velocity[neighbours]
    middle = np.median(around, axis=1)
    level = np.median(velocity)
    turns = (around.min(axis=1) < level - 3.0 * noise) & (around.max(axis=1) > level + 3.0 * noise)
    floor = noise + 1e-9 * np.abs(velocity - level).max() + np.finfo(float).tiny
    ratios = []
    for expected, distances in ((middle, np.abs(around - middle[:, None])), trend):
        ordered = np.sort(distances, axis=1)
        # Where the neighbours turn sign the core lies between them: what they differ by is flow, not noise.
        spread = np.where(turns, ordered[:, -2], np.median(ordered, axis=1))
        # Neighbours can agree by chance; noise alone separates them by 0.6745 standard deviations in the median.
        ratios.append(np.abs(velocity - expected) / (np.maximum(spread, 0.6745 * noise) + floor))
    return np.asarray(np.minimum(*ratios))


def _stated_or(survey: Survey, component: NDArray[np.intp], noise: float) -> FloatArray:
    """Take the stated uncertainty or the noise that is seen, whichever is larger."""
    seen = np.full(component.size, noise)
    return seen if survey.uncertainty is None else np.maximum(seen, survey.uncertainty[component])


def _window(number: int, half: int) -> NDArray[np.intp]:
    """List the 2·half nearest in the row, without the sample itself, shape (number, 2·half)."""
    first = np.clip(np.arange(number) - half, 0, number - 2 * half - 1)
    span = first[:, None] + np.arange(2 * half + 1)
    return np.asarray(span[span != np.arange(number)[:, None]].reshape(number, 2 * half))


def _noise(position: FloatArray, velocity: FloatArray) -> float:
    """Robust standard deviation of a sample about the straight line between its neighbours."""
    span = position[2:] - position[:-2]
    share = np.divide(position[1:-1] - position[:-2], span, out=np.full(span.shape, 0.5), where=span > 0.0)
    residual = velocity[1:-1] - (1.0 - share) * velocity[:-2] - share * velocity[2:]
    weight = np.sqrt(1.0 + share**2 + (1.0 - share) ** 2)
    return float(1.4826 * np.median(np.abs(residual) / weight))


def _theil_sen(position: FloatArray, velocity: FloatArray, neighbours: NDArray[np.intp]) -> Trend:
    """Value on the robust straight line through the neighbours, and their distances from that line."""
    x, v = position[neighbours] - position[:, None], velocity[neighbours]
    i, j = np.triu_indices(neighbours.shape[1], 1)
    run, rise = x[:, j] - x[:, i], v[:, j] - v[:, i]
    slope = np.median(np.divide(rise, run, out=np.zeros_like(run), where=run > 0.0), axis=1)
    along = slope[:, None] * x
    expected = np.median(v - along, axis=1)
    return expected, np.abs(v - along - expected[:, None])


def _flat_trend(points: FloatArray, velocity: FloatArray, neighbours: NDArray[np.intp]) -> Trend:
    """Value on the plane through the neighbours, and their distances from that plane."""
    arm = points[neighbours] - points[:, None, :]
    arm = arm / np.abs(arm).max()
    design = np.concatenate([np.ones((*neighbours.shape, 1)), arm], axis=2)
    v = velocity[neighbours]
    fitted = np.einsum("nij,nj->ni", np.linalg.pinv(design), v)
    return fitted[:, 0], np.abs(v - np.einsum("nji,ni->nj", design, fitted))


def _nearest(points: FloatArray, number: int) -> NDArray[np.intp]:
    from scipy.spatial import cKDTree

    scale = np.ptp(points, axis=0).max()
    _, near = cKDTree(points / scale).query(points / scale, k=number + 1)
    own = near == np.arange(len(points))[:, None]
    own[~own.any(axis=1), -1] = True  # more repeats at one point than neighbours are asked for
    return np.asarray(near[~own].reshape(len(points), number))


def _lone_core_station(velocity: FloatArray, index: int) -> bool:
    """Whether a station stands alone in an unresolved core: its neighbours turn sign and fall off on both sides."""
    if not 2 <= index < velocity.size - 2:
        return False
    level = np.median(velocity)
    far_left, left, own, right, far_right = velocity[index - 2 : index + 3] - level
    falls_off = abs(left) > abs(far_left) and abs(right) > abs(far_right)
    return bool(left * right < 0.0 and falls_off and abs(own) < _UNRESOLVED * max(abs(left), abs(right)))


def _core_vector(points: FloatArray, velocity: FloatArray, neighbours: NDArray[np.intp], index: int) -> bool:
    """Whether a vector stands in an unresolved core: its neighbours turn around it and it is not absurdly large."""
    arm = points[neighbours] - points[index]
    flow = velocity[neighbours]
    turning = arm[:, 0] * flow[:, 1] - arm[:, 1] * flow[:, 0]
    size = np.hypot(*arm.T) * np.hypot(*flow.T)
    share = abs(np.divide(turning, size, out=np.zeros_like(size), where=size > 0.0).mean())
    largest = np.hypot(*flow.T).max()
    return bool(share > 0.7 and np.hypot(*velocity[index]) < _UNRESOLVED * largest)


def _listed(survey: Survey, outliers: NDArray[np.intp]) -> str:
    shown = ", ".join(
        f"{survey.velocity[i]:.4g} m/s at ({survey.x[i]:.4g}, {survey.y[i]:.4g}) m" for i in outliers[:5].tolist()
    )
    more = f" and {outliers.size - 5} more" if outliers.size > 5 else ""
    counted = "1 outlier is" if outliers.size == 1 else f"{outliers.size} outliers are"
    return f"{counted} set aside: {shown}{more}."


def _masked(survey: Survey) -> list[str]:
    zero = int(np.sum(survey.in_plane & (survey.velocity == 0.0)))
    if zero < 3:
        return []
    return [f"{zero} samples are exactly zero; if they mark invalid vectors, leave them empty in the file."]


def _stations(survey: Survey, used: BoolArray, centre: tuple[float, float]) -> FloatArray:
    """Distances of the different stations from the centre."""
    places = np.unique(np.column_stack([survey.x[used], survey.y[used]]), axis=0)
    return np.asarray(np.hypot(places[:, 0] - centre[0], places[:, 1] - centre[1]))


def _about_core(
    survey: Survey, used: BoolArray, centre: tuple[float, float], peak_radius: float, inside: int, reach: float
) -> list[str]:
    sentences = []
    if inside == 0:
        sentences.append(
            "No station lies inside the core: the survey gives the circulation, an upper limit of the core radius "
            "and a lower bound of the drop."
        )
    elif inside < _FEWEST_INSIDE:
        sentences.append(
            f"Only {inside} stations lie inside the core; add some within {peak_radius:.3g} m of the axis."
        )
    if reach < _REACH:
        sentences.append(
            f"The survey reaches {reach:.2g} peak radii; a Lamb-Oseen vortex has 6 % of its drop beyond 3. Measure "
            "farther out."
        )
    if survey.geometry != "plane":
        near = np.sort(np.unique(survey.x[used]))
        near = near[np.abs(near - centre[0]) <= _REACH * peak_radius]
        gap = float(np.diff(near).max()) if near.size > 1 else 0.0
        if gap > peak_radius:
            where = near[int(np.argmax(np.diff(near)))]
            sentences.append(
                f"A gap of {gap:.3g} m near the core, from {where:.4g} m on, is wider than the peak radius."
            )
    return sentences
