"""A survey and a model as one weighted least-squares problem with exact derivatives."""

from __future__ import annotations

from collections.abc import Callable
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

    The samples measure a component of the in-plane velocity, v = swirl_scale * f(position) + background. `f` depends on the
    nonlinear parameters (centre_x, centre_y, core_radius, shape...); swirl scale and background enter linearly. A model
    whose strength is its circulation has swirl_scale = circulation / (2π core_radius).
    """

    model: VortexModel
    kernel: Callable[..., tuple[FloatArray, ...]]  # the model's fit kernel
    x: FloatArray  # (N,) or (N, K) with K displacements of the instrument [m]
    y: FloatArray | None  # None: all zero, as on a traverse
    toward_x: FloatArray | None  # (N,) or (N, 1): measured direction over its uncertainty [s/m]; None: all zero
    toward_y: FloatArray
    target: FloatArray  # (N,) velocity over its uncertainty
    power: float  # sum of its squares
    uncertainty: FloatArray  # (N,) what the rows were divided by [m/s]; ones where the scatter is unknown
    weights: FloatArray | None  # (K,) of the instrument's displacements
    background: FloatArray  # (B, N) columns
    background_names: tuple[str, ...]
    by_circulation: bool
    is_flat: bool  # a line that measures across itself, positive to its left
    prior: tuple[int, float, float] | None  # nonlinear parameter, value, standard uncertainty

    @property
    def strength_name(self) -> str:
        """Name of the linear strength parameter."""
        return "circulation" if self.by_circulation else "swirl_scale"

    @property
    def position(self) -> tuple[FloatArray, FloatArray]:
        """Where the samples were taken, without the displacements of the instrument, shape (N,) each. [m]"""
        x = self.x if self.weights is None else self.x @ self.weights
        if self.y is None:
            return x, np.zeros_like(x)
        return x, self.y if self.weights is None else self.y @ self.weights

    @property
    def toward(self) -> tuple[FloatArray, FloatArray]:
        """Measured direction over the uncertainty of each sample, shape (N,) each. [s/m]"""
        toward_y = np.ravel(self.toward_y)
        return np.zeros_like(toward_y) if self.toward_x is None else np.ravel(self.toward_x), toward_y

    def columns(self, nonlinear: list[float], free: tuple[int, ...]) -> tuple[FloatArray, list[FloatArray]]:
        """Response to a unit swirl scale and its derivatives by the free nonlinear parameters.

        The derivatives are by relative change: of a length per core radius, of a shape parameter per itself, so that
        every column has the size of the response.
        """
        if self.is_flat and nonlinear[CENTRE_Y] == 0.0:
            return self._flat_columns(nonlinear, free)
        centre_x, centre_y, core_radius, *shape = nonlinear
        dx = self.x - centre_x
        r2 = dx * dx
        if self.y is None:
            dy: FloatArray | float = -centre_y
            r2 += centre_y * centre_y + _NEAR_ZERO
        else:
            dy = self.y - centre_y
            r2 += dy * dy
            r2 += _NEAR_ZERO
        r = np.sqrt(r2)
        x = r / core_radius
        swirl, vorticity, *by_shape = self.kernel(x, *shape)
        across = dx * self.toward_y
        if self.toward_x is not None:
            across -= dy * self.toward_x
        across /= r  # unit swirl direction on the measured one
        response = swirl * across
        xw = x * vorticity
        derivatives: list[FloatArray] = []
        slope: FloatArray | None = None
        for index in free:
            if index == CORE_RADIUS:
                column = (swirl - xw) * across
            elif index < CORE_RADIUS:
                if slope is None:
                    slope = (2.0 * swirl - xw) * across / r2
                    turn = swirl / r
                if index == CENTRE_X:
                    column = slope * dx - turn * self.toward_y
                elif self.toward_x is None:
                    column = slope * dy
                else:
                    column = slope * dy + turn * self.toward_x
                column *= core_radius
            else:
                column = (nonlinear[index] * by_shape[index - SHAPE]) * across
            derivatives.append(column)
        if self.weights is not None:
            response = response @ self.weights
            derivatives = [column @ self.weights for column in derivatives]
        return response, derivatives

    def _flat_columns(self, nonlinear: list[float], free: tuple[int, ...]) -> tuple[FloatArray, list[FloatArray]]:
        """The same on a line through the axis that measures across itself, where most of the geometry falls away."""
        dx = self.x - nonlinear[CENTRE_X]
        x = np.abs(dx)
        x += _NEAR_ZERO
        x /= nonlinear[CORE_RADIUS]
        swirl, vorticity, *by_shape = self.kernel(x, *nonlinear[SHAPE:])
        across = np.copysign(self.toward_y, dx)
        response = swirl * across
        slope = swirl - x * vorticity
        derivatives = []
        for index in free:
            if index == CORE_RADIUS:
                column = slope * across
            elif index == CENTRE_X:
                column = slope / x
                column *= self.toward_y
            elif index == CENTRE_Y:
                column = np.zeros_like(x)
            else:
                column = (nonlinear[index] * by_shape[index - SHAPE]) * across
            derivatives.append(column)
        return response, derivatives

    def reweighted(self, factor: FloatArray) -> Problem:
        """The same problem with each row multiplied by a factor, shape (N,)."""
        row = factor if self.weights is None else factor[:, None]
        return replace(
            self,
            toward_x=None if self.toward_x is None else self.toward_x * row,
            toward_y=self.toward_y * row,
            target=self.target * factor,
            power=float(np.sum((self.target * factor) ** 2)),
            uncertainty=self.uncertainty / factor,
            background=self.background * factor,
        )

    def for_model(self, model: VortexModel) -> Problem:
        """The same samples with another model."""
        return replace(self, model=model, kernel=model.fit_kernel(), by_circulation=model.strength == "circulation")


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
    slanted = bool(toward_x.any())
    weights = None
    if instrument is not None and not instrument.is_ideal:
        shift_x, shift_y, weights = instrument.rule
        x, y = np.add.outer(x, shift_x), np.add.outer(y, shift_y)
        toward_x, toward_y = toward_x[:, None], toward_y[:, None]
    target = velocity / uncertainty
    off_line = bool(y.any())
    prior = None
    if survey.miss_distance is not None and survey.miss_distance.uncertainty > 0.0:
        prior = (CENTRE_Y, survey.miss_distance.value, survey.miss_distance.uncertainty)
    return Problem(
        model=model,
        kernel=model.fit_kernel(),
        x=x,
        y=y if off_line else None,
        toward_x=toward_x if slanted else None,
        toward_y=toward_y,
        target=target,
        power=float(target @ target),
        uncertainty=uncertainty,
        weights=weights,
        background=columns,
        background_names=names,
        by_circulation=model.strength == "circulation",
        is_flat=weights is None and not off_line and not slanted and bool((toward_y > 0.0).all()),
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
