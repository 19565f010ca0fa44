"""Boxes to tick: which profiles compete."""

from __future__ import annotations

import html

import ipywidgets

from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.widgets.state import JobState


class ModelChoice(ipywidgets.VBox):
    """One box per distinct profile that can be ranked.

    Parameters
    ----------
    state : JobState
        Its `models` are what is ticked; all of them are written as none named.

    Attributes
    ----------
    boxes : dict of str to Checkbox
        By the key of the model.
    """

    def __init__(self, state: JobState) -> None:
        super().__init__()
        self._state = state
        ranked = {key: model for key, model in MODELS.items() if model.ranked and model.same_profile_as is None}
        self.boxes = {
            key: ipywidgets.Checkbox(description=model.name, value=True, indent=False, tooltip=model.source)
            for key, model in ranked.items()
        }
        row = ipywidgets.Box(list(self.boxes.values()), layout={"display": "flex", "flex_flow": "row wrap"})
        row.add_class("vx-boxes")
        self.children = (ipywidgets.HTML(f"<p>{html.escape('Profiles that compete:')}</p>"), row)
        for key, box in self.boxes.items():
            box.observe(state.reported(lambda change, key=key: self._on_box(key, change.new)), "value")
        state.observe(state.showing(self._show), "models")
        self._show()

    def _on_box(self, key: str, ticked: bool) -> None:
        competing = [name for name in self.boxes if self._competes(name)]
        if ticked == (key in competing):
            return
        competing = [name for name in self.boxes if (ticked if name == key else name in competing)]
        if not competing:
            self._show()
            raise ValueError("At least one profile must compete; tick another one first.")
        self._state.models = () if len(competing) == len(self.boxes) else tuple(competing)

    def _competes(self, key: str) -> bool:
        return not self._state.models or key in self._state.models

    def _show(self) -> None:
        for key, box in self.boxes.items():
            box.value = self._competes(key)
