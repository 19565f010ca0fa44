"""The picture of a survey with the models fitted to it and a vortex turned by hand."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import ipywidgets

from vortexwidgets.plots.plane import PlanePlot
from vortexwidgets.plots.survey import SurveyPlot
from vortexwidgets.widgets.canvas import FrontEnd, LiveFigure, Theme
from vortexwidgets.widgets.panel import FIGURE_WIDTH
from vortexwidgets.widgets.state import JobState, SurveyState, VortexState

if TYPE_CHECKING:
    from IPython.display import Image

    from vortexwidgets.survey.survey import Survey


class SurveyFigure(ipywidgets.Box):
    """A figure that suits the geometry of the survey, changed when another kind of survey is read.

    Parameters
    ----------
    state : SurveyState or JobState
        Its survey is shown, with the ranking of its appraisal when it has one.
    hand : VortexState, optional
        A vortex to show for comparison.
    theme, front_end
        As in LiveFigure.

    Attributes
    ----------
    live : LiveFigure or None
        None as long as there is no survey.
    """

    def __init__(
        self,
        state: SurveyState,
        hand: VortexState | None = None,
        *,
        theme: Theme = "auto",
        front_end: FrontEnd = "auto",
    ) -> None:
        super().__init__()
        self.add_class("vx-survey-figure")
        self.live: LiveFigure[Any] | None = None
        self._state, self._hand = state, hand
        self._options: dict[str, Any] = {"theme": theme, "front_end": front_end, "size": (FIGURE_WIDTH, 500)}
        self._picked: list[Callable[[int], object]] = []
        names = ["survey", "appraisal"] if isinstance(state, JobState) else ["survey"]
        state.observe(state.showing(self._show), names)
        if hand is not None:
            hand.observe(state.showing(self._show), "vortex")
        self._show()

    @property
    def plot(self) -> Any:
        """The plot, None as long as there is no survey."""
        return None if self.live is None else self.live.plot

    def on_pick(self, action: Callable[[int], object]) -> None:
        """Call `action` with the index of each sample that is clicked."""
        self._picked.append(action)

    def png(self, *, dots_per_inch: int = 150) -> bytes:
        """Return the figure as it is now as a PNG picture."""
        return self._shown().png(dots_per_inch=dots_per_inch)

    def freeze(self) -> Image:
        """Return a picture that stays in the saved notebook when there is no kernel any more."""
        return self._shown().freeze()

    def _shown(self) -> LiveFigure[Any]:
        if self.live is None:
            raise ValueError("There is no picture yet; read a survey first.")
        return self.live

    def _show(self) -> None:
        survey = self._state.survey
        if survey is None:
            self._replace(None)
            return
        live = self._figure_for(survey)
        appraisal = getattr(self._state, "appraisal", None)
        if appraisal is None:
            live.plot.update(survey)
        else:
            # By hand is worth comparing only where there is a fit to compare it with.
            by_hand = None if self._hand is None else self._hand.vortex
            live.plot.update(appraisal.survey, appraisal.ranking, instrument=appraisal.instrument, vortex=by_hand)
        live.moved()

    def _figure_for(self, survey: Survey) -> LiveFigure[Any]:
        kind = PlanePlot if survey.geometry == "plane" else SurveyPlot
        if self.live is None or not isinstance(self.live.plot, kind):
            live = LiveFigure(kind, **self._options)
            live.on_pick(lambda index: [action(index) for action in self._picked])
            self._replace(live)
            return live
        return self.live

    def _replace(self, live: LiveFigure[Any] | None) -> None:
        old, self.live = self.live, live
        self.children: tuple[Any, ...] = () if live is None else (live,)
        if old is not None and old is not live:
            old.close()
