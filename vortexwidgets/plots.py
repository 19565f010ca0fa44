"""Values → matplotlib artists that can be redrawn; no widgets here."""

from __future__ import annotations

from vortexwidgets.plane_plot import PlanePlot
from vortexwidgets.plot_style import THEMES, Theme, ThemeName
from vortexwidgets.profile_plot import ProfilePlot
from vortexwidgets.survey_plot import SurveyPlot, fitted_velocity

__all__ = ["THEMES", "PlanePlot", "ProfilePlot", "SurveyPlot", "Theme", "ThemeName", "fitted_velocity"]
