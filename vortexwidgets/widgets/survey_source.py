"""Where a survey comes from: a path, a file from the browser, or a built-in example."""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import Any

import ipywidgets

from vortexwidgets.survey.reading import read_survey
from vortexwidgets.survey.survey import Survey
from vortexwidgets.widgets.controls import text_field
from vortexwidgets.widgets.panel import button, buttons
from vortexwidgets.widgets.state import SurveyState


class SurveySource(ipywidgets.VBox):
    """A field for the path of a survey, and a button for a file from the browser.

    Parameters
    ----------
    state : SurveyState
        Its survey is replaced by what is read.

    Attributes
    ----------
    python : str
        The Python that reads the same survey, empty before anything was read.
    start : Survey or None
        The survey as it was read or given, before anything was changed.
    """

    python = ""

    def __init__(self, state: SurveyState) -> None:
        super().__init__()
        self._state, self.start = state, state.survey
        self.path = text_field("file", "Path of a CSV or NetCDF file, as the kernel sees it")
        self.path.placeholder = "survey.csv"
        self.upload = ipywidgets.FileUpload(
            accept=".csv,.txt,.dat,.nc", description="From this computer", tooltip="A file the browser can see"
        )
        read = button("Read", state.reported(self.read), tooltip="survey = vx.read_survey(path)", primary=True)
        field = ipywidgets.VBox([self.path])
        field.add_class("vx-field").add_class("vx-line")
        self.children = (field, buttons(read, self.upload))
        self.upload.observe(state.reported(lambda change: self._read_upload(change.new)), "value")

    def read(self) -> None:
        """Read the file whose path is typed.

        Raises
        ------
        SurveyError
            If the file is not a survey.
        """
        path = self.path.value.strip().strip("\"'")
        if not path:
            raise ValueError("Type the path of a survey file, or choose a file from this computer.")
        self._take(read_survey(path), path)

    def _read_upload(self, files: Any) -> None:
        for file in files:
            name = Path(str(file["name"]).replace("\\", "/")).name
            # The reader takes a path, and the record keeps the name of the file.
            with tempfile.TemporaryDirectory() as folder:
                path = Path(folder) / name
                path.write_bytes(bytes(file["content"]))
                self._take(read_survey(path), name)

    def _take(self, survey: Survey, name: str) -> None:
        self.python = f"survey = vx.read_survey({name!r})"
        self.start = self._state.survey = survey
