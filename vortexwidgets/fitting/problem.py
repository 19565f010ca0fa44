"""A survey and a model as one weighted least-squares problem with exact derivatives."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

import numpy as np
import numpy.typing as npt

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel
    from vortexwidgets.survey.instrument import Instrument
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]
Background = Literal["none", "uniform", "linear"]

# The shape of the problem: what is linear is eliminated, what is not is iterated on.
CENTRE_X, CENTRE_Y, CORE_RADIUS, SHAPE = 0, 1, 2, 3

_NEAR_ZERO = 1e-120  # keeps r > 0, so that the response at the centre is its limit and not 0/0


@dataclass(frozen=True, eq=False)
class Problem:
    """Samples, weights and model; every array is already divided by the standard uncertainty of its sample.

    The samples measure a component of the in-plane velocity, v = strength * f(position) + background. `f` depends on the
    nonlinear parameters (centre_x, centre_y, core_radius, shape...); strength and background enter linearly.
    """

    model: VortexModel
    x: FloatArray  # (N,) or (N, K) with K displacements of the instrument [m]
    y: FloatArray
    toward_x: FloatArray  # (N,) or (N, 1): direction of the measured component over its uncertainty [s/m]
    toward_y: FloatArray
    target: FloatArray  # (N,) velocity over its uncertainty
    uncertainty: FloatArray  # (N,) what the rows were divided by [m/s]; ones where the scatter is unknown
    weights: FloatArray | None  # (K,) of the instrument's displacements
    background: FloatArray  # (B, N) columns
    background_names: tuple[str, ...]
    by_circulation: bool
    prior: tuple[int, float, float] | None  # nonlinear parameter, value, standard uncertainty

    @property
    def strength_name(self) -> str:
        """Name of the linear strength parameter."""
        return "circulation" if self.by_circulation else "swirl_scale"

    def columns(self, nonlinear: list[float], free: tuple[int, ...]) -> tuple[FloatArray, list[FloatArray]]:
        """Unit response f and its derivatives by the free nonlinear parameters.

        The derivatives are by relative change: of a length per core radius, of a shape parameter per itself, so that
        every column has the size of f.
        """
        centre_x, centre_y, core_radius = nonlinear[0], nonlinear[1], nonlinear[2]
        shape = nonlinear[3:]
        dx = self.x - centre_x
        dy = self.y - centre_y
        r2 = dx * dx
        r2 += dy * dy
        r2 += _NEAR_ZERO
        r = np.sqrt(r2)
        x = r / core_radius
        swirl, vorticity, *by_shape = self.model.fit_kernel()(x, *shape)
        scale = 1.0 / (2.0 * math.pi * core_radius) if self.by_circulation else 1.0
        across = dx * self.toward_y
        across -= dy * self.toward_x
        across *= scale / r  # unit swirl direction on the measured one, with the scale
        response = swirl * across
        xw = x * vorticity
        derivatives: list[FloatArray] = []
        slope: FloatArray | None = None
        for index in free:
            if index == CORE_RADIUS:
                column = -xw * across if self.by_circulation else (swirl - xw) * across
            elif index < CORE_RADIUS:
                if slope is None:
                    slope = (xw - 2.0 * swirl) * across / r2
                turn = (-scale * core_radius) * swirl / r
                column = turn * self.toward_y if index == CENTRE_X else -turn * self.toward_x
                column = column - (core_radius * slope) * (dx if index == CENTRE_X else dy)
            else:
                column = (nonlinear[index] * by_shape[index - SHAPE]) * across
            derivatives.append(column)
        if self.weights is not None:
            response = response @ self.weights
            derivatives = [column @ self.weights for column in derivatives]
        return response, derivatives

    def reweighted(self, factor: FloatArray) -> Problem:
        """The same problem with each row multiplied by a factor, shape (N,)."""
        row = factor if self.weights is None else factor[:, None]
        return replace(
            self,
            toward_x=self.toward_x * row,
            toward_y=self.toward_y * row,
            target=self.target * factor,
            uncertainty=self.uncertainty / factor,
            background=self.background * factor,
        )

    def for_model(self, model: VortexModel) -> Problem:
        """The same samples with another model."""
        return replace(self, model=model, by_circulation=model.strength == "circulation")


def build_problem(
    survey: Survey,
    model: VortexModel,
    *,
    instrument: Instrument | None = None,
    background: Background = "none",
    weighted: bool = True,
) -> Problem:
    """Lay out the included in-plane samples of a survey for a model."""
    direction_x, direction_y = survey.direction[:, 0], survey.direction[:, 1]
    x, y, velocity = survey.x, survey.y, survey.velocity
    uncertainty = survey.uncertainty if weighted else None
    chosen = survey.in_plane
    if not chosen.all():
        direction_x, direction_y, x, y, velocity = (a[chosen] for a in (direction_x, direction_y, x, y, velocity))
        uncertainty = None if uncertainty is None else uncertainty[chosen]
    if uncertainty is None:
        uncertainty = np.ones_like(velocity)
    toward_x, toward_y = direction_x / uncertainty, direction_y / uncertainty
    names, columns = _background_columns(background, x, y, toward_x, toward_y)
    weights = None
    if instrument is not None and not instrument.is_ideal:
        shift_x, shift_y, weights = instrument.rule
        x, y = np.add.outer(x, shift_x), np.add.outer(y, shift_y)
        toward_x, toward_y = toward_x[:, None], toward_y[:, None]
    prior = None
    if survey.miss_distance is not None and survey.miss_distance.uncertainty > 0.0:
        prior = (CENTRE_Y, survey.miss_distance.value, survey.miss_distance.uncertainty)
    return Problem(
        model=model,
        x=x,
        y=y,
        toward_x=toward_x,
        toward_y=toward_y,
        target=velocity / uncertainty,
        uncertainty=uncertainty,
        weights=weights,
        background=columns,
        background_names=names,
        by_circulation=model.strength == "circulation",
        prior=prior,
    )


_UNIFORM = ("background_x", "background_y")
_GRADIENTS = ("gradient_xx", "gradient_xy", "gradient_yx", "gradient_yy")


def _background_columns(
    background: Background, x: FloatArray, y: FloatArray, toward_x: FloatArray, toward_y: FloatArray
) -> tuple[tuple[str, ...], FloatArray]:
    """Columns of u = background + gradient · position, without those that no sample sees."""
    if background == "none":
        return (), np.empty((0, len(x)))
    columns = {"background_x": toward_x, "background_y": toward_y}
    if background == "linear":
        columns |= {
            "gradient_xx": x * toward_x,
            "gradient_xy": y * toward_x,
            "gradient_yx": x * toward_y,
            "gradient_yy": y * toward_y,
        }
    seen = {name: column for name, column in columns.items() if np.any(column)}
    return tuple(seen), np.array(list(seen.values()))
