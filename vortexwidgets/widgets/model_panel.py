"""One vortex, turned by hand, with its derivation."""

from __future__ import annotations

import html
import json
from typing import Any

import ipywidgets
import traitlets

from vortexwidgets.formatting import format_number
from vortexwidgets.models.agreement import check_agreement
from vortexwidgets.models.derivation import Derivation, derivation
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.plots.profile import ProfilePlot
from vortexwidgets.quantities import check
from vortexwidgets.widgets.canvas import FrontEnd, LiveFigure, Theme
from vortexwidgets.widgets.controls import NumberControl, Scale
from vortexwidgets.widgets.panel import (
    FIGURE_WIDTH,
    Panel,
    ParametersText,
    PythonLine,
    button,
    buttons,
    columns,
    folded,
)
from vortexwidgets.widgets.state import VortexState
from vortexwidgets.widgets.vortex_controls import VortexControls, numbers_of, vortex_like


class ModelPanel(Panel):
    """One vortex to turn by hand: sliders, profiles of swirl, vorticity and pressure drop, and where they come from.

    Parameters
    ----------
    model : str or Vortex
        Name of a model of the catalogue, or the vortex to begin with.
    density : float
        Density of the fluid. [kg/m³]
    theme : {"auto", "light", "dark"}
        Colours of the figure; "auto" follows the notebook.
    front_end : {"auto", "canvas", "image"}
        As in LiveFigure.
    continuous_update : bool
        Whether the figure follows a slider while it is dragged.

    Examples
    --------
    >>> panel = ModelPanel("lamb-oseen")  # as the last line of a cell it is shown
    >>> panel.vortex = Vortex("lamb-oseen", circulation=2.4, core_radius=0.012)
    >>> print(panel.python)
    vortex = vx.Vortex('lamb-oseen', circulation=2.4, core_radius=0.012)
    vortex.pressure_drop(0.0, density=1000.0)
    >>> panel.close()
    """

    def __init__(
        self,
        model: str | Vortex = "lamb-oseen",
        *,
        density: float = 1000.0,
        theme: Theme = "auto",
        front_end: FrontEnd = "auto",
        continuous_update: bool = True,
    ) -> None:
        vortex = model if isinstance(model, Vortex) else vortex_like(None, model)
        state = VortexState(vortex=vortex, density=density)
        figure = LiveFigure(ProfilePlot, size=(FIGURE_WIDTH, 600), theme=theme, front_end=front_end)
        self._start = (vortex, density)
        self.controls = VortexControls(state, continuous_update=continuous_update)
        self.density = NumberControl(Scale.of_quantity("density"), density, continuous_update=continuous_update)
        self.readouts, self.python_line = ipywidgets.HTML(), PythonLine()
        self.steps, self.agreement = ipywidgets.HTMLMath(), ipywidgets.HTML()
        self.text = ParametersText(self.save_parameters, state.reported(self.load_parameters))
        super().__init__(state, "A vortex turned by hand", figure, ())
        self.children += self._content()
        traitlets.link((state, "density"), (self.density, "value"))
        state.observe(state.showing(self._show), ["vortex", "density"])
        self._show()

    @property
    def vortex(self) -> Vortex:
        """The vortex shown; set it to show another."""
        shown: Vortex = self.state.vortex
        return shown

    @vortex.setter
    def vortex(self, vortex: Vortex) -> None:
        self.state.vortex = vortex

    @property
    def python(self) -> str:
        """The Python that makes the same vortex."""
        return f"vortex = vx.{self.vortex!r}\nvortex.pressure_drop(0.0, density={self.state.density!r})"

    def reset(self) -> None:
        """Go back to the vortex the panel began with."""
        self.state.vortex, self.state.density = self._start

    def save_parameters(self) -> str:
        """Return everything that was turned, as JSON text."""
        return json.dumps({"model": self.vortex.model.key, **numbers_of(self.vortex), "density": self.state.density})

    def load_parameters(self, text: str) -> None:
        """Show what `save_parameters` wrote.

        Raises
        ------
        ValueError
            If the text is not JSON, or its names or numbers are not those of a vortex.
        """
        numbers = parameters_from(text)
        density = numbers.pop("density", self.state.density)
        vortex = Vortex(numbers.pop("model"), **numbers)
        self.state.vortex, self.state.density = vortex, check("density", density)

    def _content(self) -> tuple[Any, ...]:
        actions = buttons(
            button("Reset", self.reset, tooltip="Back to the vortex the panel began with: panel.reset()"),
            button("Freeze picture", self.show_frozen, tooltip="Keep the picture in the notebook: panel.freeze()"),
        )
        report = self.state.reported
        return (
            columns([self.controls, self.density, self.readouts, actions], [self.figure, self.python_line]),
            folded("Derivation: from the profile to the pressure", self.steps, on_open=report(self._derive)),
            folded("Agreement of formulas and numbers", self.agreement, on_open=report(self._check)),
            folded("Parameters as text, to keep or to paste", self.text),
        )

    def _show(self) -> None:
        self.figure.plot.update([self.vortex], self.state.density)
        self.figure.moved()
        self.readouts.value = readout_table(self.vortex, self.state.density)
        self.python_line.show(self.python)

    def _derive(self) -> None:
        with self.state.working("Deriving the profile symbolically …"):
            self.steps.value = steps_page(derivation(self.vortex.model.key))

    def _check(self) -> None:
        with self.state.working("Comparing formulas with quadrature and differentiation …"):
            self.agreement.value = check_agreement(self.vortex.model.key)._repr_html_()


def readout_table(vortex: Vortex, density: float) -> str:
    """Return what the vortex does in numbers, as an HTML table."""
    rows = {
        "peak radius": format_number(vortex.peak_radius, "m"),
        "peak swirl": format_number(vortex.peak_swirl, "m/s"),
        "pressure drop on the axis": format_number(float(vortex.pressure_drop(0.0, density=density)), "Pa"),
        "K = drop / (density × peak swirl²)": format_number(vortex.pressure_constant, ""),
    }
    cells = (f"<tr><td>{html.escape(name)}</td><th>{html.escape(number)}</th></tr>" for name, number in rows.items())
    return f"<table>{''.join(cells)}</table>"


def steps_page(steps: Derivation) -> str:
    """Return a derivation as HTML with its equations in LaTeX, which the notebook typesets."""
    parts = (
        f"<h3>{number}. {html.escape(step.title)}</h3><p>{html.escape(step.sentence)}</p>$${step.latex}$$"
        for number, step in enumerate(steps.steps, start=1)
    )
    return "".join(parts)


def parameters_from(text: str) -> dict[str, Any]:
    """Return the numbers in the text that `ModelPanel.save_parameters` wrote.

    Raises
    ------
    ValueError
        If the text is not such JSON.
    """
    try:
        found = json.loads(text)
    except json.JSONDecodeError as problem:
        raise ValueError(f"The parameters are not JSON: {problem}. Paste what 'Save' wrote.") from problem
    if not isinstance(found, dict) or not isinstance(found.get("model"), str):
        raise ValueError("The parameters must be a JSON object that names a \"model\". Paste what 'Save' wrote.")
    for name, number in found.items():
        if name != "model" and (isinstance(number, bool) or not isinstance(number, (int, float))):
            raise ValueError(f"{name} must be a number, got {number!r}.")
    return found
