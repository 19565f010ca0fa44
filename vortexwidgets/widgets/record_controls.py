"""A field and two buttons that save the record of an appraisal."""

from __future__ import annotations

import ipywidgets

from vortexwidgets.widgets.controls import text_field
from vortexwidgets.widgets.panel import PythonLine, button, buttons, text
from vortexwidgets.widgets.state import JobState


class RecordControls(ipywidgets.VBox):
    """Where the record goes, as a page for people and as JSON for machines.

    Parameters
    ----------
    state : JobState
        Its appraisal is saved.
    """

    def __init__(self, state: JobState) -> None:
        super().__init__()
        self._state = state
        self.name = text_field("name of the record", "Path without its ending; .html and .json are added")
        self.name.value = "record"
        self.saved, self.python_line = text(), PythonLine()
        row = buttons(
            button("Save HTML", state.reported(lambda: self.save("html")), tooltip="A page for people", primary=True),
            button("Save JSON", state.reported(lambda: self.save("json")), tooltip="A file that loads back"),
        )
        field = ipywidgets.VBox([self.name])
        field.add_class("vx-field").add_class("vx-line")
        self.children = (field, row, self.saved, self.python_line)
        self.name.observe(lambda _: self.python_line.show(self.python), "value")
        self.python_line.show(self.python)

    @property
    def python(self) -> str:
        """The Python that saves the same record."""
        name = self.name.value.strip()
        return f"appraisal.save({f'{name}.html'!r})\nappraisal.save({f'{name}.json'!r})"

    def save(self, ending: str) -> None:
        """Save the record with one of the endings "html" and "json".

        Raises
        ------
        ValueError
            If there is nothing to save, or no name.
        """
        if self._state.appraisal is None:
            raise ValueError("There is nothing to save yet; press “Appraise” first.")
        name = self.name.value.strip()
        if not name:
            raise ValueError("Give the record a name, for example record.")
        with self._state.working(f"Writing {name}.{ending} …"):
            path = self._state.appraisal.save(f"{name}.{ending}")
        self.saved.value = text(f"Saved {path}, {path.stat().st_size / 1000:.0f} kB.").value
