"""What was chosen for an appraisal, as lines of Python and as JSON text."""

from __future__ import annotations

import json
from collections.abc import Collection, Sequence
from typing import Any

from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Estimate
from vortexwidgets.widgets.facts_controls import python_of_facts
from vortexwidgets.widgets.survey_panel import python_of_points


def python_of_job(source: str, start: Survey | None, survey: Survey | None, models: Sequence[str]) -> dict[str, str]:
    """Return, per section of the panel, the Python that does the same.

    Parameters
    ----------
    source : str
        The line that reads the survey, empty when it was given as a value.
    start, survey : Survey or None
        As it was read or given, and as it is now.
    models : sequence of str
        Keys of the models that compete; empty for all.
    """
    facts = [] if start is None or survey is None else python_of_facts(start, survey)
    points = [] if start is None or survey is None else python_of_points(start, survey)
    chosen = f", models={list(models)!r}" if models else ""
    return {
        "survey": source or "# survey: the value that was given to AppraisalPanel(survey)",
        "facts": "\n".join([*facts, *points]) or "# nothing changed: the facts of the survey are used",
        "models": f"appraisal = vx.appraise(survey{chosen})\nprint(appraisal.ranking)",
        "core": "print(appraisal.answer)\nappraisal.core_pressure, appraisal.core_drops, appraisal.envelope",
        "consequences": "for consequence in appraisal.consequences:\n    print(consequence)",
    }


def parameters_of(survey: Survey | None, models: Sequence[str]) -> dict[str, Any]:
    """Return the facts, the samples set aside and the models as values that JSON knows."""
    if survey is None:
        return {"models": list(models)}
    facts = {
        name: {"value": fact.value, "uncertainty": fact.uncertainty} if isinstance(fact, Estimate) else fact
        for name, fact in survey.facts.items()
    }
    aside = {str(index): reason for index, reason in survey.set_aside.items()}
    return {"facts": facts, "set_aside": aside, "models": list(models)}


def with_parameters(text: str, survey: Survey | None, known: Collection[str]) -> tuple[Survey, tuple[str, ...]]:
    """Return the survey and the models that a text written from `parameters_of` describes.

    Raises
    ------
    ValueError
        If there is no survey to give the facts to, or the text is not such JSON.
    """
    if survey is None:
        raise ValueError("The parameters belong to a survey; read the survey first.")
    try:
        found = json.loads(text)
        facts = {name: _fact(given) for name, given in found["facts"].items()}
        aside = {int(index): str(reason) for index, reason in found["set_aside"].items()}
        models = tuple(str(key) for key in found["models"])
    except (KeyError, TypeError, AttributeError, json.JSONDecodeError) as problem:
        raise ValueError(
            f"The parameters are not those of an appraisal: {problem}. Paste what 'Save' wrote."
        ) from problem
    unknown = [key for key in models if key not in known]
    if unknown:
        raise ValueError(f"No model {unknown[0]!r} can be ranked. Known: {', '.join(known)}.")
    survey = survey.with_all().with_facts(**dict.fromkeys(survey.facts)).with_facts(**facts)
    for index, reason in aside.items():
        survey = survey.without([index], reason=reason)
    return survey, models


def _fact(given: Any) -> Any:
    return (float(given["value"]), float(given["uncertainty"])) if isinstance(given, dict) else given
