"""Figures of the record: the core pressure drop of every model, its budget, the weights, and pictures of figures."""

from __future__ import annotations

import io
import math
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from vortexwidgets.formatting import percent
from vortexwidgets.plots.style import (
    SMALL,
    Theme,
    dress,
    label_axis,
    model_number,
    theme_in_use,
    use_theme,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from vortexwidgets.uncertainty import Contribution, Estimate

_COLOURS = 200  # of a picture; line art needs no more, and the file is a third


def drop_plot(axes: Axes, appraisal: Any) -> None:
    """Draw the core pressure drop of each model with its 95 % interval, the weighted one, and that of the data alone.

    Parameters
    ----------
    axes : Axes
    appraisal : Appraisal
    """
    theme = theme_in_use()
    rows: list[tuple[str, Estimate, str, str, bool]] = []
    for row in appraisal.models:
        name = row.names[0] + (" (rejected)" if row.rejected else "")
        rows.append((name, row.drop, theme.colour(model_number(row.key)), "o", not row.rejected))
    rows.append(("data alone", appraisal.data_drop.estimate, theme.quiet, "s", False))
    rows.append(("result", appraisal.core_pressure_drop, theme.text, "D", True))
    dress(axes, theme)
    for place, (_, estimate, colour, marker, filled) in enumerate(rows):
        if math.isnan(estimate.value):
            continue
        low, high = estimate.interval(0.95)
        shown_low = low if math.isfinite(low) else estimate.value
        shown_high = high if math.isfinite(high) else estimate.value
        axes.plot([shown_low, shown_high], [place, place], color=colour, linewidth=2.2, solid_capstyle="butt")
        face = colour if filled else theme.background
        axes.plot([estimate.value], [place], marker, color=colour, markerfacecolor=face, markersize=6.5)
    low, high = appraisal.envelope
    if math.isfinite(high) and high > low:
        axes.axvspan(low, high, color=theme.grid, alpha=0.6, linewidth=0.0, zorder=0.5)
    axes.set_yticks(range(len(rows)), [name for name, *_ in rows])
    axes.set_ylim(len(rows) - 0.4, -0.6)
    _widen(axes)
    for place, (_, estimate, colour, *_) in enumerate(rows):
        if estimate.bound is not None and math.isfinite(estimate.value):
            edge = axes.get_xlim()[1 if estimate.bound == "lower" else 0]
            looks = {"arrowstyle": "-|>", "color": colour, "linewidth": 2.2, "shrinkA": 0.0, "shrinkB": 0.0}
            axes.annotate("", (edge, place), (estimate.value, place), arrowprops=looks)
    label_axis(axes, "x", "core pressure drop, 95 % interval", "Pa", ticks=6)


def budget_plot(axes: Axes, estimate: Estimate) -> None:
    """Draw which input contributes how much to the standard uncertainty of an estimate.

    Parameters
    ----------
    axes : Axes
    estimate : Estimate
        With a budget.
    """
    theme = theme_in_use()
    parts = sorted_budget(estimate.budget)
    dress(axes, theme)
    names = [part.name for part in parts] + ["together"]
    sizes = [part.uncertainty for part in parts] + [estimate.uncertainty]
    colours = [theme.colour(0)] * len(parts) + [theme.text]
    axes.barh(range(len(names)), sizes, color=colours, height=0.62)
    axes.set_yticks(range(len(names)), names)
    axes.set_ylim(len(names) - 0.4, -0.6)
    axes.set_xlim(0.0, 1.05 * max(max(sizes), 1e-300))
    label_axis(axes, "x", "standard uncertainty contributed", _unit(estimate), ticks=6)


def ranking_plot(axes: Axes, models: Sequence[Any]) -> None:
    """Draw the weight of each model, rejected ones hatched.

    Parameters
    ----------
    axes : Axes
    models : sequence of ModelRow or Ranked
        Best first.
    """
    theme = theme_in_use()
    dress(axes, theme)
    names = [row.names[0] + (" (rejected)" if row.rejected else "") for row in models]
    for place, row in enumerate(models):
        key = row.key if hasattr(row, "key") else row.model.key
        colour = theme.colour(model_number(key))
        axes.barh(
            [place],
            [row.weight],
            height=0.62,
            facecolor="none" if row.rejected else colour,
            edgecolor=colour,
            hatch="////" if row.rejected else None,
        )
        axes.text(row.weight + 0.012, place, percent(row.weight), va="center", fontsize=SMALL, color=theme.text)
    axes.set_yticks(range(len(names)), names)
    axes.set_ylim(len(names) - 0.4, -0.6)
    axes.set_xlim(0.0, 1.14)
    label_axis(axes, "x", "AICc weight", "", ticks=5)


def sorted_budget(budget: Sequence[Contribution]) -> list[Contribution]:
    """Contributions that contribute, largest first."""
    return sorted((part for part in budget if part.uncertainty > 0.0), key=lambda part: -part.uncertainty)


# Pictures -------------------------------------------------------------------------------------------------------------


def picture(
    draw: Callable[[Figure, Theme], object], *, size: tuple[float, float], theme: str, dots_per_inch: int = 160
) -> bytes:
    """Draw a figure and return it as a small PNG picture.

    Parameters
    ----------
    draw : callable
        Called with an empty figure and the theme.
    size : (float, float)
        Width and height. [inch]
    theme : {"light", "dark"}
    dots_per_inch : int

    Returns
    -------
    bytes
    """
    from matplotlib import rc_context
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure
    from PIL import Image

    with use_theme(theme) as colours, rc_context(_rc(colours)):
        figure = Figure(figsize=size, dpi=dots_per_inch)
        canvas: Any = FigureCanvasAgg(figure)  # untyped in Matplotlib
        draw(figure, colours)
        canvas.draw()
        pixels = np.asarray(canvas.buffer_rgba())
        figure.clear()
    buffer = io.BytesIO()
    reduced = Image.fromarray(pixels).convert("RGB").quantize(_COLOURS, dither=Image.Dither.NONE)
    reduced.save(buffer, format="png", optimize=True)
    return buffer.getvalue()


def fill(axes: Axes, *, left: float, bottom: float = 0.52, right: float = 0.2, top: float = 0.15) -> None:
    """Let axes fill their figure up to margins. [inch]"""
    width, height = axes.figure.get_size_inches()  # type: ignore[union-attr]
    axes.set_position((left / width, bottom / height, 1.0 - (left + right) / width, 1.0 - (bottom + top) / height))


def _rc(theme: Theme) -> Any:
    """Colours for what is drawn without being told any."""
    from cycler import cycler

    return {
        "figure.facecolor": theme.background,
        "axes.facecolor": theme.background,
        "axes.edgecolor": theme.quiet,
        "axes.labelcolor": theme.text,
        "axes.titlecolor": theme.text,
        "axes.prop_cycle": cycler(color=theme.colours),
        "text.color": theme.text,
        "xtick.color": theme.text,
        "ytick.color": theme.text,
        "grid.color": theme.grid,
        "legend.facecolor": theme.background,
        "legend.edgecolor": theme.grid,
        "legend.labelcolor": theme.text,
    }


def _unit(estimate: Estimate) -> str:
    return str(estimate.unit)


def _widen(axes: Axes) -> None:
    axes.relim()
    low, high = axes.get_xlim()
    low = min(low, 0.0) if low < 0.35 * high else low
    axes.set_xlim(low, high + 0.08 * (high - low))
