"""Inputs built from quantities.py."""

from __future__ import annotations

import html
import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import ipywidgets
import traitlets

from vortexwidgets import units
from vortexwidgets.quantities import QUANTITIES, check
from vortexwidgets.uncertainty import Estimate

if TYPE_CHECKING:
    from vortexwidgets.models.model import ShapeParameter
    from vortexwidgets.uncertainty import Given

_LOGARITHMIC_FROM = 50.0  # ratio of the ends of a range above which equal factors are easier to turn than equal steps
_STEPS = 200  # of a slider over its range; the page keys move five of them


@dataclass(frozen=True)
class Scale:
    """How one number is named, written, read and slid.

    Parameters
    ----------
    label, description : str
        Plain text, with the symbol in Unicode.
    unit : str
        The unit in which the number is shown; empty for a plain number.
    factor : float
        SI units in one shown unit.
    typical : tuple of float
        Ends of the slider. [SI]
    read : callable
        From typed text to an SI number; raises ValueError with a sentence.
    """

    label: str
    description: str
    unit: str
    factor: float
    typical: tuple[float, float]
    read: Callable[[str], float]

    @classmethod
    def of_quantity(cls, key: str, *, typical: tuple[float, float] | None = None) -> Scale:
        """Return the scale of a physical quantity."""
        quantity = QUANTITIES[key]
        unit = quantity.display_units.get("SI", quantity.unit)
        factor, _ = units.factor(unit, key)

        def read(text: str) -> float:
            given = units.read_quantity(text, key, default_unit=unit)
            if isinstance(given, Estimate):
                raise ValueError(
                    f"{quantity.description} is turned as one number here; leave out the ± part of {text!r}."
                )
            return check(key, given)

        label = f"{key.replace('_', ' ')} {quantity.text_symbol}".strip()
        return cls(label, quantity.description, unit, factor, typical or quantity.typical, read)

    @classmethod
    def of_shape(cls, parameter: ShapeParameter) -> Scale:
        """Return the scale of a model's own shape parameter, a plain number."""

        def read(text: str) -> float:
            number = units.parse_number(text)
            low, high = parameter.valid
            if not low < number < high:
                raise ValueError(f"{parameter.name} must lie between {low:g} and {high:g}, got {number:g}.")
            return number

        label = f"{parameter.name.replace('_', ' ')} {parameter.symbol}"
        return cls(label, parameter.description, "", 1.0, parameter.typical, read)

    def write(self, value: float, digits: int = 6) -> str:
        """Return an SI number as text that `read` understands, with no more digits than it needs."""
        return (
            f"{float(f'{value / self.factor:.{digits}g}')!r} {self.unit}".strip().replace(".0 ", " ").removesuffix(".0")
        )

    @property
    def is_logarithmic(self) -> bool:
        """Whether the slider moves by factors."""
        low, high = self.typical
        return low > 0.0 and high / low >= _LOGARITHMIC_FROM


class Refusal(ipywidgets.HTML):
    """A sentence in red below a field, there only while what was typed is refused."""

    def __init__(self) -> None:
        super().__init__(layout={"display": "none"})

    def say(self, sentence: str) -> None:
        """Show the sentence, or vanish when it is empty."""
        self.value = f'<div class="vx-refusal" role="alert">{html.escape(sentence)}</div>' if sentence else ""
        self.layout.display = None if sentence else "none"


class NumberControl(ipywidgets.VBox):
    """One number: a slider to turn it and a field to type it exactly.

    What is typed is kept to the last digit, with units, a power of ten or a decimal comma; what cannot be read is
    answered below the field and changes nothing. The slider widens to a number outside it, and never clamps one.

    Parameters
    ----------
    scale : Scale
        What the number is.
    value : float
        [SI]
    continuous_update : bool
        Whether the number follows the slider while it is dragged, or only when it is let go.

    Attributes
    ----------
    value : float
        The number; set it, observe it. [SI]
    """

    value = traitlets.Float()

    def __init__(self, scale: Scale, value: float, *, continuous_update: bool = True) -> None:
        super().__init__()
        self.add_class("vx-field")
        self.scale = scale
        self.slider = _slider(scale, continuous_update=continuous_update)
        self.field = text_field(scale.label, scale.description)
        self.refusal = Refusal()
        self.children = (self.field, self.slider, self.refusal)
        self.observe(lambda change: self._show(change.new), "value")
        self.slider.observe(self._on_slider, "value")
        self.field.observe(self._on_text, "value")
        self.value = value
        self._show(value)

    def _show(self, value: float, digits: int = 6) -> None:
        self._shown = self.scale.write(value, digits)
        self.field.value = self._shown
        self.refusal.say("")
        coordinate = _coordinate(self.scale, value / self.scale.factor)
        if coordinate is not None:
            # The browser moves its handle to the nearest step and reports that back, so the slider gets the step and
            # the number stays exact.
            self._step = _room_for(self.slider, coordinate)
            _move(self.slider, self.slider.min + self._step * self.slider.step)

    def _on_slider(self, change: Any) -> None:
        coordinate = _coordinate(self.scale, change.new)
        step = None if coordinate is None else round((coordinate - self.slider.min) / self.slider.step)
        if step == self._step:
            return
        self._step = step
        size = float(f"{change.new:.4g}") * self.scale.factor  # the browser's positions carry noise in the last digits
        self.value = math.copysign(size, self.value) if self.scale.is_logarithmic else size

    def _on_text(self, change: Any) -> None:
        if change.new == self._shown:
            self.refusal.say("")
            return
        try:
            number = self.scale.read(change.new)
        except ValueError as refused:
            self.refusal.say(str(refused))
            return
        self.value = number
        self._show(number, digits=12)  # what was typed stays as it was typed

    _shown = ""
    _step: int | None = None


class QuantityField(ipywidgets.VBox):
    """A quantity with its uncertainty, "101.3 ± 0.2 kPa"; empty means that it is not stated.

    Parameters
    ----------
    key : str
        Key of the quantity.
    value : number, (value, standard uncertainty), Estimate or None

    Attributes
    ----------
    value : float, Estimate or None
        [SI]
    """

    value = traitlets.Any(None, allow_none=True)

    def __init__(
        self, key: str, value: Given | None = None, *, label: str = "", placeholder: str = "not stated"
    ) -> None:
        super().__init__()
        self.add_class("vx-field")
        self.key = key
        quantity = QUANTITIES[key]
        self.unit = quantity.display_units.get("SI", quantity.unit)
        self.field = text_field(label or f"{key.replace('_', ' ')} {quantity.text_symbol}", quantity.description)
        self.field.placeholder = placeholder
        self.refusal = Refusal()
        self.children = (self.field, self.refusal)
        self.observe(lambda change: self._show(change.new), "value")
        self.field.observe(self._on_text, "value")
        self.value = value
        self._show(value)

    def _show(self, value: Given | None) -> None:
        self._shown = "" if value is None else units.show(value, self.key)
        self.field.value = self._shown
        self.refusal.say("")

    def _on_text(self, change: Any) -> None:
        if change.new == self._shown:
            self.refusal.say("")
            return
        try:
            given = units.read_quantity(change.new, self.key, default_unit=self.unit) if change.new.strip() else None
        except ValueError as refused:
            self.refusal.say(str(refused))
            return
        self.value = given
        self._show(given)

    _shown = ""


def choice(label: str, options: Any, value: Any, tooltip: str) -> Any:
    """Return a labelled list to choose from."""
    widget = ipywidgets.Dropdown(description=label, options=options, value=value, tooltip=tooltip)
    widget.style.description_width = "initial"
    box = ipywidgets.VBox([widget])
    box.add_class("vx-field")
    box.dropdown = widget
    return box


def text_field(label: str, tooltip: str) -> Any:
    """Return a labelled field for one line of text."""
    field = ipywidgets.Text(description=label, tooltip=tooltip, continuous_update=False)
    field.style.description_width = "initial"
    return field


def _slider(scale: Scale, *, continuous_update: bool) -> Any:
    low, high = (end / scale.factor for end in scale.typical)
    options = {
        "description": scale.label,
        "tooltip": f"{scale.description.rstrip('.')}. Arrow and page keys move it.",
        "readout": False,
        "continuous_update": continuous_update,
    }
    if scale.is_logarithmic:
        low, high = math.log10(low), math.log10(high)
        return ipywidgets.FloatLogSlider(value=10.0**low, min=low, max=high, step=(high - low) / _STEPS, **options)
    return ipywidgets.FloatSlider(value=low, min=low, max=high, step=(high - low) / _STEPS, **options)


def _coordinate(scale: Scale, shown: float) -> float | None:
    """Return where a shown number lies along the slider, None where it has no place (zero among factors)."""
    if not math.isfinite(shown) or (scale.is_logarithmic and shown == 0.0):
        return None
    return math.log10(abs(shown)) if scale.is_logarithmic else shown


def _room_for(slider: Any, coordinate: float) -> int:
    """Move the ends of the slider out to a coordinate, by whole steps, and return the step it is at.

    A slider that stays as it is would clamp the number without a word.
    """
    step: int = round((coordinate - slider.min) / slider.step)
    last = round((slider.max - slider.min) / slider.step)
    if step > last:
        slider.max = slider.min + step * slider.step
    if step < 0:
        slider.min += step * slider.step
    return max(step, 0)


def _move(slider: Any, coordinate: float) -> None:
    position = 10.0**coordinate if isinstance(slider, ipywidgets.FloatLogSlider) else coordinate
    if not math.isclose(position, slider.value, rel_tol=1e-9, abs_tol=1e-9 * slider.step):
        slider.value = position
