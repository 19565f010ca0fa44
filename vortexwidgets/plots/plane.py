"""A planar survey: velocity vectors with the centre that was found, and the swirl about it."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from vortexwidgets.plots.style import (
    FONT_SIZE,
    LINE_WIDTH,
    SMALL,
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
    from matplotlib.colors import Colormap
    from matplotlib.figure import Figure
    from matplotlib.lines import Line2D

    from vortexwidgets.fitting.ranking import Ranked
    from vortexwidgets.models.vortex import Vortex
    from vortexwidgets.survey.instrument import Instrument
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]

MOST_CURVES = 6
_MOST_ARROWS = 900  # more are too short to be read, and slow
_PICK_RADIUS = 6.0  # points
_BAR, _BAR_ROOM = 0.13, 0.86  # inch: width of the colour bar, and room for it with its numbers and label


class PlanePlot:
    """A planar survey, redrawn in place.

    Arrows show the velocity in the plane, their colour its size; stations set aside are crosses. Where a ranking is
    given, the centre of its best model is marked with a circle through the largest swirl, and the swirl about that
    centre is shown against the radius with the curves of the models.

    Parameters
    ----------
    figure : Figure
        Empty; it belongs to the caller.
    theme : {"light", "dark"}
        Colours.

    Attributes
    ----------
    axes, profile_axes : Axes
    points : Line2D
        Unseen points under all samples that can be picked; the indices of a picked point are those of the samples of
        its station, one per component.
    """

    def __init__(self, figure: Figure, *, theme: ThemeName = "light") -> None:
        from matplotlib.cm import ScalarMappable
        from matplotlib.colors import Normalize

        self.figure = figure
        self._theme = theme_named(theme)
        figure.set_facecolor(self._theme.background)
        self.axes, self.profile_axes = figure.add_subplot(2, 1, 1), figure.add_subplot(2, 1, 2)
        for axes in (self.axes, self.profile_axes):
            dress(axes, self._theme)
        self.axes.set_aspect("equal", adjustable="box")
        self.profile_axes.axhline(0.0, color=self._theme.quiet, linewidth=0.8)
        self._sizes = Normalize(0.0, 1.0)
        self._map = _seen_map("viridis_r" if theme == "light" else "viridis")
        self._bar_axes = figure.add_axes((0.9, 0.5, 0.02, 0.4))
        self._bar = figure.colorbar(ScalarMappable(self._sizes, self._map), cax=self._bar_axes)
        self._bar.outline.set_visible(False)
        self._bar_axes.tick_params(colors=self._theme.text, labelsize=SMALL, length=3.0)
        self._bar_axes.yaxis.label.set(color=self._theme.text, fontsize=FONT_SIZE)
        self._arrows: Any = None
        warning, text = self._theme.warning, self._theme.text
        self._aside = self._line(self.axes, marker="x", markersize=7.0, color=warning, markeredgewidth=1.8, zorder=5.0)
        self._centre = self._line(
            self.axes, marker="+", markersize=13.0, color=warning, markeredgewidth=2.0, zorder=6.0
        )
        self._circle = self._line(self.axes, linestyle="-", color=warning, linewidth=1.4, zorder=6.0)
        self.points = self._line(self.axes, marker="o", markersize=4.5, alpha=0.0)
        self.points.set_picker(True)
        self.points.set_pickradius(_PICK_RADIUS)
        self._swirl = self._line(self.profile_axes, marker="o", markersize=2.4, color=text, alpha=0.55)
        self._curves = [self._line(self.profile_axes, zorder=3.0) for _ in range(MOST_CURVES)]
        self._survey: Survey | None = None
        self._rows: tuple[Ranked, ...] = ()
        self.settle()

    @property
    def artists(self) -> list[Artist]:
        """What moves with the survey and the ranking."""
        arrows = [] if self._arrows is None else [self._arrows]
        return [*arrows, self._aside, self._centre, self._circle, self._swirl, *self._curves, self.points]

    def update(
        self,
        survey: Survey,
        ranking: Iterable[Ranked] | None = None,
        *,
        instrument: Instrument | None = None,
        vortex: Vortex | None = None,
    ) -> None:
        """Show a survey, and the models about their centre, within the limits of now; `settle` fits the limits.

        Parameters
        ----------
        survey : Survey
            Planar.
        ranking : Ranking or sequence of Ranked, optional
            Models whose profiles are drawn, best first; at most six are.
        instrument : Instrument, optional
            Accepted as by `SurveyPlot`; the profiles are those of the vortices themselves.
        vortex : Vortex, optional
            A vortex turned by hand; its centre and circle are marked instead of the best model's.
        """
        self._survey, self._by_hand = survey, vortex
        self._rows = tuple(ranking or ())[:MOST_CURVES]
        self._draw_field()
        self._draw_profiles()

    def settle(self) -> None:
        """Fit limits, ticks, legend and margins to what is shown now."""
        width, height = (float(size) for size in self.figure.get_size_inches())
        with_profiles = bool(self._rows)
        self.profile_axes.set_visible(with_profiles)
        beside = width > 1.5 * height
        entries = self._entries()
        left, right = 0.72, _BAR_ROOM
        top = legend_height([text for _, text in entries], width - left - right)
        if with_profiles and beside:
            place_in_grid([self.axes, self.profile_axes], columns=2, left=left, right=0.16, bottom=0.52, top=top,
                          across=_BAR_ROOM + 0.78)  # fmt: skip
        elif with_profiles:
            place_in_grid([self.axes, self.profile_axes], columns=1, left=left, right=right, bottom=0.52, top=top,
                          down=0.58, heights=(1.9, 1.0))  # fmt: skip
        else:
            place_in_grid([self.axes], columns=1, left=left, right=right, bottom=0.52, top=top)
        at = self.axes.get_position(original=True)
        self._bar_axes.set_position((at.x1 + 0.12 / width, at.y0, _BAR / width, at.height))
        if self._survey is not None:
            self._fit_limits(self._survey)
            self._draw_field()
            self._draw_profiles()
        for which, text in (("x", "$x$"), ("y", "$y$")):
            label_axis(self.axes, which, text, "m", ticks=6)  # type: ignore[arg-type]
        label_axis(self.profile_axes, "x", "radius about the centre $r$", "m", ticks=7)
        label_axis(self.profile_axes, "y", "swirl $v_θ$", "m/s", ticks=5)
        label_axis(self._bar_axes, "y", "velocity in the plane", "m/s", ticks=6)
        for axes in (self.axes, self.profile_axes):
            hang_label(axes)
        show_legend(self.figure, entries, self._theme, left=left, right=right)

    # Inside ---------------------------------------------------------------------------------------------------------

    _by_hand: Vortex | None = None

    def _line(self, axes: Any, **looks: Any) -> Line2D:
        line: Line2D = axes.plot([], [], **{"linestyle": "none", **looks})[0]
        return line

    def _fit_limits(self, survey: Survey) -> None:
        width, height = (float(size) for size in self.figure.get_size_inches())
        box = self.axes.get_position(original=True)
        inches = np.array([box.width * width, box.height * height])
        low, high = np.array([survey.x.min(), survey.y.min()]), np.array([survey.x.max(), survey.y.max()])
        scale = float(np.max(1.1 * (high - low) / inches))  # one for both axes, so that circles are round
        middle, half = 0.5 * (low + high), 0.5 * scale * inches
        self.axes.set_xlim(middle[0] - half[0], middle[0] + half[0])
        self.axes.set_ylim(middle[1] - half[1], middle[1] + half[1])
        _, _, u, v = _vectors(survey)
        self._sizes.vmax = float(np.hypot(u, v).max(initial=0.0)) or 1.0
        self._bar.update_normal(self._bar.mappable)
        if self._rows:
            radius, swirl = _swirl_about(survey, self._rows[0])
            self.profile_axes.set_xlim(0.0, 1.03 * float(radius.max()))
            self.profile_axes.set_ylim(*limits_around(np.append(swirl, 0.0)))

    def _draw_field(self) -> None:
        survey = self._survey
        if survey is None:
            return
        x, y, u, v = _vectors(survey)
        step = -(-x.size // _MOST_ARROWS)
        x, y, u, v = x[::step], y[::step], u[::step], v[::step]
        if self._arrows is not None:
            self._arrows.remove()
        spacing = np.sqrt(max(np.ptp(x), 1e-12) * max(np.ptp(y), 1e-12) / max(x.size, 1))
        longest = self._sizes.vmax or 1.0
        self._arrows = self.axes.quiver(
            x, y, u, v, np.hypot(u, v), cmap=self._map, norm=self._sizes, angles="xy", scale_units="xy",
            scale=longest / (1.6 * spacing) if spacing > 0.0 else None, width=0.0032, pivot="mid", zorder=3.0,
        )  # fmt: skip
        aside = np.array(sorted(survey.set_aside), dtype=int)
        self._aside.set_data(survey.x[aside], survey.y[aside])
        self.points.set_data(survey.x, survey.y)
        marked = self._by_hand or (self._rows[0].fit.vortex if self._rows else None)
        if marked is None:
            self._centre.set_data([], [])
            self._circle.set_data([], [])
            return
        angle = np.linspace(0.0, 2.0 * np.pi, 121)
        self._centre.set_data([marked.centre[0]], [marked.centre[1]])
        self._circle.set_data(
            marked.centre[0] + marked.peak_radius * np.cos(angle), marked.centre[1] + marked.peak_radius * np.sin(angle)
        )

    def _draw_profiles(self) -> None:
        survey = self._survey
        for line in [self._swirl, *self._curves]:
            line.set_data([], [])
        if survey is None or not self._rows:
            return
        radius, swirl = _swirl_about(survey, self._rows[0])
        self._swirl.set_data(radius, swirl)
        for line, row in zip(self._curves, self._rows, strict=False):
            vortex = row.fit.vortex
            core = vortex.peak_radius * np.linspace(0.0, 2.0, 80)
            shown = np.unique(np.concatenate([np.linspace(0.0, radius.max() * 1.03, 200), core]))
            number = model_number(row.model.key)
            line.set(
                data=(shown, vortex.swirl(shown)),
                color=self._theme.colour(number),
                linestyle=line_style(number),
                linewidth=1.1 if row.rejected else LINE_WIDTH,
                alpha=0.7 if row.rejected else 1.0,
            )

    def _entries(self) -> list[tuple[Any, str]]:
        if self._survey is None:
            return []
        entries: list[tuple[Any, str]] = []
        if self._survey.set_aside:
            entries.append((self._aside, f"set aside ({len(self._survey.set_aside)})"))
        if self._by_hand is not None or self._rows:
            entries.append(((self._centre, self._circle), "centre, radius of the peak"))
        if self._rows:
            entries.append((self._swirl, "samples"))
        for line, row in zip(self._curves, self._rows, strict=False):
            entries.append((line, f"{row.model.name} (rejected)" if row.rejected else row.model.name))
        return entries


def _seen_map(name: str) -> Colormap:
    """A colour map without the end that vanishes into the paper."""
    from matplotlib import colormaps
    from matplotlib.colors import ListedColormap

    return ListedColormap(colormaps[name](np.linspace(0.18, 1.0, 256)))


def _vectors(survey: Survey) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Stations in use and the velocity in the plane at each; a component that was not measured is zero."""
    used = survey.in_plane
    place = np.column_stack([survey.x[used], survey.y[used]])
    stations, group = np.unique(place, axis=0, return_inverse=True)
    group = np.ravel(group)
    components = []
    for axis in (0, 1):
        weight = np.abs(survey.direction[used, axis])
        total = np.bincount(group, weights=survey.velocity[used] * survey.direction[used, axis])
        components.append(total / np.maximum(np.bincount(group, weights=weight), 1e-12))
    return stations[:, 0], stations[:, 1], components[0], components[1]


def _swirl_about(survey: Survey, row: Ranked) -> tuple[FloatArray, FloatArray]:
    """Radius and swirl of the stations about the centre of a fit, its background taken off."""
    x, y, u, v = _vectors(survey)
    fit = row.fit
    part = {name: fit.value(name) for name in fit.names if name.startswith(("background", "gradient"))}
    u = u - part.get("background_x", 0.0) - part.get("gradient_xx", 0.0) * x - part.get("gradient_xy", 0.0) * y
    v = v - part.get("background_y", 0.0) - part.get("gradient_yx", 0.0) * x - part.get("gradient_yy", 0.0) * y
    dx, dy = x - fit.vortex.centre[0], y - fit.vortex.centre[1]
    radius = np.hypot(dx, dy)
    return radius, (v * dx - u * dy) / np.maximum(radius, 1e-12)
