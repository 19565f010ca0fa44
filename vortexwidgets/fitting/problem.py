"""A survey and a model as one weighted least-squares problem with exact derivatives."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
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


@dataclass(frozen=True, eq=False, slots=True)
class Samples:
    """The included in-plane samples of a survey, laid out for fitting; divided by their standard uncertainties."""

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
    is_flat: bool  # a line that measures across itself, positive to its left
    places: frozenset[float]  # of the samples of a flat line, where a centre would be at distance 0
    prior: tuple[int, float, float] | None  # nonlinear parameter, value, standard uncertainty
    extent: float  # size of the survey [m]
    station: npt.NDArray[np.intp] | None  # (N,) which reading each sample repeats; None where no reading is repeated

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

    def reweighted(self, factor: FloatArray) -> Samples:
        """The same samples with each row multiplied by a factor, shape (N,)."""
        row = factor if self.weights is None else factor[:, None]
        target = self.target * factor
        return replace(
            self,
            toward_x=None if self.toward_x is None else self.toward_x * row,
            toward_y=self.toward_y * row,
            target=target,
            power=float(target @ target),
            uncertainty=self.uncertainty / factor,
            background=self.background * factor,
        )


@dataclass(eq=False, slots=True)
class Problem:
    """Samples and a model as one least-squares problem.

    A sample measures a component of the in-plane velocity, v = swirl_scale * f(position) + background. `f` depends on
    the nonlinear parameters (centre_x, centre_y, core_radius, shape...); swirl scale and background enter linearly. A
    model whose strength is its circulation has swirl_scale = circulation / (2π core_radius).
    """

    samples: Samples
    model: VortexModel

    kernel: Callable[..., tuple[FloatArray, ...]] = field(init=False)  # compiled (F, W, dF/dshape...) of the model

    def __post_init__(self) -> None:
        self.kernel = self.model.fit_kernel()

    @property
    def by_circulation(self) -> bool:
        """Whether the strength is a circulation."""
        return self.model.strength == "circulation"

    @property
    def strength_name(self) -> str:
        """Name of the linear strength parameter."""
        return "circulation" if self.by_circulation else "swirl_scale"

    def columns(self, nonlinear: list[float], free: tuple[int, ...]) -> tuple[FloatArray, list[FloatArray]]:
        """Response to a unit swirl scale and its derivatives by the free nonlinear parameters, shape (N,) each.

        The derivatives are by relative change: of a length per core radius, of a shape parameter per itself, so that
        every column has the size of the response.
        """
        rows = list(np.empty((1 + len(free), len(self.samples.target))))
        self.fill(nonlinear, free, rows)
        return rows[0], rows[1:]

    def fill(self, nonlinear: list[float], free: tuple[int, ...], rows: list[FloatArray]) -> None:
        """Write response and derivatives into rows that are there already."""
        samples = self.samples
        if samples.is_flat and nonlinear[CENTRE_Y] == 0.0:
            self._fill_flat(nonlinear, free, rows)
            return
        columns = self._general_columns(nonlinear, free)
        for row, column in zip(rows, columns, strict=True):
            if samples.weights is None:
                row[:] = column
            else:
                np.matmul(column, samples.weights, out=row)

    def _general_columns(self, nonlinear: list[float], free: tuple[int, ...]) -> list[FloatArray]:
        """The columns at every displacement of the instrument, shape (N,) or (N, K) each."""
        samples = self.samples
        centre_x, centre_y, core_radius, *shape = nonlinear
        dx = samples.x - centre_x
        r2 = dx * dx
        if samples.y is None:
            dy: FloatArray | float = -centre_y
            r2 += centre_y * centre_y + _NEAR_ZERO
        else:
            dy = samples.y - centre_y
            r2 += dy * dy
            r2 += _NEAR_ZERO
        r = np.sqrt(r2)
        x = r / core_radius
        swirl, vorticity, *by_shape = self.kernel(x, *shape)
        across = dx * samples.toward_y
        if samples.toward_x is not None:
            across -= dy * samples.toward_x
        across /= r  # unit swirl direction on the measured one
        xw = x * vorticity
        columns = [swirl * across]
        slope: FloatArray | None = None
        for index in free:
            if index == CORE_RADIUS:
                column = (swirl - xw) * across
            elif index < CORE_RADIUS:
                if slope is None:
                    slope = (2.0 * swirl - xw) * across / r2
                    turn = swirl / r
                if index == CENTRE_X:
                    column = slope * dx - turn * samples.toward_y
                elif samples.toward_x is None:
                    column = slope * dy
                else:
                    column = slope * dy + turn * samples.toward_x
                column *= core_radius
            else:
                column = (nonlinear[index] * by_shape[index - SHAPE]) * across
            columns.append(column)
        return columns

    def _fill_flat(self, nonlinear: list[float], free: tuple[int, ...], rows: list[FloatArray]) -> None:
        """The same on a line through the axis that measures across itself, where most of the geometry falls away."""
        samples = self.samples
        centre_x, core_radius = nonlinear[CENTRE_X], nonlinear[CORE_RADIUS]
        signed = np.subtract(samples.x, centre_x)
        if centre_x in samples.places:
            signed += _NEAR_ZERO
        np.divide(signed, core_radius, signed)
        x = np.absolute(signed)
        swirl, vorticity, *by_shape = self.kernel(x, *nonlinear[SHAPE:])
        across = np.copysign(samples.toward_y, signed)
        np.multiply(swirl, across, rows[0])
        if not free:
            return
        steep = rows[1 + free.index(CORE_RADIUS)] if CORE_RADIUS in free else np.empty_like(x)
        slope = np.multiply(x, vorticity)
        np.multiply(np.subtract(swirl, slope, slope), across, steep)
        for position, index in enumerate(free, 1):
            if index == CENTRE_X:
                np.divide(steep, signed, rows[position])
            elif index == CENTRE_Y:
                rows[position].fill(0.0)
            elif index >= SHAPE:
                np.multiply(by_shape[index - SHAPE], nonlinear[index] * across, rows[position])


def lay_out(survey: Survey, *, instrument: Instrument | None = None, background: Background = "none") -> Samples:
    """Lay out a survey for fitting, once: a survey never changes, so the layout is kept with it."""
    store: dict[object, Samples] = survey.__dict__.setdefault("_layouts", {})
    key = (instrument, background)
    if key not in store:
        store[key] = _laid_out(survey, instrument, background)
    return store[key]


def _laid_out(survey: Survey, instrument: Instrument | None, background: Background) -> Samples:
    chosen = survey.in_plane
    x, y, velocity = survey.x[chosen], survey.y[chosen], survey.velocity[chosen]
    uncertainty = np.ones_like(velocity) if survey.uncertainty is None else survey.uncertainty[chosen]
    toward_x, toward_y = survey.direction[chosen, 0] / uncertainty, survey.direction[chosen, 1] / uncertainty
    names, columns = _background_columns(background, x, y, toward_x, toward_y)
    on_line, across = not y.any(), not toward_x.any()
    weights = None
    if instrument is not None and not instrument.is_ideal:
        shift_x, shift_y, weights = instrument.rule
        x, y = np.add.outer(x, shift_x), np.add.outer(y, shift_y)
        toward_x, toward_y = toward_x[:, None], toward_y[:, None]
        on_line = False
    prior = None
    if survey.miss_distance is not None and survey.miss_distance.uncertainty > 0.0:
        prior = (CENTRE_Y, survey.miss_distance.value, survey.miss_distance.uncertainty)
    target = velocity / uncertainty
    is_flat = on_line and across and bool((toward_y > 0.0).all())
    places = frozenset(x.tolist()) if is_flat else frozenset()
    return Samples(
        x=x,
        y=None if on_line else y,
        toward_x=None if across else toward_x,
        toward_y=toward_y,
        target=target,
        power=float(target @ target),
        uncertainty=uncertainty,
        weights=weights,
        background=columns,
        background_names=names,
        is_flat=is_flat,
        places=places,
        prior=prior,
        extent=float(max(np.ptp(x), np.ptp(y), np.abs(x).max(), np.abs(y).max())) or 1.0,
        station=None if len(places) == len(target) else _stations(survey),
    )


def _stations(survey: Survey) -> npt.NDArray[np.intp] | None:
    chosen = survey.in_plane
    keys = np.column_stack([survey.x[chosen], survey.y[chosen], survey.direction[chosen]])
    if len(set(map(tuple, keys.tolist()))) == len(keys):  # the usual case, without sorting
        return None
    return np.ravel(np.unique(keys, axis=0, return_inverse=True)[1])


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
