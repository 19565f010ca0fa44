"""Sliders for the numbers of a vortex, made from what its model says of itself."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import ipywidgets

from vortexwidgets.models.catalogue import MODELS, model_named
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.quantities import QUANTITIES
from vortexwidgets.widgets.controls import NumberControl, Scale, choice
from vortexwidgets.widgets.state import VortexState

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel

_FIRST = {"circulation": 1.0, "swirl_scale": 10.0, "rotation_rate": 10.0, "core_radius": 0.01}


def numbers_of(vortex: Vortex) -> dict[str, float]:
    """Return the numbers that make the vortex, by the names its constructor takes.

    Examples
    --------
    >>> numbers_of(Vortex("lamb-oseen", circulation=2.4, core_radius=0.012))
    {'circulation': 2.4, 'core_radius': 0.012}
    """
    return {name: float(getattr(vortex, name)) for name in _own_names(vortex.model)} | dict(vortex.shape)


def vortex_like(vortex: Vortex | None, model: str) -> Vortex:
    """Return a vortex of another model with the numbers of this one where it has them, and common ones elsewhere."""
    entry = model_named(model)
    known = {} if vortex is None else {name: getattr(vortex, name) for name in _FIRST} | dict(vortex.shape)
    numbers = {name: known.get(name, 0.0) for name in _own_names(entry)}
    # A model without a length or a circulation of its own answers 0, infinity or NaN.
    numbers = {name: size if math.isfinite(size) and size else _FIRST[name] for name, size in numbers.items()}
    shape = {parameter.name: known.get(parameter.name, parameter.default) for parameter in entry.shape}
    centre = (0.0, 0.0) if vortex is None else vortex.centre
    return Vortex(entry.key, centre=centre, **numbers, **shape)


def _own_names(model: VortexModel) -> tuple[str, ...]:
    return (model.strength, "core_radius") if model.has_core else (model.strength,)


class VortexControls(ipywidgets.VBox):
    """A list of models and one control per number of the vortex.

    Parameters
    ----------
    state : VortexState
        Its vortex is replaced by what is turned here, and shown here whoever replaced it.
    typical : mapping of str to (float, float), optional
        Ends of sliders that should differ from the typical range of the quantity. [SI]
    continuous_update : bool
        Whether the vortex follows a slider while it is dragged.

    Attributes
    ----------
    numbers : dict of str to NumberControl
        The controls by the name of their number.
    """

    def __init__(
        self,
        state: VortexState,
        *,
        typical: Mapping[str, tuple[float, float]] | None = None,
        continuous_update: bool = True,
    ) -> None:
        super().__init__()
        self._state, self._typical, self._continuous = state, dict(typical or {}), continuous_update
        self.numbers: dict[str, NumberControl] = {}
        self._key = ""
        options = [(model.name, key) for key, model in MODELS.items()]
        self.model = choice("model", options, state.vortex.model.key, "Which profile of swirl.")
        self.model.dropdown.observe(state.reported(self._on_model), "value")
        state.observe(lambda change: self._show(change.new), "vortex")
        self._show(state.vortex)

    def _show(self, vortex: Vortex) -> None:
        if vortex.model.key != self._key:
            self._build(vortex)
        for name, number in numbers_of(vortex).items():
            self.numbers[name].value = number
        self.model.dropdown.value = vortex.model.key

    def _build(self, vortex: Vortex) -> None:
        old, self._key = self.numbers, vortex.model.key
        shape = {parameter.name: parameter for parameter in vortex.model.shape}
        self.numbers = {}
        for name, number in numbers_of(vortex).items():
            scale = Scale.of_shape(shape[name]) if name in shape else self._scale(name)
            control = NumberControl(scale, number, continuous_update=self._continuous)
            control.observe(self._state.reported(lambda change, name=name: self._turn(name, change.new)), "value")
            self.numbers[name] = control
        self.children: tuple[Any, ...] = (self.model, *self.numbers.values())
        for control in old.values():
            control.close()

    def _scale(self, name: str) -> Scale:
        return Scale.of_quantity(name, typical=self._typical.get(name, QUANTITIES[name].typical))

    def _turn(self, name: str, number: float) -> None:
        self._state.change(**{name: number})

    def _on_model(self, change: Any) -> None:
        if change.new != self._state.vortex.model.key:
            self._state.vortex = vortex_like(self._state.vortex, change.new)
