"""Numbers for people: "0.830 ± 0.012 m²/s", tables."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal, Protocol

from vortexwidgets.quantities import QUANTITIES, quantity_named

Bound = Literal["lower", "upper"] | None


class Formattable(Protocol):
    """What is needed of an Estimate to write it."""

    @property
    def value(self) -> float:
        """Best estimate, or the limit itself. [SI]"""

    @property
    def uncertainty(self) -> float:
        """Standard uncertainty. [SI]"""

    @property
    def quantity(self) -> str:
        """Key of the quantity."""

    @property
    def bound(self) -> Bound:
        """Which side is known, when only one is."""

    def interval(self, level: float = 0.95) -> tuple[float, float]:
        """Coverage interval. [SI]"""


@dataclass(frozen=True)
class Scale:
    """A unit in which a number is shown: shown = (SI value - zero) / size."""

    text: str
    size: float
    zero: float = 0.0


# Units that a number may be shown in, by SI unit and then by every name they go by. Sizes are exact by definition
# (NIST SP 811, 2008, appendix B), psi and inHg rounded to the digits printed there.
_SCALES: dict[str, tuple[tuple[Scale, tuple[str, ...]], ...]] = {
    "m": (
        (Scale("km", 1e3), ()), (Scale("m", 1.0), ()), (Scale("cm", 1e-2), ()), (Scale("mm", 1e-3), ()),
        (Scale("µm", 1e-6), ("um", "μm")), (Scale("nm", 1e-9), ()), (Scale("in", 0.0254), ("inch",)),
        (Scale("ft", 0.3048), ("foot",)),
    ),
    "Pa": (
        (Scale("MPa", 1e6), ()), (Scale("kPa", 1e3), ()), (Scale("hPa", 1e2), ("mbar",)), (Scale("bar", 1e5), ()),
        (Scale("Pa", 1.0), ()), (Scale("mPa", 1e-3), ()), (Scale("psi", 6894.757), ()), (Scale("inHg", 3386.389), ()),
    ),
    "Pa/s": (
        (Scale("kPa/s", 1e3), ()), (Scale("hPa/s", 1e2), ("mbar/s",)), (Scale("Pa/s", 1.0), ()),
        (Scale("psi/s", 6894.757), ()),
    ),
    "m/s": (
        (Scale("m/s", 1.0), ()), (Scale("mm/s", 1e-3), ()), (Scale("cm/s", 1e-2), ()), (Scale("ft/s", 0.3048), ()),
        (Scale("km/h", 1 / 3.6), ()), (Scale("mph", 0.44704), ()), (Scale("kn", 1852 / 3600), ("knot",)),
    ),
    "m²/s": (
        (Scale("m²/s", 1.0), ("m^2/s", "m2/s")), (Scale("mm²/s", 1e-6), ("mm^2/s", "mm2/s")),
        (Scale("cm²/s", 1e-4), ("cm^2/s", "cm2/s")), (Scale("ft²/s", 0.3048**2), ("ft^2/s", "ft2/s")),
    ),
    "K": (
        (Scale("K", 1.0), ("kelvin",)), (Scale("°C", 1.0, 273.15), ("degC",)),
        (Scale("°F", 5 / 9, 459.67 * 5 / 9), ("degF",)),
    ),
    "N/m": ((Scale("N/m", 1.0), ()), (Scale("mN/m", 1e-3), ())),
    "kg/m³": (
        (Scale("kg/m³", 1.0), ("kg/m^3", "kg/m3")),
        (Scale("lb/ft³", 0.45359237 / 0.3048**3), ("lb/ft^3", "lb/ft3")),
    ),
    "rad/s": ((Scale("rad/s", 1.0), ()), (Scale("rpm", math.pi / 30.0), ("1/min",))),
    "rad": ((Scale("rad", 1.0), ()), (Scale("°", math.pi / 180.0), ("deg",))),
    "s": ((Scale("s", 1.0), ()), (Scale("ms", 1e-3), ()), (Scale("min", 60.0), ()), (Scale("h", 3600.0), ())),
}  # fmt: skip

# SI unit -> (smallest size shown, unit), largest first: the unit that leaves 0.1 to 1000 in front of it.
_LADDERS: dict[str, tuple[tuple[float, str], ...]] = {
    "m": ((1e4, "km"), (1.0, "m"), (1e-4, "mm"), (0.0, "µm")),
    "Pa": ((1e7, "MPa"), (1e3, "kPa"), (0.1, "Pa"), (0.0, "mPa")),
    "Pa/s": ((1e3, "kPa/s"), (0.0, "Pa/s")),
    "K": ((0.0, "°C"),),
    "N/m": ((0.0, "mN/m"),),
    "m/s": ((0.05, "m/s"), (0.0, "mm/s")),
}

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
UNDETERMINED = "undetermined"


def scale_for(unit: str, value: float = math.nan, wanted: str | None = None) -> Scale:
    """Choose the unit in which a value is shown.

    Parameters
    ----------
    unit : str
        SI unit.
    value : float
        Decides between mm and m, Pa and kPa. [SI]
    wanted : str, optional
        The unit a person asked for.

    Returns
    -------
    Scale

    Raises
    ------
    ValueError
        If the wanted unit is not one of those that the SI unit can be shown in.
    """
    if wanted is None:
        size = abs(value)
        ladder = _LADDERS.get(unit)
        if ladder is None or (unit != "K" and (size == 0.0 or not math.isfinite(size))):
            return Scale(unit, 1.0)
        wanted = next((name for smallest, name in ladder if size >= smallest * (1.0 - 1e-12)), ladder[-1][1])
    if wanted == unit:
        return Scale(unit, 1.0)
    for scale, others in _SCALES.get(unit, ()):
        if wanted == scale.text or wanted in others:
            return Scale(wanted if unit != "K" else scale.text, scale.size, scale.zero)
    known = ", ".join(scale.text for scale, _ in _SCALES.get(unit, ()))
    raise ValueError(
        f"A value in {unit or 'plain numbers'} cannot be shown in '{wanted}'; known are {known or 'none'}."
    )


def format_number(value: float, unit: str = "", digits: int = 4) -> str:
    """Write a number in a unit that suits its size.

    Parameters
    ----------
    value : float
        [SI]
    unit : str
        SI unit, or the key of a quantity.
    digits : int
        Significant digits.

    Returns
    -------
    str

    Examples
    --------
    >>> format_number(0.0125, "m"), format_number(101325.0, "Pa"), format_number(1.139e-6, "m²/s")
    ('12.50 mm', '101.3 kPa', '1.139 × 10⁻⁶ m²/s')
    """
    if unit in QUANTITIES:
        unit = QUANTITIES[unit].unit
    if math.isnan(value):
        return UNDETERMINED
    scale = scale_for(unit, value)
    return _with_unit(_significant((value - scale.zero) / scale.size, digits), scale.text)


def format_estimate(estimate: Formattable, unit: str | None = None, level: float | None = None) -> str:
    """Write a value with its standard uncertainty, whose size sets the digits of both.

    Parameters
    ----------
    estimate : Estimate
    unit : str, optional
        Unit to write it in, as kPa or psi; chosen by the size of the value by default.
    level : float, optional
        Adds the coverage interval of this probability.

    Returns
    -------
    str
        "±" is the standard uncertainty (k = 1). A limit reads "at least" or "at most".

    Raises
    ------
    ValueError
        If the unit does not fit the quantity.

    Notes
    -----
    The rounding rule of the Particle Data Group [1]_: of the three leading digits of the uncertainty, 100 to 354 keep
    two digits, 355 to 949 keep one, 950 to 999 are rounded up to 1000 and keep two.

    References
    ----------
    .. [1] Particle Data Group, Review of Particle Physics, Prog. Theor. Exp. Phys. 2022, 083C01,
       Introduction, section 5.3.

    Examples
    --------
    The examples that the Particle Data Group prints: 0.827 ± 0.119 becomes 0.83 ± 0.12, and 0.827 ± 0.367 becomes
    0.8 ± 0.4.

    >>> from vortexwidgets.uncertainty import Estimate
    >>> format_estimate(Estimate(0.827, 0.119)), format_estimate(Estimate(0.827, 0.367))
    ('0.83 ± 0.12', '0.8 ± 0.4')
    >>> format_estimate(Estimate(1234.0, 56.0, "core_pressure_drop"), level=0.95)
    '1.23 ± 0.06 kPa (95 %: 1.12 to 1.34 kPa)'
    """
    si_unit = quantity_named(estimate.quantity).unit if estimate.quantity else ""
    value, uncertainty = estimate.value, estimate.uncertainty
    if math.isnan(value):
        return UNDETERMINED
    scale = scale_for(si_unit, _size(value, uncertainty), unit)
    shown = (value - scale.zero) / scale.size
    if estimate.bound is not None:
        word = "at least" if estimate.bound == "lower" else "at most"
        return f"{word} {_with_unit(_significant(shown, 3), scale.text)}"
    own = uncertainty / scale.size
    if not math.isfinite(own):
        return f"{_with_unit(_significant(shown, 4), scale.text)} (uncertainty unknown)"
    if own == 0.0:
        text = _with_unit(_shortest(shown), scale.text)
        return text if level is None else f"{text} (exact)"
    own, decimals = _rounding(own)
    text = _pair(shown, own, decimals, scale.text)
    if level is None:
        return text
    ends = tuple((end - scale.zero) / scale.size for end in estimate.interval(level))
    low, high = (_rounded(end, decimals) for end in ends)
    if "×" in text:
        low, high = (_significant(end, 3) for end in ends)
    return f"{text} ({100 * level:.4g} %: {_with_unit(f'{low} to {high}', scale.text)})"


def table(rows: Iterable[Sequence[object]], header: Sequence[str] = ()) -> str:
    """Lay out rows as plain text in aligned columns.

    Parameters
    ----------
    rows : iterable of sequences
        Cells are written with `str`; a short row is filled with blanks.
    header : sequence of str
        Column names, underlined.

    Returns
    -------
    str
        Without trailing blanks. Columns of numbers are aligned on the right.

    Examples
    --------
    >>> print(table([["rankine", 1], ["lamb-oseen", 1.7]], ["model", "K"]))
    model         K
    ----------  ---
    rankine       1
    lamb-oseen  1.7
    """
    body = [[str(cell).replace("\n", " ") for cell in row] for row in rows]
    names = [str(name) for name in header]
    columns = max((len(row) for row in [names, *body]), default=0)
    if columns == 0:
        return ""
    body = [row + [""] * (columns - len(row)) for row in body]
    names = names + [""] * (columns - len(names)) if names else []
    widths = [max(_width(row[i]) for row in [names or [""] * columns, *body]) for i in range(columns)]
    right = [bool(body) and all(_is_number(row[i]) or not row[i] for row in body) for i in range(columns)]
    lines = [_line(names, widths, right), "  ".join("-" * width for width in widths)] if names else []
    lines += [_line(row, widths, right) for row in body]
    return "\n".join(lines)


def _line(row: Sequence[str], widths: Sequence[int], right: Sequence[bool]) -> str:
    cells = []
    for cell, width, is_right in zip(row, widths, right, strict=True):
        blanks = " " * (width - _width(cell))
        cells.append(blanks + cell if is_right else cell + blanks)
    return "  ".join(cells).rstrip()


def _width(text: str) -> int:
    """Columns that a text takes in a terminal."""
    return sum(
        0 if unicodedata.combining(sign) else 2 if unicodedata.east_asian_width(sign) in "WF" else 1 for sign in text
    )


def _is_number(cell: str) -> bool:
    try:
        float(cell.removesuffix("%").strip())
    except ValueError:
        return False
    return True


def _size(value: float, uncertainty: float) -> float:
    """What decides the unit: the value, or the uncertainty where that is larger."""
    return max(abs(value), uncertainty) if math.isfinite(uncertainty) else abs(value)


def _with_unit(text: str, unit: str) -> str:
    return f"{text} {unit}" if unit else text


def _rounding(uncertainty: float) -> tuple[float, int]:
    """Uncertainty, and the decimals to which it and its value are rounded; negative = tens, hundreds."""
    exponent = math.floor(math.log10(uncertainty))
    leading = round(uncertainty / 10.0 ** (exponent - 2))
    if leading >= 1000:  # rounding carried
        leading, exponent = 100, exponent + 1
    if leading < 355:
        return uncertainty, 1 - exponent
    # 950 and above become 1000, whose two digits end at the same decimal
    return (uncertainty if leading < 950 else 10.0 ** (exponent + 1)), -exponent


def _rounded(value: float, decimals: int) -> str:
    if not math.isfinite(value):
        return "∞" if value > 0 else "-∞"
    text = f"{round(value, decimals):.{max(decimals, 0)}f}"
    return text.removeprefix("-") if float(text) == 0.0 else text


def _pair(value: float, uncertainty: float, decimals: int, unit: str) -> str:
    largest = max(abs(value), uncertainty)
    power = math.floor(math.log10(largest))
    if -4 < power < 6 and decimals <= 7:
        return _with_unit(f"{_rounded(value, decimals)} ± {_rounded(uncertainty, decimals)}", unit)
    factor = 10.0**power
    within = decimals + power
    text = f"({_rounded(value / factor, within)} ± {_rounded(uncertainty / factor, within)}) × 10{_exponent(power)}"
    return _with_unit(text, unit)


def _exponent(power: int) -> str:
    return str(power).translate(_SUPERSCRIPT)


def _significant(value: float, digits: int) -> str:
    """Write a number to a number of significant digits, trailing zeros kept."""
    if math.isinf(value):
        return "∞" if value > 0 else "-∞"
    if value == 0.0:
        return "0"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    power = int(exponent)
    if not -4 < power < 6:
        return f"{mantissa} × 10{_exponent(power)}"
    return f"{round(value, digits - 1 - power):.{max(digits - 1 - power, 0)}f}"


def _shortest(value: float) -> str:
    """Write an exact number with no more digits than it needs, at most seven."""
    text = f"{value:.7g}"
    if "e" not in text:
        return text
    mantissa, exponent = text.split("e")
    return f"{mantissa} × 10{_exponent(int(exponent))}"


def percent(share: float) -> str:
    """Return a share as text.

    Examples
    --------
    >>> percent(0.1234), percent(3e-7), percent(0.0)
    ('12.3 %', '< 0.1 %', '0 %')
    """
    if math.isnan(share):
        return "undetermined"
    if 0.0 < share < 0.001:
        return "< 0.1 %"
    return f"{100.0 * share:.1f} %" if share else "0 %"
