"""The border: reads and writes mm, ft, kn, psi, inHg ...; inside, everything is SI floats."""

from __future__ import annotations

import functools
import math
import re
from typing import TYPE_CHECKING, Any

from vortexwidgets.quantities import Quantity, check, quantity_named
from vortexwidgets.uncertainty import Estimate, Given, as_estimate

if TYPE_CHECKING:
    import pint

LONGEST = 80
"""Characters of a quantity; what is longer is no number."""

_NUMBER = r"[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d+|\s?[x×·*]\s?10\s?\^\s?[+-]?\d+)?"
_FACTOR = r"(?:1|(?:[A-Za-zµ°]+(?:2O)?)(?:\^?-?\d)?)"
_UNIT = rf"{_FACTOR}(?:[*/]{_FACTOR}){{0,5}}"
_PLUS_MINUS = re.compile(r"±|\+/-|\+-")

_SIGNS = str.maketrans({"−": "-", "–": "-", "\u00a0": " ", "\u202f": " ", "\u2009": " ", "μ": "µ", "º": "°", "⋅": "·"})
_SUPERSCRIPTS = str.maketrans("⁻⁺⁰¹²³⁴⁵⁶⁷⁸⁹", "-+0123456789")

# Kelvin from the scales of temperature; exact (NIST SP 811, 2008, B.8).
_TEMPERATURES = {
    "K": (1.0, 0.0),
    "°C": (1.0, 273.15),
    "°F": (5.0 / 9.0, 459.67 * 5.0 / 9.0),
    "°R": (5.0 / 9.0, 0.0),
}
_TEMPERATURE_NAMES = {
    "k": "K", "kelvin": "K", "degk": "K", "c": "°C", "°c": "°C", "degc": "°C", "celsius": "°C", "centigrade": "°C",
    "degreecelsius": "°C", "degreescelsius": "°C", "f": "°F", "°f": "°F", "degf": "°F", "fahrenheit": "°F",
    "degreesfahrenheit": "°F", "°r": "°R", "degr": "°R", "rankine": "°R",
}  # fmt: skip

# What people write -> what the unit library reads, by SI unit. Common practice.
_ALIASES: dict[str, dict[str, str]] = {
    "m/s": {"kn": "knot", "kt": "knot", "kts": "knot", "knots": "knot", "ms-1": "m/s", "mps": "m/s", "kmh": "km/h",
            "kph": "km/h", "fps": "ft/s", "ips": "inch/s", "cmps": "cm/s", "mmps": "mm/s"},
    "Pa": {"mb": "mbar", "psia": "psi", "bara": "bar", "kpaa": "kPa", "inhg": "inHg", "inch hg": "inHg", "mmhg": "mmHg",
           "inh2o": "inH2O", "mmh2o": "mmH2O", "mh2o": "mH2O", "pa": "Pa", "kpa": "kPa", "hpa": "hPa", "mpa": "MPa"},
    "m": {"ins": "inch", "mtr": "m"},
    "m/s²": {"g": "gravity"},
}  # fmt: skip
_GAUGE = {"psig", "barg", "kpag", "mbarg", "pag"}

# g/kg in one unit of practical salinity: F. J. Millero et al., Deep-Sea Research I 55 (2008) 50-72
_SALINITIES = {"": 1.0, "g/kg": 1.0, "ppt": 1.0, "‰": 1.0, "psu": 35.16504 / 35.0, "%": 10.0, "kg/kg": 1000.0}
_FRACTIONS = {"": 1.0, "1": 1.0, "-": 1.0, "%": 0.01}

_DIMENSIONS = {
    "m": "a length", "m/s": "a speed", "m²/s": "a length times a speed", "Pa": "a pressure",
    "Pa/s": "a pressure per time", "K": "a temperature", "kg/m³": "a density", "N/m": "a force per length",
    "rad/s": "a rate of rotation", "1/s": "one over a time", "m/s²": "an acceleration", "s": "a time",
    "rad": "an angle", "g/kg": "a salinity", "": "a plain number or %",
}  # fmt: skip


def parse_number(text: str) -> float:
    """Read one plain number as people write it.

    Parameters
    ----------
    text : str
        With a decimal point or a decimal comma, a power of ten as e-6 or × 10⁻⁶; no thousands separators.

    Returns
    -------
    float

    Raises
    ------
    ValueError
        If it is anything else, or not finite.

    Examples
    --------
    >>> parse_number("1,5"), parse_number("1e-6"), parse_number("2.5 × 10⁻³")
    (1.5, 1e-06, 0.0025)
    """
    plain = _plain(text)
    if not re.fullmatch(_NUMBER, plain):
        raise ValueError(
            f"'{_shown(text)}' is not a number; write for example 1.5, 1,5 or 1.5e-3, without thousands separators."
        )
    number = float(re.sub(r"\s?[x×·*]\s?10\s?\^\s?", "e", plain).replace(",", "."))
    if not math.isfinite(number):
        raise ValueError(f"'{_shown(text)}' is too large for a number; check its power of ten.")
    return number


def read_quantity(text: str, quantity: str, *, default_unit: str | None = None) -> Estimate | float:
    """Read a quantity with its unit and, where it is stated, its standard uncertainty.

    Parameters
    ----------
    text : str
        "15.2 mm", "59 °F", "1,5 mm", "101.3 ± 0.2 kPa", "12 m/s ± 1 %". A percentage after ± is relative, unless the
        value is a percentage itself.
    quantity : str
        Key of the quantity.
    default_unit : str, optional
        Unit of a bare number; without one a bare number is refused unless the quantity is a plain number.

    Returns
    -------
    float or Estimate
        [SI]

    Raises
    ------
    ValueError
        If it is no number with a unit, the unit is missing, unknown or of another dimension, or the value is outside
        the quantity's range.

    Examples
    --------
    >>> read_quantity("15.2 mm", "core_radius")
    0.0152
    >>> print(read_quantity("101.3 ± 0.2 kPa", "ambient_pressure"))
    101.30 ± 0.20 kPa
    """
    entry = quantity_named(quantity)
    plain = _plain(text)
    if not plain:
        raise ValueError(f"{quantity} is empty; write for example '{_example(entry)}'.")
    bracketed = re.fullmatch(r"\(([^()]*)\)\s*(.*)", plain)
    if bracketed and _PLUS_MINUS.search(bracketed.group(1)):
        plain = f"{bracketed.group(1).strip()} {bracketed.group(2)}".strip()
    parts = _PLUS_MINUS.split(plain)
    if len(parts) > 2:
        raise ValueError(f"'{_shown(text)}' has more than one ±; write for example '{_example(entry)}'.")
    value, unit = _number_and_unit(parts[0], text, entry)
    if len(parts) == 1:
        scale, offset = factor(_unit_or_default(unit, default_unit, text, entry), quantity)
        return check(quantity, value * scale + offset)
    spread, spread_unit = _number_and_unit(parts[1], text, entry)
    if spread < 0.0:
        raise ValueError(f"The uncertainty in '{_shown(text)}' is negative; write it without a sign.")
    if spread_unit == "%" and unit != "%":
        scale, offset = factor(_unit_or_default(unit, default_unit, text, entry), quantity)
        return as_estimate((value * scale + offset, 0.01 * spread * abs(value * scale)), quantity)
    scale, offset = factor(_unit_or_default(unit or spread_unit, default_unit, text, entry), quantity)
    own_scale = factor(spread_unit, quantity)[0] if spread_unit else scale
    return as_estimate((value * scale + offset, spread * own_scale), quantity)


def factor(unit_text: str, quantity: str) -> tuple[float, float]:
    """Scale and offset from a unit to SI: SI = value · scale + offset.

    Parameters
    ----------
    unit_text : str
        As "mm", "ft/s", "inHg", "°F"; empty for a plain number.
    quantity : str
        Key of the quantity.

    Returns
    -------
    tuple of float

    Raises
    ------
    ValueError
        If the unit is not known, of another dimension, or a gauge pressure.

    Examples
    --------
    >>> factor("mm", "core_radius"), factor("°C", "temperature")
    ((0.001, 0.0), (1.0, 273.15))
    """
    entry = quantity_named(quantity)
    unit = _plain(unit_text)
    closed = unit.replace(" ", "")
    if entry.unit == "K":
        name = _TEMPERATURE_NAMES.get(closed.lower())
        if name is not None:
            return _TEMPERATURES[name]
    if entry.unit == "g/kg":
        size = _SALINITIES.get(closed.lower())
        if size is not None:
            return size, 0.0
    if entry.unit == "":
        if closed not in _FRACTIONS:
            raise ValueError(_refusal(unit_text, entry, "is not a unit of"))
        return _FRACTIONS[closed], 0.0
    if entry.unit == "Pa" and re.sub(r"[()\s]", "", unit).lower() in _GAUGE:
        raise ValueError(
            f"'{_shown(unit_text)}' is a gauge pressure and {entry.name} is absolute; add the atmospheric pressure and "
            "write for example '101.3 kPa'."
        )
    if entry.unit == "rad/s" and closed.lower() in ("hz", "khz", "1/s", "s^-1"):
        raise ValueError(
            f"'{_shown(unit_text)}' leaves open whether turns or radians are counted; write rpm or rad/s for "
            f"{entry.name}."
        )
    aliases = _ALIASES.get(entry.unit, {})
    return _library_factor(aliases.get(unit.lower(), aliases.get(closed.lower(), unit)), unit_text, entry)


def show(value: Given, quantity: str, system: str = "SI") -> str:
    """Write a quantity in the unit people use, in digits enough to read it back with `read_quantity`.

    Parameters
    ----------
    value : float, (float, float) or Estimate
        [SI]
    quantity : str
        Key of the quantity.
    system : "SI" or "US"

    Returns
    -------
    str

    Raises
    ------
    ValueError
        If the system is neither.

    Examples
    --------
    >>> show(0.0152, "core_radius"), show((288.15, 0.2), "temperature"), show(0.3048, "depth", "US")
    ('15.2 mm', '15 ± 0.2 °C', '1 ft')
    """
    if system not in ("SI", "US"):
        raise ValueError(f"The system of units must be 'SI' or 'US', got {system!r:.40}.")
    entry = quantity_named(quantity)
    unit = entry.display_units.get(system, entry.unit)
    scale, offset = factor(unit, quantity)
    if isinstance(value, Estimate):
        number, spread = value.value, value.uncertainty
    elif isinstance(value, tuple):
        number, spread = value
    else:
        number, spread = value, 0.0
    text = f"{(number - offset) / scale:.12g}"
    if spread != 0.0 and math.isfinite(spread):
        text += f" ± {spread / scale:.12g}"
    return f"{text} {unit}".strip()


# Texts --------------------------------------------------------------------------------------------------------------


def _plain(text: str) -> str:
    """Typographic signs to the keyboard's; superscripts to ^."""
    if not isinstance(text, str):
        raise ValueError(f"A quantity is read from text, got {text!r:.60}.")
    if len(text) > LONGEST:
        raise ValueError(f"'{_shown(text)}' has {len(text)} characters; a number with its unit has at most {LONGEST}.")
    plain = text.translate(_SIGNS).strip()
    plain = re.sub(r"[⁻⁺⁰¹²³⁴⁵⁶⁷⁸⁹]+", lambda found: "^" + found.group().translate(_SUPERSCRIPTS), plain)
    if not all(sign.isascii() or sign in "±×·µ°‰" for sign in plain):
        raise ValueError(f"'{_shown(text)}' holds signs that belong to no number or unit; type it again.")
    return plain


def _shown(text: str) -> str:
    return "".join(sign if sign.isprintable() else " " for sign in text[:40])


def _number_and_unit(part: str, text: str, entry: Quantity) -> tuple[float, str]:
    found = re.match(rf"({_NUMBER})(?!\s*(?!1/)[\d.,])\s*(.*)$", part.strip())
    if not found:
        raise ValueError(
            f"'{_shown(text)}' is not a number with a unit; write for example '{_example(entry)}', without thousands "
            "separators."
        )
    return parse_number(found.group(1)), found.group(2).strip()


def _unit_or_default(unit: str, default: str | None, text: str, entry: Quantity) -> str:
    if unit or default is not None:
        return unit or str(default)
    if entry.unit and entry.unit != "g/kg":
        raise ValueError(f"'{_shown(text)}' has no unit; write {entry.name} as {_DIMENSIONS[entry.unit]}, for example "
                         f"'{_example(entry)}'.")  # fmt: skip
    return unit


def _example(entry: Quantity) -> str:
    low, high = entry.typical
    scale, offset = factor(entry.display_units.get("SI", entry.unit), entry.key)
    middle = math.sqrt(low * high) if low > 0.0 else 0.5 * (low + high)
    return f"{float(f'{(middle - offset) / scale:.2g}'):g} {entry.display_units.get('SI', entry.unit)}".strip()


def _refusal(unit: str, entry: Quantity, what: str) -> str:
    return (
        f"'{_shown(unit)}' {what} {entry.name}, which is {_DIMENSIONS[entry.unit]}; write for example "
        f"'{_example(entry)}'."
    )


# The unit library ---------------------------------------------------------------------------------------------------


@functools.cache
def _registry() -> pint.UnitRegistry[Any]:
    import pint

    return pint.UnitRegistry()


@functools.cache
def _library_factor(unit: str, written: str, entry: Quantity) -> tuple[float, float]:
    """Ask the unit library; only names, powers, * and / ever reach it."""
    import pint

    text = re.sub(r"\s*([*/·.])\s*", r"\1", unit.strip()).replace("·", "*").replace(".", "*")
    text = re.sub(r"\s+", "*", text)
    if not re.fullmatch(_UNIT, text):
        raise ValueError(_refusal(written, entry, "is not a unit of") if unit else _no_unit(entry))
    text = re.sub(r"(?<=[A-Za-zµ°])\^?(-?\d)(?![\dA-Za-z])", r"**\1", text)
    try:
        parsed = _registry().parse_units(text.replace("*1/", "/").removeprefix("1*"))
    except (pint.UndefinedUnitError, pint.DefinitionSyntaxError, ValueError, TypeError, AttributeError) as error:
        raise ValueError(_refusal(written, entry, "is not a known unit of")) from error
    try:
        size = _registry().Quantity(1.0, parsed).to(_library_name(entry.unit)).magnitude
    except pint.DimensionalityError as error:
        raise ValueError(_refusal(written, entry, "is not a unit of")) from error
    return float(size), 0.0


def _library_name(unit: str) -> str:
    return unit.replace("²", "**2").replace("³", "**3")


def _no_unit(entry: Quantity) -> str:
    return f"{entry.name} has no unit; it is {_DIMENSIONS[entry.unit]}, for example '{_example(entry)}'."
