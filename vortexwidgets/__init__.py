"""From a survey of a swirling flow to a defended pressure on the axis."""

from __future__ import annotations

import importlib
from typing import Any

# Public name -> the module that holds it. Nothing is imported before it is used.
_HOMES = {
    "Estimate": "vortexwidgets.uncertainty",
    "propagate": "vortexwidgets.uncertainty",
    "MODELS": "vortexwidgets.models.catalogue",
    "VortexModel": "vortexwidgets.models.model",
    "Vortex": "vortexwidgets.models.vortex",
    "derivation": "vortexwidgets.models.derivation",
    "check_agreement": "vortexwidgets.models.agreement",
    "Fluid": "vortexwidgets.fluids",
    "Site": "vortexwidgets.fluids",
    "water": "vortexwidgets.fluids",
    "sea_water": "vortexwidgets.fluids",
    "air": "vortexwidgets.fluids",
    "helium": "vortexwidgets.fluids",
    "Survey": "vortexwidgets.survey.survey",
    "SurveyError": "vortexwidgets.survey.survey",
    "read_survey": "vortexwidgets.survey.reading",
    "example_survey": "vortexwidgets.survey.reading",
    "screen": "vortexwidgets.survey.screening",
    "Instrument": "vortexwidgets.survey.instrument",
    "Fit": "vortexwidgets.fitting.result",
    "FitError": "vortexwidgets.fitting.result",
    "fit_survey": "vortexwidgets.fitting.fit",
    "rank_models": "vortexwidgets.fitting.ranking",
    "core_drops": "vortexwidgets.core_pressure",
    "share_beyond": "vortexwidgets.core_pressure",
    "appraise": "vortexwidgets.appraisal",
    "load_appraisal": "vortexwidgets.appraisal",
    "ModelPanel": "vortexwidgets.widgets.model_panel",
    "SurveyPanel": "vortexwidgets.widgets.survey_panel",
    "AppraisalPanel": "vortexwidgets.widgets.appraisal_panel",
}

__all__ = ["__version__", *_HOMES]


def __getattr__(name: str) -> Any:
    if name == "__version__":
        from importlib.metadata import version

        return version("vortexwidgets")
    if name not in _HOMES:
        raise AttributeError(f"module 'vortexwidgets' has no attribute {name!r}")
    value = getattr(importlib.import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
