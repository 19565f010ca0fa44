"""Numbers and names of the record as words."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from typing import Any

from vortexwidgets.formatting import format_estimate, format_number, scale_for
from vortexwidgets.quantities import QUANTITIES
from vortexwidgets.uncertainty import Estimate

Row = tuple[str, str]

_LEVEL = 0.95
_INTERVAL = " (95 %: "  # what formatting puts before the interval


def when(stamp: str) -> str:
    """Return a time of the record as a person writes it.

    Examples
    --------
    >>> when("2026-03-01T09:30:00+00:00")
    '2026-03-01 09:30 UTC'
    """
    from datetime import UTC, datetime

    try:
        return f"{datetime.fromisoformat(stamp).astimezone(UTC):%Y-%m-%d %H:%M} UTC"
    except ValueError:
        return stamp


def value_rows(value: Any, *, skip: Sequence[str] = ()) -> list[Row]:
    """Name and text of every field of a dataclass that says something."""
    return [
        (words(field.name), shown(field.name, getattr(value, field.name)))
        for field in dataclasses.fields(value)
        if field.name not in skip and not field.name.startswith("_") and getattr(value, field.name) is not None
    ]


def probability(chance: float | None) -> str:
    """Return a probability as text, never as a certainty that nobody has.

    Examples
    --------
    >>> probability(0.342), probability(0.99999), probability(None)
    ('0.34', '> 0.999', 'not known')
    """
    if chance is None or math.isnan(chance):
        return "not known"
    if chance < 0.001:
        return "< 0.001"
    if chance > 0.999:
        return "> 0.999"
    return f"{chance:.2f}" if 0.01 <= chance <= 0.99 else f"{chance:.3f}"


def value_text(estimate: Estimate | None) -> str:
    """An estimate as text; what was not given says so."""
    return "not given" if estimate is None else format_estimate(estimate)


def interval_text(estimate: Estimate | None) -> str:
    """The 95 % interval of an estimate as text, empty where there is none."""
    if estimate is None or estimate.bound is not None or not math.isfinite(estimate.value):
        return ""
    text = format_estimate(estimate, level=_LEVEL)
    return text.partition(_INTERVAL)[2].removesuffix(")")


def full_text(estimate: Estimate) -> str:
    """An estimate with its 95 % interval as text."""
    return format_estimate(estimate, level=_LEVEL) if interval_text(estimate) else format_estimate(estimate)


def in_unit_of(whole: float, part: float, unit: str) -> str:
    """Return a part of a whole in the unit and to the decimals that suit the whole, so that parts can be compared.

    Examples
    --------
    >>> in_unit_of(1300.0, 71.23, "Pa"), in_unit_of(1300.0, 0.07, "Pa"), in_unit_of(1300.0, 1300.0, "Pa")
    ('0.07 kPa', '0.00 kPa', '1.30 kPa')
    """
    scale = scale_for(unit, whole)
    size = abs(whole) / scale.size
    decimals = max(2 - math.floor(math.log10(size)), 0) if 0.0 < size < math.inf else 2
    return f"{part / scale.size:.{decimals}f} {scale.text}".rstrip()


def p_value_text(chance: float) -> str:
    """Return a p-value as text; below the last digit that a chi² test can bear only that.

    Examples
    --------
    >>> p_value_text(0.4834), p_value_text(8e-26), p_value_text(0.0)
    ('0.48', '< 0.0001', '< 0.0001')
    """
    return "< 0.0001" if chance < 1e-4 else format_number(chance, "", 2)


def shown(name: str, value: Any) -> str:
    """A field of this name as text, a number in the unit of its quantity."""
    if isinstance(value, Estimate):
        return format_estimate(value)
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        quantity = QUANTITIES.get(name)
        return format_number(float(value), quantity.unit if quantity else "")
    return str(value)


def number_text(value: float, unit: str = "", *, digits: int | None = None, figures: int = 3) -> str:
    """A plain number as text, to decimals or to significant figures."""
    if math.isnan(value):
        return "undetermined"
    if math.isinf(value):
        return "∞"
    text = f"{value:.{figures}g}" if digits is None else f"{value:.{digits}f}"
    return f"{text} {unit}".rstrip()


def words(name: str) -> str:
    """A name as words."""
    return name.replace("_", " ")
