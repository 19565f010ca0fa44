"""Fields for the facts of a test: fluid, pressures, orientation, speeds, and what the instrument did."""

from __future__ import annotations

from typing import Any

import ipywidgets

from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Estimate
from vortexwidgets.widgets.controls import QuantityField, choice
from vortexwidgets.widgets.panel import folded, grid
from vortexwidgets.widgets.state import SurveyState

# Fact -> label. The order is the order in which a reviewer asks.
_FIRST = {
    "temperature": "temperature",
    "ambient_pressure": "pressure at the axis, absolute",
    "surface_pressure": "pressure on the surface",
    "depth": "depth of the axis",
    "free_stream": "free stream U",
    "wander": "wander of the vortex σ",
    "probe_width": "width of the probe",
}
_SECOND = {
    "salinity": "salinity",
    "gravity": "gravity g",
    "reference_radius": "radius of the reference",
    "translation_speed": "speed of the vortex itself",
    "tensile_strength": "tensile strength",
    "elevation": "elevation",
}
_CHOICES = {
    "fluid": ("fluid", ("water", "sea water", "air", "helium"), "Sets density, viscosity and vapour pressure."),
    "orientation": ("orientation", ("surface", "submerged", "air"), "Whether the vortex reaches a free surface."),
    "averaging": ("probe averages", ("along", "across", "square"), "Where the width of the probe lies."),
}
NOT_STATED = "not stated"


class FactsControls(ipywidgets.VBox):
    """Fields that show the facts of the survey and replace it by one with other facts.

    Parameters
    ----------
    state : SurveyState
        Its survey is replaced by `survey.with_facts(...)`.

    Attributes
    ----------
    fields : dict of str to QuantityField
    choices : dict of str to Dropdown
    """

    def __init__(self, state: SurveyState) -> None:
        super().__init__()
        self._state = state
        self.fields = {name: QuantityField(name, label=label) for name, label in (_FIRST | _SECOND).items()}
        boxes = {
            name: choice(label, (NOT_STATED, *options), NOT_STATED, tip)
            for name, (label, options, tip) in _CHOICES.items()
        }
        self.choices = {name: box.dropdown for name, box in boxes.items()}
        first = [boxes["fluid"], *(self.fields[name] for name in _FIRST), boxes["orientation"]]
        second = [*(self.fields[name] for name in _SECOND), boxes["averaging"]]
        self.children = (grid(first), folded("More facts", grid(second)))
        for name, field in {**self.fields, **self.choices}.items():
            field.observe(state.reported(lambda change, name=name: self._state_fact(name, change.new)), "value")
        state.observe(lambda change: self._show(change.new), "survey")
        self._show(state.survey)

    def _show(self, survey: Survey | None) -> None:
        facts = {} if survey is None else survey.facts
        for name, field in self.fields.items():
            field.value = facts.get(name)
        for name, dropdown in self.choices.items():
            stated = str(facts.get(name, NOT_STATED))
            if stated not in dropdown.options:  # a file may say it in words of its own
                dropdown.options = (*dropdown.options, stated)
            dropdown.value = stated

    def _state_fact(self, name: str, given: Any) -> None:
        survey = self._state.survey
        fact = None if given == NOT_STATED else given
        if survey is not None and survey.facts.get(name) != fact:
            self._state.survey = survey.with_facts(**{name: fact})


def python_of_facts(start: Survey, survey: Survey) -> list[str]:
    """Return the line that gives a survey the facts of another one."""
    names = sorted({*start.facts, *survey.facts})
    changed = [name for name in names if start.facts.get(name) != survey.facts.get(name)]
    if not changed:
        return []
    facts = ", ".join(f"{name}={_python_of(survey.facts.get(name))}" for name in changed)
    return [f"survey = survey.with_facts({facts})"]


def _python_of(fact: Any) -> str:
    if isinstance(fact, Estimate):
        return f"({fact.value!r}, {fact.uncertainty!r})" if fact.uncertainty else repr(fact.value)
    return repr(fact)
