"""A survey, its points in or out, its instrument."""

from __future__ import annotations

import html
import json
import re
from dataclasses import asdict, replace
from typing import Any

import ipywidgets

from vortexwidgets.survey.instrument import Instrument
from vortexwidgets.survey.survey import Survey
from vortexwidgets.widgets.canvas import FrontEnd, Theme
from vortexwidgets.widgets.controls import NumberControl, Scale, choice, text_field
from vortexwidgets.widgets.panel import Panel, ParametersText, PythonLine, button, buttons, card, columns, folded, text
from vortexwidgets.widgets.state import SurveyState
from vortexwidgets.widgets.survey_figure import SurveyFigure

BY_HAND = "set aside by hand"
_AVERAGING = (("along the traverse", "along"), ("across the traverse", "across"), ("over a square", "square"))


class SurveyPanel(Panel):
    """A survey whose points are put in or out by clicking them, and what its instrument did.

    Parameters
    ----------
    survey : Survey
        The survey to begin with; it is never changed, `panel.survey` is the new one.
    instrument : Instrument, optional
        The instrument to begin with; an ideal one by default.
    theme, front_end
        As in LiveFigure. Without ipympl's canvas points are named by number instead of clicked.
    """

    def __init__(
        self,
        survey: Survey,
        *,
        instrument: Instrument | None = None,
        theme: Theme = "auto",
        front_end: FrontEnd = "auto",
    ) -> None:
        state = SurveyState(survey=survey, instrument=instrument or Instrument())
        self._start = (survey, state.instrument)
        figure = SurveyFigure(state, theme=theme, front_end=front_end)
        self.points = PointsControls(state)
        self.instrument_controls = InstrumentControls(state)
        self.summary, self.python_line = text(str(survey)), PythonLine()
        self.text = ParametersText(self.save_parameters, state.reported(self.load_parameters))
        super().__init__(state, "A survey, its points and its instrument", figure, ())
        reset = button("Reset", self.reset, tooltip="Back to the survey as it was given: panel.reset()")
        freeze = button("Freeze picture", self.show_frozen, tooltip="Keep the picture in the notebook: panel.freeze()")
        left = [self.points, self.instrument_controls, buttons(reset, freeze)]
        self.children += (
            self.summary,
            columns(left, [self.figure, self.python_line]),
            folded("Parameters as text, to keep or to paste", self.text),
        )
        figure.on_pick(state.reported(self.points.toggle))
        state.observe(state.showing(self._show), ["survey", "instrument"])
        self._show()

    @property
    def survey(self) -> Survey:
        """The survey shown; set it to show another."""
        shown: Survey = self.state.survey
        return shown

    @survey.setter
    def survey(self, survey: Survey) -> None:
        self.state.survey = survey

    @property
    def instrument(self) -> Instrument:
        """What the instrument did; set it to show another."""
        shown: Instrument = self.state.instrument
        return shown

    @instrument.setter
    def instrument(self, instrument: Instrument) -> None:
        self.state.instrument = instrument

    @property
    def python(self) -> str:
        """The Python that makes the same survey and instrument."""
        lines = python_of_points(self._start[0], self.survey)
        return "\n".join([*lines, f"instrument = vx.{self.instrument!r}"])

    def reset(self) -> None:
        """Go back to the survey and the instrument the panel began with."""
        self.state.survey, self.state.instrument = self._start

    def save_parameters(self) -> str:
        """Return the points that are set aside and the instrument as JSON text."""
        aside = {str(index): reason for index, reason in self.survey.set_aside.items()}
        return json.dumps({"set_aside": aside, "instrument": asdict(self.instrument)})

    def load_parameters(self, text: str) -> None:
        """Set aside the points and take the instrument that `save_parameters` wrote.

        Raises
        ------
        ValueError
            If the text is not what `save_parameters` writes, or names samples that the survey does not have.
        """
        aside, instrument = parameters_from(text)
        survey = self.survey.with_all()
        for index, reason in aside.items():
            survey = survey.without([index], reason=reason)
        self.state.survey, self.state.instrument = survey, instrument

    def _show(self) -> None:
        self.summary.value = text(str(self.survey)).value
        self.python_line.show(self.python)


class PointsControls(ipywidgets.VBox):
    """The list of samples that are set aside, and fields to name others by number."""

    def __init__(self, state: SurveyState) -> None:
        super().__init__()
        self._state = state
        self.numbers = text_field("samples", "Numbers of samples, counted from 0, as 3, 7-9")
        self.numbers.placeholder = "3, 7-9"
        self.reason = text_field("reason", "Why samples are set aside; it appears in the record")
        self.reason.value = BY_HAND
        self.list = ipywidgets.HTML()
        aside = button("Set aside", state.reported(self.set_aside), tooltip="survey.without([3], reason=...)")
        back = button("Put back", state.reported(self.put_back), tooltip="survey.with_samples([3])")
        every = button("Put all back", state.reported(self.put_all_back), tooltip="survey.with_all()")
        hint = text("Click a point in the figure to set it aside or to put it back, or name samples by number.")
        fields = ipywidgets.VBox([self.numbers, self.reason])
        fields.add_class("vx-field").add_class("vx-line")
        self.children = (card("Points in and out", hint, fields, buttons(aside, back, every), self.list),)
        state.observe(lambda change: self._show(change.new), "survey")
        self._show(state.survey)

    def toggle(self, index: int) -> None:
        """Set a sample aside, or put it back if it was."""
        survey = self._survey()
        if index in survey.set_aside:
            self._state.survey = survey.with_samples([index])
        else:
            self._state.survey = survey.without([index], reason=self.reason.value)

    def set_aside(self) -> None:
        """Set aside the samples whose numbers are typed."""
        self._state.survey = self._survey().without(sample_numbers(self.numbers.value), reason=self.reason.value)

    def put_back(self) -> None:
        """Put back the samples whose numbers are typed."""
        self._state.survey = self._survey().with_samples(sample_numbers(self.numbers.value))

    def put_all_back(self) -> None:
        """Put every sample back."""
        self._state.survey = self._survey().with_all()

    def _survey(self) -> Survey:
        survey: Survey | None = self._state.survey
        if survey is None:
            raise ValueError("There is no survey yet; read one first.")
        return survey

    def _show(self, survey: Survey | None) -> None:
        self.list.value = set_aside_table(survey)


class InstrumentControls(ipywidgets.VBox):
    """What the instrument did to the survey: wander, probe width and how the probe averages."""

    def __init__(self, state: SurveyState) -> None:
        super().__init__()
        self._state = state
        self.wander = NumberControl(Scale.of_quantity("wander"), state.instrument.wander)
        self.probe_width = NumberControl(Scale.of_quantity("probe_width"), state.instrument.probe_width)
        self.averaging = choice(
            "averaging", _AVERAGING, state.instrument.averaging, "Where the width of the probe lies."
        )
        self.children = (card("Instrument", self.wander, self.probe_width, self.averaging),)
        controls = {"wander": self.wander, "probe_width": self.probe_width, "averaging": self.averaging.dropdown}
        for name, control in controls.items():
            control.observe(state.reported(lambda change, name=name: self._turn(name, change.new)), "value")
        state.observe(lambda change: self._show(change.new), "instrument")

    def _turn(self, name: str, given: Any) -> None:
        self._state.instrument = replace(self._state.instrument, **{name: given})

    def _show(self, instrument: Instrument) -> None:
        self.wander.value, self.probe_width.value = instrument.wander, instrument.probe_width
        self.averaging.dropdown.value = instrument.averaging


def sample_numbers(typed: str) -> list[int]:
    """Return the samples named in a text.

    Raises
    ------
    ValueError
        If the text is not made of numbers and ranges.

    Examples
    --------
    >>> sample_numbers("3, 7-9")
    [3, 7, 8, 9]
    """
    found: list[int] = []
    for part in re.split(r"[,;\s]+", re.sub(r"\s*-\s*", "-", typed.strip())):
        match = re.fullmatch(r"(\d{1,7})(?:-(\d{1,7}))?", part)
        if match is None or int(match[2] or match[1]) < int(match[1]):
            raise ValueError(f"Samples are named by number, as in 3, 7-9; got {typed.strip()!r}.")
        found += range(int(match[1]), int(match[2] or match[1]) + 1)
    return found


def set_aside_table(survey: Survey | None) -> str:
    """Return the samples that are set aside as an HTML table."""
    if survey is None or not survey.set_aside:
        return '<p class="vx-quiet">Every sample is in use.</p>'
    rows = "".join(
        f"<tr><td>{index}</td><td>{survey.velocity[index]:.4g} m/s</td><td>{html.escape(reason)}</td></tr>"
        for index, reason in survey.set_aside.items()
    )
    return f"<table><tr><th>sample</th><th>velocity</th><th>set aside because</th></tr>{rows}</table>"


def python_of_points(start: Survey, survey: Survey) -> list[str]:
    """Return the lines that lead from one survey to another with other samples set aside."""
    lines = []
    back = [index for index in start.set_aside if index not in survey.set_aside]
    if back:
        lines.append(f"survey = survey.with_samples({back})")
    by_reason: dict[str, list[int]] = {}
    for index, reason in survey.set_aside.items():
        if start.set_aside.get(index) != reason:
            by_reason.setdefault(reason, []).append(index)
    return lines + [f"survey = survey.without({indices}, reason={reason!r})" for reason, indices in by_reason.items()]


def parameters_from(text: str) -> tuple[dict[int, str], Instrument]:
    """Return what `SurveyPanel.save_parameters` wrote.

    Raises
    ------
    ValueError
        If the text is not such JSON.
    """
    try:
        found = json.loads(text)
        aside = {int(index): str(reason) for index, reason in found["set_aside"].items()}
        return aside, Instrument(**found["instrument"])
    except (KeyError, TypeError, AttributeError, json.JSONDecodeError) as problem:
        raise ValueError(
            f"The parameters are not those of a survey panel: {problem}. Paste what 'Save' wrote."
        ) from problem
