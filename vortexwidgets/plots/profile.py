"""Profiles of up to four vortices: swirl, vorticity and pressure drop against the distance from the axis."""

from __future__ import annotations

import math
from collections.abc import Sequence
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
    place_in_grid,
    show_legend,
    theme_named,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.lines import Line2D

    from vortexwidgets.models.vortex import Vortex

FloatArray = npt.NDArray[np.float64]

MOST_VORTICES = 4
_REACH = 5.0  # peak radii shown
_POINTS = 240
_DEFAULT_REACH = 0.1  # m, where no vortex has a length of its own

_ROWS = (
    ("swirl", "$v_θ$", "m/s"),
    ("vorticity", "$ω$", "1/s"),
    ("pressure drop", "$p_∞ − p$", "Pa"),
)


class ProfilePlot:
    """Swirl, vorticity and pressure drop of up to four vortices, redrawn in place.

    The axes stand side by side in a wide figure and one above the other in a tall one. The peak of the swirl is marked.

    Parameters
    ----------
    figure : Figure
        Empty; it belongs to the caller.
    theme : {"light", "dark"}
        Colours.

    Attributes
    ----------
    swirl, vorticity, pressure_drop : Axes
    """

    def __init__(self, figure: Figure, *, theme: ThemeName = "light") -> None:
        self.figure = figure
        self._theme = theme_named(theme)
        figure.set_facecolor(self._theme.background)
        self.swirl, self.vorticity, self.pressure_drop = (figure.add_subplot(3, 1, 1 + i) for i in range(3))
        self._lines: list[list[Line2D]] = []
        self._peaks: list[Line2D] = []
        for axes in self._axes:
            dress(axes, self._theme)
            self._lines.append([self._line(axes, number) for number in range(MOST_VORTICES)])
        for number in range(MOST_VORTICES):
            (peak,) = self.swirl.plot([], [], "o", markersize=6.0, color=self._theme.colour(number))
            peak.set_markeredgecolor(self._theme.background)
            self._peaks.append(peak)
        self._vortices: tuple[Vortex, ...] = ()
        self.settle()

    @property
    def artists(self) -> list[Line2D]:
        """What moves with the vortices."""
        return [line for lines in self._lines for line in lines] + self._peaks

    def update(self, vortices: Sequence[Vortex], density: float) -> None:
        """Show other vortices within the limits of now; `settle` fits the limits to them.

        Parameters
        ----------
        vortices : sequence of Vortex
            At most four.
        density : float
            Density of the fluid. [kg/m³]

        Raises
        ------
        ValueError
            If there are more than four vortices.
        """
        if len(vortices) > MOST_VORTICES:
            raise ValueError(
                f"A profile plot shows at most {MOST_VORTICES} vortices, got {len(vortices)}; choose some of them."
            )
        first = not self._vortices
        self._vortices, self._density = tuple(vortices), density
        if first:
            self.swirl.set_xlim(0.0, self._reach())
        self._draw_curves()

    def settle(self) -> None:
        """Fit limits, ticks, legend and margins to what is shown now."""
        reach = self._reach()
        for axes in self._axes:
            axes.set_xlim(0.0, reach)
        self._draw_curves()
        names = [_name(vortex) for vortex in self._vortices]
        width, height = self.figure.get_size_inches()
        row = width > 1.5 * height
        left, right = 0.72 if row else 0.88, 0.16
        top = legend_height(names, width - left - right)
        between = " " if row else "\n"  # low axes have no room for a label in one line
        if row:
            place_in_grid(self._axes, columns=3, left=left, right=right, bottom=0.52, top=top, across=0.82)
        else:
            place_in_grid(self._axes, columns=1, left=left, right=right, bottom=0.52, top=top, down=0.2)
        for (name, symbol, unit), axes, lines in zip(_ROWS, self._axes, self._lines, strict=True):
            axes.set_ylim(*limits_around(np.append(self._within_sight(lines), 0.0)))
            label_axis(axes, "y", f"{name}{between}{symbol}", unit, ticks=6 if row else 4)
            label_axis(axes, "x", "radius $r$", "m", ticks=6 if row else 8)
            bottom = row or axes is self.pressure_drop
            axes.tick_params(labelbottom=bottom)
            axes.xaxis.label.set_visible(bottom)
            hang_label(axes)
        handles = [(self._lines[0][number], name) for number, name in enumerate(names)]
        show_legend(self.figure, handles, self._theme, left=left, right=right)

    # Inside ---------------------------------------------------------------------------------------------------------

    @property
    def _axes(self) -> tuple[Axes, Axes, Axes]:
        return self.swirl, self.vorticity, self.pressure_drop

    def _line(self, axes: Axes, number: int) -> Line2D:
        (line,) = axes.plot(
            [], [], color=self._theme.colour(number), linestyle=line_style(number), linewidth=LINE_WIDTH
        )
        return line

    def _draw_curves(self) -> None:
        reach = self.swirl.get_xlim()[1]
        for number in range(MOST_VORTICES):
            lines = [lines[number] for lines in self._lines]
            if number >= len(self._vortices):
                for line in [*lines, self._peaks[number]]:
                    line.set_data([], [])
                continue
            vortex = self._vortices[number]
            radius = _radii(vortex, reach)
            curves = (vortex.swirl(radius), vortex.vorticity(radius), _drop(vortex, radius, self._density))
            for line, curve in zip(lines, curves, strict=True):
                line.set_data(radius, np.where(np.isfinite(curve), curve, np.nan))
            at, size = float(vortex.peak_radius), float(vortex.peak_swirl)
            marked = math.isfinite(at) and math.isfinite(size) and at > 0.0
            self._peaks[number].set_data([at] if marked else [], [size] if marked else [])

    def _reach(self) -> float:
        lengths = [_length(vortex) for vortex in self._vortices]
        return _REACH * max((length for length in lengths if length > 0.0), default=_DEFAULT_REACH / _REACH)

    def _within_sight(self, lines: Sequence[Line2D]) -> FloatArray:
        """The curves without those that run off at the axis; with what is left of these where there are no others."""
        regular, singular = [np.empty(0)], [np.empty(0)]
        for line in lines[: len(self._vortices)]:
            radius, curve = (np.asarray(data, dtype=float) for data in line.get_data())
            if np.isfinite(curve[0]):
                regular.append(curve)
            else:
                singular.append(curve[radius >= 0.08 * self.swirl.get_xlim()[1]])
        return np.concatenate(regular if len(regular) > 1 else singular)


def _length(vortex: Vortex) -> float:
    """Length by which the radius is scaled; 0 where the vortex has none. [m]"""
    for length in (vortex.peak_radius, vortex.core_radius):
        if length is not None and math.isfinite(length) and length > 0.0:
            return float(length)
    return 0.0


def _radii(vortex: Vortex, reach: float) -> FloatArray:
    """Radii at which a curve looks smooth: even ones, and closer ones about the core."""
    even = np.linspace(0.0, reach, _POINTS)
    length = _length(vortex)
    if not 0.0 < length < reach:
        return even
    core = length * np.concatenate([np.linspace(0.0, 2.0, 80), [1.0 - 1e-6, 1.0 + 1e-6]])
    return np.unique(np.concatenate([even, core]))


def _drop(vortex: Vortex, radius: FloatArray, density: float) -> FloatArray:
    return np.asarray(vortex.pressure_drop(radius, density=density), dtype=float)


def _name(vortex: Vortex) -> str:
    shape: dict[str, Any] = dict(vortex.shape)
    symbols = {parameter.name: parameter.symbol for parameter in vortex.model.shape}
    values = ", ".join(f"${symbols[name]}$ = {value:.3g}" for name, value in shape.items())
    return f"{vortex.model.name}, {values}" if values else vortex.model.name
