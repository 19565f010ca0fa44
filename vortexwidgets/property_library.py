"""The property library behind one door: states checked first, every refusal a sentence."""

from __future__ import annotations

import math
from collections.abc import Callable

from vortexwidgets.fluid_equations import ZERO_CELSIUS
from vortexwidgets.formatting import format_number
from vortexwidgets.uncertainty import Estimate, Given, as_estimate, propagate

State = Callable[[float, float], float]
"""Property from temperature [K] and absolute pressure [Pa]."""

_TRIPLE_POINT = 273.16  # [K] of water; the library answers only above the melting curve


def checked_state(
    name: str, temperature: Given, pressure: Given, range_c: tuple[float, float], range_p: tuple[float, float]
) -> tuple[Estimate, Estimate]:
    """Temperature in kelvin and pressure, both within the range of the fluid's equation."""
    if isinstance(temperature, Estimate):
        t = as_estimate(temperature, "temperature")
    else:
        shown = as_estimate(temperature, "", name="temperature")
        kelvin = shown.value + ZERO_CELSIUS
        if not math.isfinite(kelvin):
            raise ValueError(f"temperature must be a finite number in °C, got {shown.value:g}.")
        if not kelvin > 0.0:
            raise ValueError(
                f"{name} at {shown.value:g} °C is below absolute zero (-273.15 °C); give the temperature in °C."
            )
        t = as_estimate((kelvin, shown.uncertainty), "temperature")
    low, high = range_c
    shown_c = t.value - ZERO_CELSIUS
    if not low - 1e-9 <= shown_c <= high + 1e-9:
        kelvin_hint = ""
        if low <= shown_c - ZERO_CELSIUS <= high:
            kelvin_hint = f" {shown_c:g} K would be {shown_c - ZERO_CELSIUS:g} °C."
        elif low <= shown_c + ZERO_CELSIUS <= high:
            kelvin_hint = f" If {t.value:g} °C was meant, it was given in K."
        raise ValueError(
            f"The equation of {name} holds from {low:g} to {high:g} °C, got {shown_c:.6g} °C; give the temperature of "
            f"the {name} in °C.{kelvin_hint}"
        )
    p = as_estimate(pressure, "ambient_pressure")
    lowest, highest = range_p
    if not lowest <= p.value <= highest:
        raise ValueError(
            f"The equation of {name} holds from {format_number(lowest, 'Pa')} to {format_number(highest, 'Pa')}, got "
            f"{format_number(p.value, 'Pa')}; give the absolute pressure in Pa."
        )
    return t, p


def with_uncertainty(
    function: Callable[..., float],
    t: Estimate,
    p: Estimate,
    relative: float,
    quantity: str,
    third: Estimate | None = None,
) -> Estimate:
    """One property with the uncertainty of the state and of the equation itself."""
    inputs: dict[str, Given] = {"temperature": t, "pressure": p}
    if third is not None:
        inputs[third.quantity] = third
    inputs["equation"] = (1.0, relative)

    def scaled(**values: float) -> float:
        factor = values.pop("equation")
        return factor * function(*values.values())

    return propagate(scaled, inputs, quantity=quantity)


def from_zero(function: State) -> State:
    """Carry a property of water on in a straight line from the triple point down to 0 °C and the steps around it."""
    step = 0.1

    def value(t: float, p: float) -> float:
        if t >= _TRIPLE_POINT:
            return function(t, p)
        first, second = function(_TRIPLE_POINT, p), function(_TRIPLE_POINT + step, p)
        return first + (t - _TRIPLE_POINT) / step * (second - first)

    return value


def library(key: str, name: str, phase: str = "") -> State:
    """Property by the library's own key and fluid, of a given phase even a step beyond where it is stable."""
    temperature = f"T|{phase}" if phase else "T"

    def value(t: float, p: float) -> float:
        from CoolProp.CoolProp import PropsSI

        try:
            return float(PropsSI(key, temperature, t, "P", p, name))
        except ValueError as error:
            raise ValueError(_no_answer(name, t, p, error)) from error

    return value


def saturated(key: str, name: str) -> State:
    """Property of the liquid at its own vapour pressure; the pressure given does not matter."""

    def value(t: float, _: float) -> float:
        from CoolProp.CoolProp import PropsSI

        try:
            return float(PropsSI(key, "T", t, "Q", 0.0, name))
        except ValueError as error:
            raise ValueError(_no_answer(name.removeprefix("IF97::"), t, None, error)) from error

    return value


def moist_air(key: str, temperature: float, pressure: float, humidity: float) -> float:
    """Property of moist air by the library's own key; volume is per mass of moist air."""
    from CoolProp.CoolProp import HAPropsSI

    try:
        return float(HAPropsSI(key, "T", temperature, "P", pressure, "R", min(max(humidity, 0.0), 1.0)))
    except ValueError as error:
        raise ValueError(_no_answer("moist air", temperature, pressure, error)) from error


def phase_of(temperature: float, pressure: float, name: str) -> str:
    """Phase in the library's words, as "liquid" or "supercritical_gas"."""
    from CoolProp.CoolProp import PhaseSI

    return str(PhaseSI("T", temperature, "P", pressure, name))


def _no_answer(name: str, temperature: float, pressure: float | None, error: ValueError) -> str:
    at = "" if pressure is None else f" and {format_number(pressure, 'Pa')}"
    reason = str(error).split(" : PropsSI")[0].strip()[:160]
    return (
        f"There are no properties of {name.lower()} at {temperature:.6g} K{at}: {reason}. Give a "
        "temperature and pressure at which it is a fluid."
    )


def celsius(temperature: Estimate) -> str:
    """Write a temperature for a message."""
    return f"{temperature.value - ZERO_CELSIUS:.4g} °C"
