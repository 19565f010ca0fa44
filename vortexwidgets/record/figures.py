"""Figures of the record, each as a picture for light and for dark pages with the words that stand for it."""

from __future__ import annotations

import base64
import dataclasses
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from vortexwidgets.formatting import format_estimate, format_number, percent
from vortexwidgets.record.texts import value_text

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from vortexwidgets.plots.style import Theme

_WIDTH = 6.6  # inch, at 160 dots per inch three pixels of the picture for two of the page


@dataclasses.dataclass(frozen=True)
class FigureData:
    """A picture for light and for dark pages, with the words that stand for it."""

    light: str
    dark: str
    alt: str
    caption: str
    width: int
    height: int


def figures(appraisal: Any) -> dict[str, FigureData | None]:
    """The figures of the sections, by name."""
    from vortexwidgets.plots.plane import PlanePlot
    from vortexwidgets.plots.profile import MOST_VORTICES, ProfilePlot
    from vortexwidgets.plots.result import budget_plot, drop_plot, ranking_plot
    from vortexwidgets.plots.survey import SurveyPlot

    survey, models = appraisal.survey, appraisal.models
    best = models[0].names[0]
    plane = survey.geometry == "plane"

    # A core that the survey leaves open stands at its limit, whose profile nobody measured.
    supported = zip((row for row in models if not row.rejected), appraisal.core.supported, strict=False)
    profiles = [vortex for row, vortex in supported if row.drop.bound is None][:MOST_VORTICES]

    def draw_survey(figure: Figure, theme: Theme) -> None:
        plot = PlanePlot(figure, theme=theme.name) if plane else SurveyPlot(figure, theme=theme.name)
        plot.update(survey, appraisal.ranking, instrument=appraisal.settings.instrument)
        plot.settle()

    def draw_profiles(figure: Figure, theme: Theme) -> None:
        plot = ProfilePlot(figure, theme=theme.name)
        plot.update(profiles, appraisal.fluid.density.value)
        plot.settle()

    def draw_drops(figure: Figure, _: Theme) -> None:
        drop_plot(_lone(figure, left=1.9), appraisal)

    def draw_weights(figure: Figure, _: Theme) -> None:
        ranking_plot(_lone(figure, left=1.9), models)

    def draw_budget(figure: Figure, _: Theme) -> None:
        budget_plot(_lone(figure, left=1.9), appraisal.core_pressure_drop)

    drop = format_estimate(appraisal.core_pressure_drop)
    found: dict[str, FigureData | None] = {
        "survey": _figure(
            draw_survey,
            (_WIDTH, 7.0 if plane else 4.6),
            alt=f"Velocity vectors in the plane, and the swirl about the centre with curves of {len(models)} models."
            if plane
            else f"Measured velocities with error bars and the curves of {len(models)} models; the best is {best}. "
            "Below, what the best model leaves over.",
            caption="The survey and the models. Rejected models are thin; samples set aside are crosses.",
        ),
        "profiles": None,
        "weights": _figure(
            draw_weights,
            (_WIDTH, 0.75 + 0.3 * len(models)),
            alt="Weight of each model: "
            + ", ".join(
                f"{row.names[0]} {percent(row.weight)}{' (rejected)' if row.rejected else ''}" for row in models
            ),
            caption="AICc weights. Hatched: rejected by the data.",
        ),
        "drops": _figure(
            draw_drops,
            (_WIDTH, 0.75 + 0.3 * (len(models) + 2)),
            alt=f"Core pressure drop of each model and of the data alone, with 95 % intervals; the result is {drop}.",
            caption="Core pressure drop by model, from the data alone, and the result. Shaded: models not rejected.",
        ),
        "budget": None,
    }
    if profiles:
        found["profiles"] = _figure(
            draw_profiles,
            (_WIDTH, 5.8),
            alt="Swirl, vorticity and pressure drop against the radius, for the models that are not rejected.",
            caption="Profiles of the models that are not rejected, without what the instrument did.",
        )
    parts = [part for part in appraisal.core_pressure_drop.budget if part.uncertainty > 0.0]
    if parts:
        found["budget"] = _figure(
            draw_budget,
            (_WIDTH, 0.75 + 0.3 * (len(parts) + 1)),
            alt="What contributes to the standard uncertainty of the drop: "
            + ", ".join(f"{part.name} {format_number(part.uncertainty, 'Pa', 3)}" for part in parts),
            caption="What contributes to the standard uncertainty of the core pressure drop.",
        )
    return found


def consequence_figure(item: Any) -> FigureData | None:
    """The plot of one consequence; None where it has nothing to show."""
    from vortexwidgets.consequences import draw

    if not item.curves:
        return None

    def draw_one(figure: Figure, _: Theme) -> None:
        axes = _lone(figure, left=0.85, top=0.36)
        draw(axes, item)

    return _figure(
        draw_one,
        (_WIDTH, 3.3),
        alt=f"{item.name}: {value_text(item.estimate)}; {item.criterion.text}: {item.verdict}.",
        caption=item.question,
    )


def _lone(figure: Figure, *, left: float, top: float = 0.15) -> Any:
    from vortexwidgets.plots.result import fill

    axes = figure.add_subplot()
    fill(axes, left=left, top=top)
    return axes


def _figure(
    draw: Callable[[Figure, Theme], object], size: tuple[float, float], *, alt: str, caption: str
) -> FigureData:
    from vortexwidgets.plots.result import picture

    light, dark = (
        "data:image/png;base64," + base64.b64encode(picture(draw, size=size, theme=theme)).decode("ascii")
        for theme in ("light", "dark")
    )
    return FigureData(light, dark, alt, caption, round(size[0] * 100), round(size[1] * 100))
