"""What every panel has: look, error line, progress line, the Python that does the same, a frozen picture."""

from __future__ import annotations

import base64
import html
from collections.abc import Callable, Sequence
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import ipywidgets

from vortexwidgets.widgets.canvas import LiveFigure

if TYPE_CHECKING:
    from IPython.display import Image

    from vortexwidgets.widgets.state import PanelState

CONTROLS_WIDTH = "320px"
FIGURE_WIDTH = 550  # px: fits beside the controls in a wide notebook, and below them in one of 800 px


@cache
def style_sheet() -> str:
    """Return the look of the panels; it travels with each panel, since a front end has no other place to find it."""
    return f"<style>{Path(__file__).with_name('panel.css').read_text(encoding='utf-8')}</style>"


class Panel(ipywidgets.VBox):
    """A column of widgets around one state, shown by being the last expression of a cell.

    Parameters
    ----------
    state : PanelState
        Its `error` and `progress` are shown above the content.
    title : str
        Plain text.
    figure : LiveFigure or SurveyFigure
        The picture that `freeze` returns.
    content : sequence of Widget
        What stands below the title.
    """

    def __init__(self, state: PanelState, title: str, figure: Any, content: Sequence[Any]) -> None:
        super().__init__()
        self.add_class("vx-panel")
        self.state = state
        self.figure = figure
        self._display_id = f"frozen-{self.model_id}"
        self.error_line, self.progress_line = Line("vx-error", "alert"), Line("vx-progress", "status")
        state.observe(lambda change: self.error_line.tell(change.new), "error")
        state.observe(lambda change: self.progress_line.tell(change.new), "progress")
        heading = ipywidgets.HTML(f"{style_sheet()}<h2>{html.escape(title)}</h2>")
        self.children: tuple[Any, ...] = (heading, self.error_line, self.progress_line, *content)

    def freeze(self) -> Image:
        """Return a picture of the figure; as the last expression of a cell it stays in the saved notebook."""
        return self.figure.freeze()

    def show_frozen(self) -> None:
        """Put the frozen picture below the panel, where the notebook keeps it."""
        from IPython.display import display

        display(self.freeze(), display_id=self._display_id, update=True)

    def close(self) -> None:
        """Disconnect everything and free the figures."""
        for child in _descendants(self):
            child.close()
        if hasattr(self, "state"):
            self.state.unobserve_all()
        super().close()

    def _ipython_display_(self) -> None:
        from IPython.display import display

        bundle = self._repr_mimebundle_()
        # For readers without a kernel, and for pages made from the notebook.
        if self.figure.plot is not None:
            bundle["image/png"] = base64.b64encode(self.figure.png(dots_per_inch=100)).decode("ascii")
        display(bundle, raw=True)
        display({"text/html": "<!-- the frozen picture -->"}, raw=True, display_id=self._display_id)


class Line(ipywidgets.HTML):
    """One line of text that is there only when it has something to say."""

    def __init__(self, css_class: str, role: str) -> None:
        super().__init__(layout={"display": "none"})
        self._open, self._close = f'<div class="{css_class}" role="{role}">', "</div>"

    def tell(self, text: str) -> None:
        """Show `text`, escaped, or vanish when it is empty."""
        self.value = f"{self._open}{html.escape(text)}{self._close}" if text else ""
        self.layout.display = None if text else "none"


class PythonLine(ipywidgets.HTML):
    """The Python that does what the panel did; one click selects it to copy."""

    def __init__(self, code: str = "") -> None:
        super().__init__()
        self.show(code)

    def show(self, code: str) -> None:
        """Show other code."""
        self.value = f'<pre class="vx-python" title="The same in Python: click, then copy">{html.escape(code)}</pre>'


class ParametersText(ipywidgets.VBox):
    """Parameters as text that can be kept, edited and pasted.

    Parameters
    ----------
    save : callable
        Returns the text.
    load : callable
        Takes the text.
    """

    def __init__(self, save: Callable[[], str], load: Callable[[str], object]) -> None:
        self.area = ipywidgets.Textarea(
            rows=4,
            layout={"width": "100%"},
            tooltip="Parameters as JSON text",
            placeholder="Save writes here; Load reads",
        )
        row = buttons(
            button("Save", lambda: setattr(self.area, "value", save()), tooltip="panel.save_parameters()"),
            button("Load", lambda: load(self.area.value), tooltip="panel.load_parameters(text)"),
        )
        super().__init__([self.area, row])


def card(title: str, *children: Any, number: int | None = None) -> Any:
    """Return the children under a heading, framed."""
    mark = "" if number is None else f"<b>{number}</b>"
    box = ipywidgets.VBox([ipywidgets.HTML(f"<h3>{mark}{html.escape(title)}</h3>"), *children])
    box.add_class("vx-card")
    return box


def columns(narrow: Sequence[Any], wide: Sequence[Any]) -> Any:
    """Return controls beside a figure; where there is no room, above it."""
    # Without a fixed basis the figure would press the sliders flat. Where both fit, the figure takes the room to spare.
    left = ipywidgets.VBox(list(narrow), layout={"flex": f"1 0 {CONTROLS_WIDTH}", "min_width": "0"})
    right = ipywidgets.VBox(list(wide), layout={"flex": f"999 1 {FIGURE_WIDTH}px", "min_width": "0"})
    left.add_class("vx-narrow")
    right.add_class("vx-wide")
    box = ipywidgets.Box([left, right], layout={"display": "flex", "flex_flow": "row wrap", "width": "100%"})
    box.add_class("vx-columns")
    return box


def grid(children: Sequence[Any]) -> Any:
    """Return fields in as many columns as there is room for."""
    box = ipywidgets.GridBox(
        list(children),
        layout={"grid_template_columns": "repeat(auto-fill, minmax(300px, 1fr))", "grid_gap": "2px 20px"},
    )
    box.add_class("vx-grid")
    return box


def buttons(*children: Any) -> Any:
    """Return buttons in a row that wraps."""
    row = ipywidgets.Box(list(children), layout={"display": "flex", "flex_flow": "row wrap"})
    row.add_class("vx-buttons")
    return row


def button(text: str, action: Callable[[], object], *, tooltip: str, primary: bool = False) -> Any:
    """Return a button that calls `action()`."""
    widget = ipywidgets.Button(description=text, tooltip=tooltip)
    widget.on_click(lambda _: action())
    if primary:
        widget.add_class("vx-primary")
    return widget


def folded(title: str, child: Any, *, on_open: Callable[[], object] | None = None) -> Any:
    """Return `child` in a section that is closed at first; `on_open()` is called whenever it is opened."""
    section = ipywidgets.Accordion([child], titles=(title,), selected_index=None)
    if on_open is not None:
        section.observe(lambda change: on_open() if change.new == 0 else None, "selected_index")
    return section


def text(content: str = "", *, css_class: str = "") -> Any:
    """Return plain text, escaped."""
    return ipywidgets.HTML(f'<p class="{css_class}">{html.escape(content)}</p>')


def _descendants(widget: Any) -> list[Any]:
    if isinstance(widget, LiveFigure):  # it frees what it holds itself
        return []
    found = []
    for child in getattr(widget, "children", ()):
        found += [*_descendants(child), child]
    return found
