"""Values → matplotlib artists that can be redrawn; no widgets here."""

from __future__ import annotations

import importlib
from typing import Any

# Name -> its file here. Nothing is imported before it is used.
_HOMES = {
    "THEMES": "style",
    "ProfilePlot": "profile",
    "SurveyPlot": "survey",
    "fitted_velocity": "survey",
    "PlanePlot": "plane",
    "budget_plot": "result",
    "drop_plot": "result",
    "ranking_plot": "result",
}

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'vortexwidgets.plots' has no attribute {name!r}")
    return getattr(importlib.import_module(f"vortexwidgets.plots.{_HOMES[name]}"), name)
