"""Facts: the `key: value` comments of a survey file, in SI units and in the words of this package."""

from __future__ import annotations

import dataclasses
import difflib
import re
from collections.abc import Iterable
from dataclasses import dataclass
from statistics import NormalDist

from vortexwidgets import units
from vortexwidgets.survey.samples import FACT_QUANTITIES, SurveyError
from vortexwidgets.uncertainty import Estimate

# Keys as people write them -> the fact. Common practice.
_KEYS: dict[str, tuple[str, ...]] = {
    "title": ("title", "name", "survey", "test"),
    "fluid": ("fluid", "medium"),
    "temperature": ("temperature", "fluid temperature", "water temperature", "air temperature"),
    "salinity": ("salinity",),
    "humidity": ("humidity", "relative humidity"),
    "ambient_pressure": ("ambient pressure", "static pressure", "p inf", "absolute pressure", "reference pressure"),
    "surface_pressure": ("surface pressure", "atmospheric pressure", "barometric pressure", "barometer"),
    "depth": ("depth", "depth of axis", "depth of survey"),
    "submergence": ("submergence", "submergence of intake", "intake depth"),
    "free_stream": (
        "free stream",
        "free stream speed",
        "free stream velocity",
        "u inf",
        "uinf",
        "v inf",
        "vinf",
        "freestream",
        "freestream velocity",
        "u0",
        "u",
        "speed",
        "tunnel speed",
    ),
    "free_stream_name": ("free stream name", "speed name"),
    "orientation": ("orientation",),
    "density": ("density", "fluid density", "rho", "ρ"),
    "kinematic_viscosity": ("viscosity", "kinematic viscosity", "nu", "ν"),
    "vapour_pressure": ("vapour pressure", "vapor pressure", "saturation pressure"),
    "surface_tension": ("surface tension",),
    "elevation": ("elevation", "altitude"),
    "gravity": ("gravity", "g"),
    "wander": ("wander", "meander", "wandering"),
    "probe_width": ("probe width", "probe size", "measuring volume", "interrogation window"),
    "averaging": ("averaging", "probe averaging"),
    "translation_speed": ("translation speed", "translation"),
    "length_scale": ("length scale", "chord", "chord length", "reference length", "c"),
    "velocity_scale": ("velocity scale", "reference velocity", "reference speed"),
    "reference_radius": ("reference radius", "pipe radius", "wall radius"),
    "tensile_strength": ("tensile strength",),
    "gas_saturation": ("gas saturation", "air content"),
    "inception": ("inception",),
    "miss_distance": ("miss distance", "missed axis by", "offset of line"),
    "velocity_gain": ("velocity gain", "gain", "velocity gain uncertainty", "gain uncertainty"),
    "position_scale": ("position scale", "position scale uncertainty", "scale uncertainty"),
    "uncertainty": ("uncertainty", "velocity uncertainty", "uncertainty of velocity", "noise"),
    "coverage_factor": ("coverage factor", "coverage factor k", "uncertainty coverage factor", "coverage", "k"),
    "samples": ("samples", "number of samples", "n samples", "samples per point", "samples per position", "n"),
    "effective_samples": (
        "effective samples", "independent samples", "effective number of samples", "n eff", "neff",
    ),
    "axes": ("axes", "axis directions"),
    "view": ("view", "view from", "viewed from", "seen from", "looking"),
    "vortex_axis": ("vortex axis", "axis of vortex", "axis of the vortex"),
}  # fmt: skip
_FACT = {key: fact for fact, keys in _KEYS.items() for key in keys}

_WORDS = {  # facts with a short list of values
    "orientation": {
        "surface": "surface", "free surface": "surface", "vertical to the surface": "surface", "submerged": "submerged",
        "air": "air", "in air": "air",
    },
    "averaging": {"along": "along", "across": "across", "square": "square"},
    "inception": {"incipient": "incipient", "desinent": "desinent"},
    "view": {
        "upstream": "upstream", "from upstream": "upstream", "looking downstream": "upstream",
        "downstream": "downstream", "from downstream": "downstream", "looking upstream": "downstream",
    },
    "vortex_axis": {"x": "x", "y": "y", "z": "z"},
}  # fmt: skip
_FREE_TEXT = ("title", "fluid", "free_stream_name")
_PLAIN_NUMBERS = ("gas_saturation", "humidity", "coverage_factor", "samples", "effective_samples")
_FACTORS = ("velocity_gain", "position_scale")
_OTHER_QUANTITIES = {"velocity_scale": "free_stream", "uncertainty": "velocity", "miss_distance": "miss_distance"}
LONGEST_TEXT = 300


@dataclass(frozen=True)
class Facts:
    """Facts of one file by name, and what was noticed while reading them."""

    values: dict[str, str | float | Estimate]
    notes: tuple[str, ...]

    def text(self, name: str) -> str:
        """Text of a fact, "" when it was not given."""
        value = self.values.get(name, "")
        return value if isinstance(value, str) else ""

    def number(self, name: str) -> float | None:
        """Value of a fact without its uncertainty."""
        value = self.values.get(name)
        return value.value if isinstance(value, Estimate) else None if isinstance(value, str) else value

    def estimate(self, name: str) -> Estimate | None:
        """Fact with its uncertainty."""
        value = self.values.get(name)
        return value if isinstance(value, Estimate) else None


def read_facts(comments: Iterable[tuple[int, str]], file: str) -> Facts:
    """Read the `key: value` comments of a file; other comments are left alone.

    Parameters
    ----------
    comments : iterable of (row, text)
        Comments without their sign.
    file : str
        Name for the messages.

    Returns
    -------
    Facts

    Raises
    ------
    SurveyError
        If a known fact has no unit, a wrong unit or an unknown value, or is given twice with different values.
    """
    written: dict[str, tuple[int, str, str]] = {}
    notes: list[str] = []
    others: dict[str, str | float | Estimate] = {}
    for row, comment in comments:
        stated = re.search(r"uncertaint.*\bk\s*=\s*(\d+(?:[.,]\d+)?)", comment, re.IGNORECASE)
        if stated:  # "all uncertainties are expanded (k = 2)"
            comment = f"coverage factor: {stated.group(1)}"
        found = re.fullmatch(r"([^:=]{1,60}?)\s*[:=]\s*(\S.*)", comment)
        if not found:
            continue
        key, value = found.group(1).strip(), found.group(2).strip()
        key, unit = _key_and_unit(key)
        plain = plain_key(key)
        if plain in ("x axis", "y axis", "z axis"):  # "y axis: down"
            plain, value = "axes", f"{plain[0]} {value}"
        fact = _FACT.get(plain)
        if fact is None:
            if re.fullmatch(r"[a-z][a-z ]{0,39}", plain) and plain.count(" ") < 4:
                others[plain.replace(" ", "_")] = _printable(value)
                close = difflib.get_close_matches(plain, _FACT, n=1, cutoff=0.82)
                if close:
                    notes.append(
                        f"row {row}: '{key}' is not a known fact and is kept as text; did you mean '{close[0]}'?"
                    )
            continue
        value = f"{value} {unit}" if unit else value
        if fact in written and written[fact][2] != value:
            raise SurveyError(
                f"{file}, row {row}: '{key}: {value}' contradicts row {written[fact][0]}, '{written[fact][1]}: "
                f"{written[fact][2]}'; keep one of them."
            )
        written[fact] = (row, key, value)
    for fact in ("ambient_pressure", "surface_pressure"):
        if fact in written:
            row, key, value = written[fact]
            bare = re.sub(r"\s*\(?\babs(?:olute)?\b\.?\)?\s*$", "", value)
            if bare != value:  # "40 kPa absolute" is no gauge reading, however low
                written[fact] = (row, key, bare)
                others["confirm_absolute"] = "yes"
    values = {fact: _value(fact, key, value, f"{file}, row {row}") for fact, (row, key, value) in written.items()}
    coverage = values.pop("coverage_factor", None)
    if isinstance(coverage, float):
        if not 0.5 <= coverage <= 10.0:
            row, key, _ = written["coverage_factor"]
            raise SurveyError(f"{file}, row {row}: {key} {coverage:g} is not a coverage factor; it is usually 1 or 2.")
        values = {fact: _divided(value, coverage) for fact, value in values.items()}
        values["coverage_factor"] = coverage
        notes.append(f"every uncertainty of the file is divided by its coverage factor {coverage:g}")
    return Facts({**others, **values}, tuple(notes))


def plain_key(key: str) -> str:
    """Write a key without signs and capitals: "U∞" is "u inf"."""
    return " ".join(re.sub(r"[_\-]+", " ", key.lower().replace("∞", " inf")).split())


def fact_named(key: str) -> str:
    """Give the fact that a key stands for, the plain key with underscores when it is not a known one."""
    plain = plain_key(key)
    return _FACT.get(plain, plain.replace(" ", "_"))


def read_fact(fact: str, text: str) -> str | float | Estimate:
    """Read the value of one fact given outside a file, as "1.000 ± 0.005" for the velocity gain.

    Raises
    ------
    ValueError
        If it cannot be read.
    """
    return _value(fact, fact.replace("_", " "), text, "given")


def _key_and_unit(key: str) -> tuple[str, str]:
    found = re.fullmatch(r"(.+?)\s*[\[(]\s*([^\[\]()]+)\s*[\])]", key)
    return (found.group(1), found.group(2)) if found else (key, "")


def _value(fact: str, key: str, text: str, where: str) -> str | float | Estimate:
    """Read one value; messages say where it stands."""
    if fact in _FREE_TEXT:
        return _printable(text)
    if fact in _WORDS:
        word = _WORDS[fact].get(" ".join(text.lower().split()))
        if word is None:
            known = ", ".join(dict.fromkeys(_WORDS[fact].values()))
            raise SurveyError(f"{where}: {key} '{text[:60]}' is not known; write one of {known}.")
        return word
    if fact == "axes":
        return _axes(key, text, where)
    try:
        if fact in _FACTORS:
            return _factor(fact, text)
        if fact in _PLAIN_NUMBERS:
            percent = text.endswith("%")
            if percent and fact == "coverage_factor":  # of a normal distribution
                return NormalDist().inv_cdf(0.5 + 0.005 * min(max(units.parse_number(text.rstrip("% ")), 1.0), 99.9))
            return units.parse_number(text.rstrip("% ")) * (0.01 if percent else 1.0)
        quantity = FACT_QUANTITIES.get(fact) or _OTHER_QUANTITIES[fact]
        default = "g/kg" if fact == "salinity" else None
        given = units.read_quantity(text, quantity, default_unit=default)
    except ValueError as error:
        if fact == "uncertainty":
            raise SurveyError(
                f"{where}: {key} '{text[:60]}' is not a speed; write the standard uncertainty of every velocity as "
                "'uncertainty: 0.05 m/s', or one that is common to all of them as 'velocity gain: 1.00 ± 0.02'."
            ) from error
        raise SurveyError(f"{where}: {key}: {error}") from error
    return given if isinstance(given, Estimate) else Estimate(float(given), 0.0, quantity)


def _axes(key: str, text: str, where: str) -> str:
    """Read "y down" or "x left, y down"; right and up are the rule."""
    filler = r"(?:[\s:]+(?:axis|is|points|pointing|positive|to|the|towards))*"
    words = re.findall(rf"\b([xyz])\b{filler}[\s:]+(right|left|up|upwards?|down|downwards?)\b", text.lower())
    if not words:
        raise SurveyError(f"{where}: {key} '{text[:60]}' is not known; write for example 'y down' or 'x left, y down'.")
    return ", ".join(f"{letter} {direction.removesuffix('s').removesuffix('ward')}" for letter, direction in words)


def _factor(fact: str, text: str) -> Estimate:
    """Read "1.000 ± 0.005", "1 ± 0.5 %" or "0.5 %": one with its standard uncertainty."""
    shown = text.strip()
    parts = [part.strip() for part in re.split(r"±|\+/-|\+-", shown)]
    if len(parts) == 2:
        percent = parts[1].endswith("%")
        value = units.parse_number(parts[0]) if parts[0] else 1.0
        uncertainty = units.parse_number(parts[1].rstrip("% ")) * (0.01 if percent else 1.0)
    elif shown.endswith("%"):
        value, uncertainty = 1.0, 0.01 * units.parse_number(shown.rstrip("% "))
    else:
        value, uncertainty = units.parse_number(shown), 0.0
        if value != 1.0 and abs(value) < 0.2:  # "velocity gain uncertainty: 0.005"
            value, uncertainty = 1.0, value
    if value != 1.0:
        what = "velocities" if fact == "velocity_gain" else "positions"
        raise ValueError(f"{value:g} is not 1; correct the {what} first, then write '1 ± its standard uncertainty'.")
    if not 0.0 <= uncertainty < 0.5:
        raise ValueError(f"an uncertainty of {uncertainty:g} is not usable; write for example '1.000 ± 0.005'.")
    return Estimate(1.0, uncertainty, fact)


def _divided(value: str | float | Estimate, coverage: float) -> str | float | Estimate:
    if isinstance(value, Estimate):
        return dataclasses.replace(value, uncertainty=value.uncertainty / coverage)
    return value


def _printable(text: str) -> str:
    return "".join(sign for sign in text if sign.isprintable())[:LONGEST_TEXT]
