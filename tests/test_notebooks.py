"""The notebooks as they are committed: executed, small, readable by strangers' machines. nbval runs them."""

from __future__ import annotations

import json
import tempfile
from pathlib import Path
from typing import Any

import pytest

NOTEBOOKS = sorted((Path(__file__).parents[1] / "notebooks").glob("*.ipynb"))
CHECKED = "nbval-check-output"
# Where a path of whoever ran them would begin: here, and on the usual systems.
MACHINE = (str(Path.home()), str(Path(__file__).parents[1]), tempfile.gettempdir(), "/home/", "/Users/", "C:\\\\")


def cells_of(path: Path, kind: str = "code") -> list[dict[str, Any]]:
    return [cell for cell in json.loads(path.read_text("utf-8"))["cells"] if cell["cell_type"] == kind]


def outputs_of(path: Path) -> list[dict[str, Any]]:
    return [output for cell in cells_of(path) for output in cell["outputs"]]


def test_the_three_worked_cases_are_there() -> None:
    assert {path.stem for path in NOTEBOOKS} >= {"wing_tip_traverse", "pump_intake", "one_model_by_hand"}


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.stem)
class TestNotebook:
    def test_is_short(self, path: Path) -> None:
        assert len(json.loads(path.read_text("utf-8"))["cells"]) <= 15
        assert path.stat().st_size <= 200_000, "run notebooks/refresh.py, which shrinks the pictures"

    def test_was_executed_from_top_to_bottom(self, path: Path) -> None:
        assert [cell["execution_count"] for cell in cells_of(path)] == list(range(1, len(cells_of(path)) + 1))

    def test_starts_without_questions_about_the_kernel(self, path: Path) -> None:
        metadata = json.loads(path.read_text("utf-8"))["metadata"]
        assert metadata["kernelspec"]["name"] == "python3"
        assert "widgets" not in metadata

    def test_has_no_trace_of_the_machine(self, path: Path) -> None:
        text = path.read_text("utf-8")
        for trace in (*MACHINE, "site-packages", "sys.path"):
            assert trace not in text, trace

    def test_ran_without_error_or_warning(self, path: Path) -> None:
        for output in outputs_of(path):
            assert output["output_type"] != "error"
            assert output.get("name") != "stderr", output.get("text")

    def test_numbers_are_compared(self, path: Path) -> None:
        printing = [cell for cell in cells_of(path) if any(out.get("name") == "stdout" for out in cell["outputs"])]
        assert printing
        for cell in printing:
            assert CHECKED in cell["metadata"].get("tags", ()), "".join(cell["source"])

    def test_says_what_is_invented_and_asks_one_question(self, path: Path) -> None:
        first = "".join(cells_of(path, "markdown")[0]["source"])
        assert "invented" in first
        assert first.startswith("# ")
        assert first.splitlines()[0].endswith("?")

    def test_code_is_not_cut_in_a_page_of_ordinary_width(self, path: Path) -> None:
        for cell in cells_of(path):
            for line in "".join(cell["source"]).splitlines():
                assert len(line) <= 100, line

    def test_every_panel_leaves_a_picture(self, path: Path) -> None:
        panels = [out for out in outputs_of(path) if "application/vnd.jupyter.widget-view+json" in out.get("data", {})]
        frozen = [
            out for out in outputs_of(path) if out["output_type"] == "execute_result" and "image/png" in out["data"]
        ]
        assert len(frozen) >= len(panels)
