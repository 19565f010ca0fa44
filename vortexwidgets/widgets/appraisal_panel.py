"""The whole job."""

from __future__ import annotations

import json
from typing import Any

import ipywidgets
import traitlets

from vortexwidgets.appraisal import Appraisal, appraise
from vortexwidgets.survey.survey import Survey
from vortexwidgets.widgets.appraisal_page import appraisal_pages
from vortexwidgets.widgets.canvas import FrontEnd, Theme
from vortexwidgets.widgets.facts_controls import FactsControls
from vortexwidgets.widgets.job_text import parameters_of, python_of_job, with_parameters
from vortexwidgets.widgets.model_choice import ModelChoice
from vortexwidgets.widgets.panel import Panel, ParametersText, PythonLine, button, buttons, card, columns, folded
from vortexwidgets.widgets.record_controls import RecordControls
from vortexwidgets.widgets.state import JobState, VortexState
from vortexwidgets.widgets.survey_figure import SurveyFigure
from vortexwidgets.widgets.survey_panel import PointsControls
from vortexwidgets.widgets.survey_source import SurveySource
from vortexwidgets.widgets.vortex_controls import VortexControls, vortex_like


class AppraisalPanel(Panel):
    """The whole job in order: survey, facts, models, pressure on the axis, consequences, record.

    Parameters
    ----------
    survey : Survey, optional
        The survey to begin with, which is appraised at once; without one a file is read in the panel.
    theme, front_end
        As in LiveFigure.

    Attributes
    ----------
    hand : VortexState
        The vortex that is turned by hand for comparison; it begins as the best fit.
    """

    def __init__(self, survey: Survey | None = None, *, theme: Theme = "auto", front_end: FrontEnd = "auto") -> None:
        state = JobState(survey=survey)
        self.hand = VortexState(vortex=vortex_like(None, "lamb-oseen"))
        self.source, self.facts, self.points = SurveySource(state), FactsControls(state), PointsControls(state)
        self.models, self.record = ModelChoice(state), RecordControls(state)
        self.hand_controls = VortexControls(self.hand)
        self.pages = {name: ipywidgets.HTML() for name in ("answer", "survey", "models", "core", "consequences")}
        self.lines = {name: PythonLine() for name in ("survey", "facts", "models", "core", "consequences")}
        self.text = ParametersText(self.save_parameters, state.reported(self.load_parameters))
        figure = SurveyFigure(state, self.hand, theme=theme, front_end=front_end)
        super().__init__(state, "From a survey to the pressure on the axis", figure, ())
        figure.on_pick(state.reported(self.points.toggle))
        self.children += self._content()
        traitlets.dlink((self.hand, "error"), (state, "error"))
        state.observe(state.showing(self._show), ["survey", "models", "appraisal"])
        self._show()
        if survey is not None:
            state.reported(self.appraise)()

    @property
    def survey(self) -> Survey | None:
        """The survey, with its facts and its points in and out; set it to show another."""
        shown: Survey | None = self.state.survey
        return shown

    @survey.setter
    def survey(self, survey: Survey | None) -> None:
        self.state.survey = survey

    @property
    def appraisal(self) -> Appraisal | None:
        """The appraisal, None before it was made and after an input has changed."""
        shown: Appraisal | None = self.state.appraisal
        return shown

    @property
    def python(self) -> str:
        """The Python that does the same job."""
        return "\n".join([*self._python().values(), self.record.python])

    def appraise(self) -> None:
        """Take the survey to the core pressure and what follows from it."""
        if self.survey is None:
            raise ValueError("There is no survey yet; read one first.")
        with self.state.working("Fitting and ranking the models …"):
            self.state.appraisal = appraise(self.survey, models=self.state.models or None)
        self.hand.vortex = self.state.appraisal.core.vortex

    def reset(self) -> None:
        """Go back to the survey as it was given or read, and to all models."""
        self.state.models, self.state.survey = (), self.source.start

    def save_parameters(self) -> str:
        """Return facts, points set aside and models as JSON text."""
        return json.dumps(parameters_of(self.survey, self.state.models))

    def load_parameters(self, text: str) -> None:
        """Give the survey the facts, the points and the models that `save_parameters` wrote.

        Raises
        ------
        ValueError
            If there is no survey, or the text is not what `save_parameters` writes.
        """
        self.state.survey, self.state.models = with_parameters(text, self.survey, tuple(self.models.boxes))

    def _python(self) -> dict[str, str]:
        return python_of_job(self.source.python, self.source.start, self.survey, self.state.models)

    def _content(self) -> tuple[Any, ...]:
        run = button("Appraise", self.state.reported(self.appraise), tooltip="vx.appraise(survey)", primary=True)
        freeze = button("Freeze picture", self.show_frozen, tooltip="Keep the picture in the notebook: panel.freeze()")
        reset = button("Reset", self.reset, tooltip="Back to the survey as it was read: panel.reset()")
        hand = card("A vortex by hand, to compare", self.hand_controls)
        points = folded("Points in and out", self.points)
        pages, lines = self.pages, self.lines
        return (
            pages["answer"],
            card("Survey", self.source, pages["survey"], lines["survey"], number=1),
            card("Facts", self.facts, points, lines["facts"], number=2),
            card(
                "Models",
                columns([self.models, buttons(run, reset, freeze), hand], [self.figure, pages["models"]]),
                lines["models"],
                number=3,
            ),
            card("Pressure on the axis", pages["core"], lines["core"], number=4),
            card("Consequences", pages["consequences"], lines["consequences"], number=5),
            card("Record", self.record, folded("Parameters as text, to keep or to paste", self.text), number=6),
        )

    def _show(self) -> None:
        for name, page in appraisal_pages(self.survey, self.appraisal).items():
            self.pages[name].value = page
        for name, code in self._python().items():
            self.lines[name].show(code)
