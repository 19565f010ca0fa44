"""A survey along a line: samples with error bars, curves of the ranked models, residuals of the best."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from vortexwidgets.plots.style import (
    LINE_WIDTH,
    ThemeName,
    dress,
    hang_label,
    label_axis,
    legend_height,
    limits_around,
    line_style,
    model_number,
    place_in_grid,
    show_legend,
    theme_named,
)

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.lines import Line2D

    from vortexwidgets.fitting.ranking import Ranked
    from vortexwidgets.fitting.result import Fit
    from vortexwidgets.models.vortex import Vortex
    from vortexwidgets.survey.instrument import Instrument
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]

MOST_CURVES = 6
_PICK_RADIUS = 6.0  # points: a finger's width off still hits
_BY_HAND = "by hand"


class SurveyPlot:
    """A radial survey or a traverse, redrawn in place.

    Samples in use are filled circles (across the line) and open squares (along it) with error bars; samples set aside
    are crosses, or triangles at the edge where they lie beyond it. Below stand the residuals of the best model over
    their uncertainties, with a band at ±2. Axial samples are not shown.

    Parameters
    ----------
    figure : Figure
        Empty; it belongs to the caller.
    theme : {"light", "dark"}
        Colours.

    Attributes
    ----------
    axes, residual_axes : Axes
    points : Line2D
        Unseen points under all samples that can be picked; the index of a picked point is that of the sample.
    """

    def __init__(self, figure: Figure, *, theme: ThemeName = "light") -> None:
        from matplotlib.collections import LineCollection

        self.figure = figure
        self._theme = theme_named(theme)
        figure.set_facecolor(self._theme.background)
        self.axes, self.residual_axes = figure.add_subplot(2, 1, 1), figure.add_subplot(2, 1, 2)
        for axes in (self.axes, self.residual_axes):
            dress(axes, self._theme)
        colours = self._theme
        self.residual_axes.axhspan(-2.0, 2.0, color=colours.grid, alpha=0.6, linewidth=0.0)
        self.axes.axhline(0.0, color=colours.quiet, linewidth=0.8)
        self._bars = LineCollection([], colors=colours.quiet, linewidths=1.0, zorder=2.5)
        self.axes.add_collection(self._bars, autolim=False)
        self._curves = [self._line(self.axes, zorder=3.0) for _ in range(MOST_CURVES + 1)]
        self._curves_along = [self._line(self.axes, zorder=3.0) for _ in range(MOST_CURVES + 1)]
        self._across = self._line(self.axes, marker="o", markersize=4.5, color=colours.text, zorder=4.0)
        self._along = self._line(
            self.axes, marker="s", markersize=4.2, color=colours.text, markerfacecolor=colours.background, zorder=4.0
        )
        self._aside = [
            self._line(self.axes, marker=marker, markersize=7.0, color=colours.warning, markeredgewidth=1.8, zorder=5.0)
            for marker in ("x", "^", "v")
        ]
        self._residuals = self._line(self.residual_axes, marker="o", markersize=3.8, color=colours.text)
        self._residuals_along = self._line(
            self.residual_axes, marker="s", markersize=3.6, color=colours.text, markerfacecolor=colours.background
        )
        self.points = self._line(self.axes, marker="o", markersize=4.5, alpha=0.0)
        self.points.set_picker(True)
        self.points.set_pickradius(_PICK_RADIUS)
        self._survey: Survey | None = None
        self._rows: tuple[Ranked, ...] = ()
        self._instrument: Instrument | None = None
        self._by_hand: Vortex | None = None
        self.settle()

    @property
    def artists(self) -> list[Artist]:
        """What moves with the survey and the ranking."""
        lines = [*self._curves, *self._curves_along, self._across, self._along, *self._aside]
        return [self._bars, *lines, self._residuals, self._residuals_along, self.points]

    def update(
        self,
        survey: Survey,
        ranking: Iterable[Ranked] | None = None,
        *,
        instrument: Instrument | None = None,
        vortex: Vortex | None = None,
    ) -> None:
        """Show a survey, and curves through it, within the limits of now; `settle` fits the limits.

        Parameters
        ----------
        survey : Survey
            Radial or a traverse.
        ranking : Ranking or sequence of Ranked, optional
            Models whose curves are drawn, best first; at most six are.
        instrument : Instrument, optional
            What it did is done to the curves as well.
        vortex : Vortex, optional
            One more curve, turned by hand.
        """
        first = self._survey is None
        self._survey, self._instrument, self._by_hand = survey, instrument, vortex
        self._rows = tuple(ranking or ())[:MOST_CURVES]
        if first:
            self._fit_limits()
        self._draw_samples()
        self._draw_curves()
        self._draw_residuals()

    def settle(self) -> None:
        """Fit limits, ticks, legend and margins to what is shown now."""
        before = self.axes.get_xlim()
        self._fit_limits()
        self._draw_samples()
        if self.axes.get_xlim() != before:
            self._draw_curves()
        entries = self._entries()
        width = float(self.figure.get_size_inches()[0])
        left, right = 0.72, 0.16
        top = legend_height([text for _, text in entries], width - left - right)
        with_residuals = bool(self._rows)
        self.residual_axes.set_visible(with_residuals)
        shown = [self.axes, self.residual_axes] if with_residuals else [self.axes]
        place_in_grid(
            shown, columns=1, left=left, right=right, bottom=0.52, top=top, down=0.14, heights=[3.2, 1.0][: len(shown)]
        )
        radial = self._survey is not None and self._survey.geometry == "radial"
        across = "radius $r$" if radial else "position along the line"
        for axes in shown:
            label_axis(axes, "x", across, "m", ticks=9)
            last = axes is shown[-1]
            axes.tick_params(labelbottom=last)
            axes.xaxis.label.set_visible(last)
        label_axis(self.axes, "y", "swirl $v_θ$" if radial else "velocity", "m/s", ticks=7)
        label_axis(self.residual_axes, "y", "residual / $u$", "", ticks=4)
        for axes in shown:
            hang_label(axes)
        show_legend(self.figure, entries, self._theme, left=left, right=right)

    # Inside ---------------------------------------------------------------------------------------------------------

    def _line(self, axes: Axes, **looks: Any) -> Line2D:
        looks = {"linestyle": "none", **looks}
        (line,) = axes.plot([], [], **looks)
        return line

    def _fit_limits(self) -> None:
        survey = self._survey
        if survey is None:
            return
        used = survey.in_plane
        x = survey.x[survey.direction[:, 2] == 0.0]
        margin = 0.03 * float(np.ptp(x))
        low = 0.0 if survey.geometry == "radial" else float(x.min()) - margin
        bar = np.zeros(survey.velocity.size) if survey.uncertainty is None else survey.uncertainty
        velocity = np.concatenate([(survey.velocity - bar)[used], (survey.velocity + bar)[used], [0.0]])
        for axes in (self.axes, self.residual_axes):
            axes.set_xlim(low, float(x.max()) + margin)
        self.axes.set_ylim(*limits_around(velocity))
        size = max((float(np.abs(row.fit.normalised_residuals).max()) for row in self._rows[:1]), default=0.0)
        size = 1.12 * max(size if math.isfinite(size) else 0.0, 2.6)
        self.residual_axes.set_ylim(-size, size)

    def _draw_samples(self) -> None:
        survey = self._survey
        if survey is None:
            return
        across, along = _components(survey)
        used = survey.included
        self._across.set_data(survey.x[used & across], survey.velocity[used & across])
        self._along.set_data(survey.x[used & along], survey.velocity[used & along])
        self._bars.set_segments(_bars(survey, used & (across | along)))
        low, high = self.axes.get_ylim()
        edge = 0.025 * (high - low)
        shown = np.clip(survey.velocity, low + edge, high - edge)
        shown = np.where(across | along, shown, np.nan)
        where = (~((survey.velocity > high) | (survey.velocity < low)), survey.velocity > high, survey.velocity < low)
        for line, kind in zip(self._aside, where, strict=True):
            line.set_data(survey.x[~used & kind], shown[~used & kind])
        self.points.set_data(survey.x, shown)

    def _draw_curves(self) -> None:
        survey = self._survey
        if survey is None:
            return
        _, along = _components(survey)
        low, high = self.axes.get_xlim()
        curves = list(zip(self._curves, self._curves_along, strict=True))
        for line in [line for pair in curves for line in pair]:
            line.set_data([], [])
        for (across_line, along_line), row in zip(curves, self._rows, strict=False):
            position = _positions(row.fit.vortex, low, high)
            u, v = fitted_velocity(row.fit, position, np.zeros_like(position), self._instrument)
            number = model_number(row.model.key)
            looks = {
                "color": self._theme.colour(number),
                "linestyle": line_style(number),
                "linewidth": 1.1 if row.rejected else LINE_WIDTH,
                "alpha": 0.7 if row.rejected else 1.0,
            }
            across_line.set(data=(position, v), **looks)
            if along.any():
                along_line.set(data=(position, u), **looks)
        if self._by_hand is not None:
            position = _positions(self._by_hand, low, high)
            u, v = _averaged_velocity(self._by_hand, position, np.zeros_like(position), self._instrument)
            looks = {"color": self._theme.text, "linestyle": "-", "linewidth": 1.2, "alpha": 1.0}
            curves[-1][0].set(data=(position, v), **looks)
            if along.any():
                curves[-1][1].set(data=(position, u), **looks)

    def _draw_residuals(self) -> None:
        survey = self._survey
        self._residuals.set_data([], [])
        self._residuals_along.set_data([], [])
        if survey is None or not self._rows:
            return
        residuals = self._rows[0].fit.normalised_residuals
        if residuals.size != int(survey.in_plane.sum()):  # points were put in or out since the fit
            return
        _, along = _components(survey)
        second = along[survey.in_plane]
        x = survey.x[survey.in_plane]
        self._residuals.set_data(x[~second], residuals[~second])
        self._residuals_along.set_data(x[second], residuals[second])

    def _entries(self) -> list[tuple[Any, str]]:
        if self._survey is None:
            return []
        entries: list[tuple[Any, str]] = []
        if self._survey.two_components:
            entries = [(self._across, "across the line"), (self._along, "along the line")]
        else:
            entries = [(self._across, "samples")]
        if self._survey.set_aside:
            entries.append((self._aside[0], f"set aside ({len(self._survey.set_aside)})"))
        for line, row in zip(self._curves, self._rows, strict=False):
            entries.append((line, f"{row.model.name} (rejected)" if row.rejected else row.model.name))
        if self._by_hand is not None:
            entries.append((self._curves[-1], _BY_HAND))
        return entries


def fitted_velocity(
    fit: Fit, x: FloatArray, y: FloatArray, instrument: Instrument | None = None
) -> tuple[FloatArray, FloatArray]:
    """Velocity that a fit expects at points, with its background and what the instrument does to it. [m/s]

    Parameters
    ----------
    fit : Fit
    x, y : ndarray, shape (N,)
        Points in the plane of the survey. [m]
    instrument : Instrument, optional

    Returns
    -------
    u, v : ndarray, shape (N,)
    """
    u, v = _averaged_velocity(fit.vortex, x, y, instrument)
    part = {name: fit.value(name) for name in fit.names if name.startswith(("background", "gradient"))}
    u = u + part.get("background_x", 0.0) + part.get("gradient_xx", 0.0) * x + part.get("gradient_xy", 0.0) * y
    v = v + part.get("background_y", 0.0) + part.get("gradient_yx", 0.0) * x + part.get("gradient_yy", 0.0) * y
    return u, v


def _averaged_velocity(
    vortex: Vortex, x: FloatArray, y: FloatArray, instrument: Instrument | None
) -> tuple[FloatArray, FloatArray]:
    if instrument is None or instrument.is_ideal:
        u, v = vortex.velocity(x, y)
        return np.asarray(u, dtype=float), np.asarray(v, dtype=float)
    shift_x, shift_y, weight = instrument.rule
    u, v = vortex.velocity(np.add.outer(x, shift_x), np.add.outer(y, shift_y))
    return np.asarray(u) @ weight, np.asarray(v) @ weight


def _components(survey: Survey) -> tuple[npt.NDArray[np.bool_], npt.NDArray[np.bool_]]:
    """Which samples measure across the line, and which along it."""
    in_plane = survey.direction[:, 2] == 0.0
    along = in_plane & (np.abs(survey.direction[:, 0]) > np.abs(survey.direction[:, 1]))
    return in_plane & ~along, along


def _bars(survey: Survey, chosen: npt.NDArray[np.bool_]) -> Sequence[FloatArray]:
    if survey.uncertainty is None:
        return []
    x, velocity, bar = survey.x[chosen], survey.velocity[chosen], survey.uncertainty[chosen]
    ends = np.stack([np.column_stack([x, velocity - bar]), np.column_stack([x, velocity + bar])], axis=1)
    return list(ends)


def _positions(vortex: Vortex, low: float, high: float) -> FloatArray:
    """Positions at which a curve looks smooth: even ones, and closer ones about the core."""
    even = np.linspace(low, high, 240)
    length = float(vortex.peak_radius)
    if not 0.0 < length < high - low:
        return even
    near = vortex.centre[0] + length * np.linspace(-2.5, 2.5, 161)
    return np.unique(np.concatenate([even, near[(near >= low) & (near <= high)]]))
