"""How every figure looks: colours that colour-blind readers tell apart, axes in units for people, margins that fit."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from matplotlib.ticker import Formatter, MaxNLocator

from vortexwidgets.formatting import Scale, scale_for

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

ThemeName = Literal["light", "dark"]
LineStyle = str | tuple[float, tuple[float, ...]]

FONT_SIZE = 9.0  # points; 12.5 px at 100 dots per inch
SMALL = 8.0
LINE_WIDTH = 1.8

LINE_STYLES: tuple[LineStyle, ...] = (
    "-",
    (0.0, (6.0, 2.2)),
    (0.0, (6.0, 2.0, 1.2, 2.0)),
    (0.0, (1.4, 1.6)),
    (0.0, (11.0, 3.0)),
    (0.0, (6.0, 1.8, 1.2, 1.8, 1.2, 1.8)),
)
"""One per colour, so that a curve is known without its colour."""


@dataclass(frozen=True)
class Theme:
    """Colours of a figure.

    Attributes
    ----------
    name : {"light", "dark"}
    background, text, quiet, grid : str
        Paper, letters and points, secondary letters, rules.
    warning : str
        What was set aside, or speaks against something.
    colours : tuple of str
        Curves, in the order in which they are used everywhere.
    """

    name: ThemeName
    background: str
    text: str
    quiet: str
    grid: str
    warning: str
    colours: tuple[str, ...]

    def colour(self, number: int) -> str:
        """Colour of the curve with this number."""
        return self.colours[number % len(self.colours)]


# Searched for the largest smallest distance between two, in normal and in simulated protan, deutan and tritan
# vision (tests/test_plots.py), at a contrast of at least 3 on the paper.
THEMES: Mapping[str, Theme] = {
    "light": Theme(
        name="light",
        background="#ffffff",
        text="#1b1f24",
        quiet="#5a626c",
        grid="#dfe3e8",
        warning="#b3261e",
        colours=("#1203a4", "#ef557a", "#2a8adb", "#75005c", "#a88b00", "#372700"),
    ),
    "dark": Theme(
        name="dark",
        background="#15181d",
        text="#e8eaed",
        quiet="#a4abb5",
        grid="#333941",
        warning="#ff8a80",
        colours=("#7995ff", "#ce597d", "#7dff9c", "#d9ecff", "#f4d828", "#7b8708"),
    ),
}


def theme_named(name: str) -> Theme:
    """Look a theme up.

    Raises
    ------
    ValueError
        If there is none of that name.
    """
    if name not in THEMES:
        raise ValueError(f"theme must be one of {', '.join(THEMES)}, got {name!r}.")
    return THEMES[name]


def line_style(number: int) -> LineStyle:
    """Line style of the curve with this number."""
    return LINE_STYLES[number % len(LINE_STYLES)]


_in_use: ContextVar[str] = ContextVar("theme", default="light")


def theme_in_use() -> Theme:
    """Theme in which figures are drawn that are not told one: light, except inside `use_theme`."""
    return THEMES[_in_use.get()]


@contextmanager
def use_theme(name: str) -> Iterator[Theme]:
    """Draw in another theme what is drawn inside the `with`."""
    theme = theme_named(name)
    before = _in_use.set(name)
    try:
        yield theme
    finally:
        _in_use.reset(before)


# Axes in units for people ---------------------------------------------------------------------------------------------


class UnitTicks(MaxNLocator):
    """Ticks at round numbers of the unit shown, while the data stay in SI."""

    def __init__(self, scale: Scale, ticks: int) -> None:
        super().__init__(nbins=ticks, steps=[1, 2, 2.5, 5, 10])
        self._scale = scale

    def tick_values(self, vmin: float, vmax: float) -> Any:
        """Return tick positions in SI."""
        size, zero = self._scale.size, self._scale.zero
        return np.asarray(super().tick_values((vmin - zero) / size, (vmax - zero) / size)) * size + zero


class UnitLabels(Formatter):
    """Numbers of the unit shown, all with the digits that the spacing of the ticks needs."""

    def __init__(self, scale: Scale) -> None:
        super().__init__()
        self._scale = scale
        self._digits, self._power = 0, 0

    def set_locs(self, locs: Any) -> None:
        """Choose the digits for these ticks."""
        super().set_locs(locs)
        at = (np.asarray(locs, dtype=float) - self._scale.zero) / self._scale.size
        steps = np.diff(np.unique(at))
        step = float(steps.min()) if steps.size else float(np.abs(at).max(initial=1.0)) or 1.0
        largest = float(np.abs(at).max(initial=0.0))
        self._power = 0
        if largest >= 1e5 or 0.0 < largest < 1e-3:
            self._power = math.floor(math.log10(largest))
        scaled = step / 10.0**self._power
        digits = next((d for d in range(9) if abs(round(scaled, d) - scaled) <= 1e-6 * scaled), 3)
        self._digits = digits

    def __call__(self, x: float, pos: int | None = None) -> str:
        """Return one number as text."""
        value = (x - self._scale.zero) / self._scale.size / 10.0**self._power
        text = f"{value:.{self._digits}f}"
        return text.replace("-", "−") if float(text) else text.replace("-", "")

    def get_offset(self) -> str:
        """Return the power of ten that the numbers are multiplied by."""
        return f"×10{str(self._power).translate(_RAISED)}" if self._power else ""


_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def label_axis(axes: Axes, which: Literal["x", "y"], text: str, unit: str, *, ticks: int = 5) -> None:
    """Label an axis whose data are in SI with its text and a unit that suits its limits.

    Parameters
    ----------
    axes : Axes
    which : {"x", "y"}
    text : str
        What the axis shows.
    unit : str
        SI unit of the data, empty for a plain number.
    ticks : int
        About as many intervals.
    """
    axis = axes.xaxis if which == "x" else axes.yaxis
    limits = axes.get_xlim() if which == "x" else axes.get_ylim()
    scale = scale_for(unit, max(abs(limits[0]), abs(limits[1])))
    axis.set_major_locator(UnitTicks(scale, ticks))
    axis.set_major_formatter(UnitLabels(scale))
    axis.set_label_text(f"{text} [{scale.text}]" if scale.text else text)


def limits_around(values: Sequence[float] | np.ndarray[Any, Any], *, margin: float = 0.06) -> tuple[float, float]:
    """Limits that hold finite values with a margin, and zero where the values begin near it."""
    numbers = np.asarray(values, dtype=float).ravel()
    numbers = numbers[np.isfinite(numbers)]
    if not numbers.size:
        return 0.0, 1.0
    low, high = float(numbers.min()), float(numbers.max())
    span = high - low or abs(high) or 1.0
    lower, upper = low - margin * span, high + margin * span
    if 0.0 <= low < 0.3 * span:
        lower = -0.02 * span
    if -0.3 * span < high <= 0.0:
        upper = 0.02 * span
    return lower, upper


# Looks ----------------------------------------------------------------------------------------------------------------


def dress(axes: Axes, theme: Theme) -> None:
    """Give axes the look of the house."""
    axes.set_facecolor(theme.background)
    axes.set_axisbelow(True)
    axes.grid(visible=True, color=theme.grid, linewidth=0.7)
    for side, spine in axes.spines.items():
        spine.set_visible(side in ("left", "bottom"))
        spine.set_color(theme.quiet)
        spine.set_linewidth(0.8)
    axes.tick_params(colors=theme.text, labelsize=SMALL, length=3.0, width=0.8, color=theme.quiet)
    for axis in (axes.xaxis, axes.yaxis):
        axis.label.set_color(theme.text)
        axis.label.set_fontsize(FONT_SIZE)
        axis.get_offset_text().set_color(theme.quiet)
        axis.get_offset_text().set_fontsize(SMALL)


def place_in_grid(
    axes: Sequence[Axes],
    *,
    columns: int,
    left: float,
    right: float,
    bottom: float,
    top: float,
    across: float = 0.0,
    down: float = 0.0,
    heights: Sequence[float] = (),
) -> None:
    """Place axes in a grid whose margins and gaps are lengths, so that labels fit in a figure of any size.

    Parameters
    ----------
    axes : sequence of Axes
        Row by row.
    columns : int
    left, right, bottom, top, across, down : float
        Margins, and gaps between columns and between rows. [inch]
    heights : sequence of float
        Relative heights of the rows; equal by default.
    """
    figure: Figure = axes[0].figure  # type: ignore[assignment]
    width, height = figure.get_size_inches()
    rows = -(-len(axes) // columns)
    shares = np.asarray(heights or [1.0] * rows, dtype=float)
    shares = shares / shares.sum()
    wide = max(width - left - right - (columns - 1) * across, 0.2) / columns
    high = shares * max(height - bottom - top - (rows - 1) * down, 0.2)
    for number, item in enumerate(axes):
        row, column = divmod(number, columns)
        below = bottom + float(high[row + 1 :].sum()) + (rows - 1 - row) * down
        item.set_position(
            ((left + column * (wide + across)) / width, below / height, wide / width, float(high[row]) / height)
        )


def hang_label(axes: Axes, distance: float = 0.52) -> None:
    """Put the label of the y axis at a fixed distance from the axes, so that labels of neighbours line up. [inch]"""
    width = axes.get_position(original=True).width * float(axes.figure.get_size_inches()[0])  # type: ignore[union-attr]
    axes.yaxis.set_label_coords(-distance / max(width, 0.1), 0.5)


def legend_rows(texts: Sequence[str], room: float) -> int:
    """Rows that a legend needs in a width. [inch]"""
    if not texts:
        return 0
    rows = 1
    while rows < len(texts):
        columns = -(-len(texts) // rows)
        # Matplotlib fills column by column, and a column is as wide as its widest text.
        widest = [max(map(len, texts[first : first + rows])) for first in range(0, len(texts), rows)]
        if sum(widest) * _LETTER + columns * _HANDLE <= room:
            break
        rows += 1
    return rows


def legend_height(texts: Sequence[str], room: float) -> float:
    """Height that the legend takes above the axes in a width. [inch]"""
    rows = legend_rows(texts, room)
    return 0.10 + (0.10 + 0.185 * rows if rows else 0.0)


def show_legend(figure: Figure, entries: Sequence[tuple[Any, str]], theme: Theme, *, left: float, right: float) -> None:
    """Put a legend above the axes, in as few rows as fit; the old one goes.

    Parameters
    ----------
    figure : Figure
    entries : sequence of (artist or tuple of artists, str)
        What the legend shows, and its text.
    theme : Theme
    left, right : float
        Margins. [inch]
    """
    for old in list(figure.legends):
        old.remove()
    if not entries:
        return
    width, height = figure.get_size_inches()
    texts = [text for _, text in entries]
    rows = legend_rows(texts, width - left - right)
    legend = figure.legend(
        [artist for artist, _ in entries],
        texts,
        loc="upper left",
        bbox_to_anchor=(left / width, 1.0 - 0.09 / height),
        ncols=-(-len(texts) // rows),
        frameon=False,
        fontsize=FONT_SIZE,
        labelcolor=theme.text,
        borderaxespad=0.0,
        borderpad=0.0,
        handlelength=2.8,
        handletextpad=0.6,
        columnspacing=1.6,
        labelspacing=0.35,
    )
    for handle in legend.legend_handles:
        if handle is not None:
            handle.set_animated(False)


_LETTER, _HANDLE = 0.070, 0.62  # inch: a letter of the legend, and the handle with the gaps of one column


# One number for each profile, so that a model keeps its colour and line style whatever its rank.
_MODEL_NUMBERS = {"lamb-oseen": 0, "vatistas": 1, "kaufmann": 2, "rankine": 3, "taylor": 4}


def model_number(key: str) -> int:
    """Number of a model's colour and line style."""
    return _MODEL_NUMBERS.get(key, 5)
