"""The core pressure drop straight from the samples, without a model, as a cross-check."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from vortexwidgets.uncertainty import Contribution, Estimate

if TYPE_CHECKING:
    from vortexwidgets.fitting.result import Fit
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]

_FEWEST = 4  # samples for two rings and something between them


@dataclass(frozen=True)
class DataDrop:
    """The drop straight from the samples, without a model: three shares of one sum. [Pa]"""

    estimate: Estimate
    measured: float
    towards_axis: float
    beyond: float
    sentences: tuple[str, ...]


def data_drop(survey: Survey, fit: Fit, *, density: Estimate, model_drop: Estimate | None) -> DataDrop:
    """Core pressure drop straight from the samples, as a cross-check on the models. [Pa]

    Parameters
    ----------
    survey : Survey
        Included in-plane samples are used.
    fit : Fit
        Gives the centre and the background, nothing else.
    density : Estimate
        [kg/m³]
    model_drop : Estimate or None
        What the models say of the mean profile, for the comparison; None where the probe averaged. [Pa]

    Returns
    -------
    DataDrop
        With its shares: the measured range Σ (v² - u²) Δln r, a solid-body cap ½ρv² within the innermost station, and
        the tail ½ρv² of constant circulation beyond the outermost one.

    Notes
    -----
    Noise adds its variance to v², so u² is taken off. Samples are averaged in rings first. The cap is the smallest
    drop a monotonic swirl can have there.
    """
    radius, swirl, noise = _swirl_of_samples(survey, fit)
    if len(radius) < _FEWEST:
        nothing = Estimate(math.nan, math.nan, "core_pressure_drop")
        said = "Too few samples see the swirl for a drop straight from the data."
        return DataDrop(nothing, math.nan, math.nan, math.nan, (said,))
    ring_r, ring_v, ring_u = _rings(radius, swirl, noise)
    square = ring_v**2 - ring_u**2
    log_r = np.log(ring_r)
    measured = float(np.sum(0.5 * (square[1:] + square[:-1]) * np.diff(log_r)))
    trapezoid = np.zeros(len(ring_r))
    trapezoid[1:] += 0.5 * np.diff(log_r)
    trapezoid[:-1] += 0.5 * np.diff(log_r)
    towards_axis = 0.5 * float(square[0])
    # The circulation at the edge is better known from the outer rings together than from the last one.
    outer = ring_r >= 0.7 * ring_r[-1]
    weight = 1.0 / np.maximum(ring_u[outer], 1e-300) ** 2
    edge = float(np.sum(weight * ring_v[outer] * ring_r[outer]) / np.sum(weight))
    beyond = 0.5 * (edge / float(ring_r[-1])) ** 2
    slopes = 2.0 * ring_v * trapezoid
    slopes[0] += ring_v[0]
    noise_part = math.sqrt(float(np.sum((slopes * ring_u) ** 2)) + 2.0 * float(np.sum((trapezoid * ring_u**2) ** 2)))
    total = density.value * (measured + towards_axis + beyond)
    uncertainty = math.hypot(density.value * noise_part, 2.0 * survey.velocity_gain.uncertainty * total)
    estimate = Estimate(
        total,
        uncertainty,
        "core_pressure_drop",
        budget=(
            Contribution("scatter of the samples", density.value * noise_part),
            Contribution("velocity gain", 2.0 * survey.velocity_gain.uncertainty * total),
        ),
    )
    return DataDrop(
        estimate,
        density.value * measured,
        density.value * towards_axis,
        density.value * beyond,
        tuple(_comparison(estimate, density.value * towards_axis, model_drop)),
    )


def _comparison(data: Estimate, cap: float, model: Estimate | None) -> list[str]:
    sentences = []
    share = cap / data.value if data.value > 0.0 else math.nan
    if share > 0.3:
        sentences.append(
            f"{100 * share:.0f} % of the data-only drop is the cap towards the axis, which no sample measured; it is "
            "a least value."
        )
    if model is None:
        sentences.append("The probe averaged over its width, so the data-only drop is not compared with the models.")
    elif model.is_determined:
        off = data.value - model.value
        doubt = math.hypot(data.uncertainty, model.uncertainty)
        if abs(off) > max(3.0 * doubt, 0.08 * model.value):
            side = "above" if off > 0.0 else "below"
            sentences.append(
                f"Warning: the data-only drop lies {100 * abs(off) / model.value:.0f} % {side} that of the models, "
                "more than "
                "three combined standard uncertainties; look at the residuals near the axis before using either."
            )
        else:
            sentences.append("The data-only drop agrees with the models.")
    return sentences


def _swirl_of_samples(survey: Survey, fit: Fit) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Radius, swirl and its standard uncertainty of the samples that see the swirl well enough."""
    problem = fit._problem
    chosen = survey.in_plane
    dx, dy = survey.x[chosen] - fit.centre[0], survey.y[chosen] - fit.centre[1]
    direction = survey.direction[chosen]
    radius = np.hypot(dx, dy)
    with np.errstate(invalid="ignore", divide="ignore"):
        seen = (dx * direction[:, 1] - dy * direction[:, 0]) / radius
    velocity = problem.samples.target.copy()
    if len(problem.samples.background):
        velocity -= fit._solution.linear[1:] @ problem.samples.background
    velocity *= problem.samples.uncertainty
    noise = problem.samples.uncertainty * (fit.scatter if fit.uncertainties == "relative" else 1.0)
    good = np.abs(np.nan_to_num(seen)) > 0.5
    return radius[good], velocity[good] / seen[good], noise[good] / np.abs(seen[good])


def _rings(radius: FloatArray, swirl: FloatArray, noise: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Weighted means over rings that hold at least two samples and are at most 12 % wide where samples are plenty."""
    order = np.argsort(radius)
    radius, swirl, noise = radius[order], swirl[order], noise[order]
    rings: list[tuple[float, float, float]] = []
    first = 0
    while first < len(radius):
        last = first + 1
        while last < len(radius) and (radius[last] <= 1.12 * radius[first] or last - first < 2):
            last += 1
        if len(radius) - last == 1:
            last = len(radius)
        part = slice(first, last)
        weight = 1.0 / noise[part] ** 2
        total = float(weight.sum())
        rings.append(
            (
                float((weight * radius[part]).sum() / total),
                float((weight * swirl[part]).sum() / total),
                total**-0.5,
            )
        )
        first = last
    columns = np.array(rings)
    keep = columns[:, 0] > 0.0
    return columns[keep, 0], columns[keep, 1], columns[keep, 2]
