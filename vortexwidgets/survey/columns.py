"""Columns: what the heading of a column says it holds, and in which unit."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, replace
from typing import Literal

Kind = Literal["length", "velocity", "pressure", "number", "text", ""]

_POSITIONS = ("position", "radius", "x", "y", "z")
_VELOCITIES = ("velocity", "swirl", "speed", "along", "axial", "radial", "u", "v", "w")

# Names as people write them, after lower case, θ -> theta, ∞ -> inf, and "_", "-", "." -> blank. Common practice.
_NAMES: dict[str, tuple[str, ...]] = {
    "position": (
        "position", "pos", "traverse", "traverse position", "probe position", "distance", "coordinate", "location", "s",
        "distance along line", "position along line",
    ),
    "radius": ("r", "radius", "rad", "radial distance", "radial position", "radial coordinate", "distance from axis"),
    "x": ("x", "x position", "x coordinate", "x pos", "xpos", "pos x", "position x"),
    "y": ("y", "y position", "y coordinate", "y pos", "ypos", "pos y", "position y"),
    "z": ("z", "z position", "z coordinate", "z pos", "zpos", "pos z", "position z"),
    "velocity": (
        "velocity", "vel", "cross velocity", "normal velocity", "transverse velocity", "velocity across",
        "across velocity", "measured velocity", "across",
    ),
    "swirl": (
        "swirl", "swirl velocity", "tangential", "tangential velocity", "azimuthal velocity",
        "circumferential velocity",
        "vtheta", "v theta", "utheta", "u theta", "wtheta", "vt", "v t", "vtan", "v tan", "vtheta", "vphi", "v phi",
        "swirl speed", "tangential speed",
    ),
    "speed": ("speed", "velocity magnitude", "magnitude", "absolute velocity", "|v|", "vmag", "v mag"),
    "along": ("along", "velocity along", "along velocity", "along component", "parallel velocity", "velocity parallel"),
    "axial": ("axial", "axial velocity", "streamwise velocity", "vaxial", "v axial", "axial speed"),
    "radial": ("radial velocity", "vr", "v r", "ur", "u r", "vrad", "v rad"),
    "u": ("u", "vx", "v x", "ux", "u x", "velocity u", "u velocity", "velocity x", "x velocity"),
    "v": ("v", "vy", "v y", "uy", "u y", "velocity v", "v velocity", "velocity y", "y velocity"),
    "w": ("w", "vz", "v z", "uz", "u z", "velocity w", "w velocity", "velocity z", "z velocity"),
    "samples": ("samples", "n", "n samples", "number of samples", "n valid", "nvalid", "count", "sample count"),
    "pressure": ("pressure", "static pressure", "p", "ps", "p static", "pstatic"),
    "valid": ("valid", "is valid", "isvalid", "good", "ok", "included"),
    "flag": ("flag", "flags", "status", "chc", "quality", "vector flag", "vector status"),
    "remark": ("remark", "remarks", "comment", "comments", "note", "notes"),
    "index": (
        "point", "no", "nr", "number", "index", "id", "i", "j", "row", "run", "frame", "#", "station", "time", "t",
    ),
}  # fmt: skip
_ROLE = {name: role for role, names in _NAMES.items() for name in names}
_EXPANDED = r"u ?95(?: ?%)?|expanded (?:uncertainty|unc|error|err)"
_SPREAD = rf"{_EXPANDED}|(?:standard |std )?(?:uncertainty|unc|sigma|error|err)|sem|standard error|std err|stderr"
_SPREAD_ALONE = r"±|\+/?-|dv|delta v"
_RMS = r"rms|std|sd|stdev|std dev|standard deviation|sdev"

# Units that may stand without brackets; inside brackets any unit that pint knows is read.
_LENGTHS = {"m", "mm", "cm", "dm", "um", "µm", "μm", "nm", "km", "in", "inch", "inches", "ft", "feet", "foot", "yd"}
_SPEEDS = {
    "m/s": "m/s", "mps": "m/s", "m s": "m/s", "m per s": "m/s", "ms-1": "m/s", "m s-1": "m/s", "m.s-1": "m/s",
    "m s^-1": "m/s", "m·s-1": "m/s", "m*s^-1": "m/s", "mm/s": "mm/s", "mmps": "mm/s", "mm s": "mm/s", "mm s-1": "mm/s",
    "cm/s": "cm/s", "cmps": "cm/s", "cm s": "cm/s", "cm s-1": "cm/s", "ft/s": "ft/s", "fps": "ft/s", "ft s": "ft/s",
    "in/s": "in/s", "ips": "in/s", "km/h": "km/h", "kmh": "km/h", "kph": "km/h", "mph": "mph", "kn": "knot",
    "kt": "knot", "kts": "knot", "knot": "knot", "knots": "knot",
}  # fmt: skip
_PRESSURES = {"pa": "Pa", "hpa": "hPa", "kpa": "kPa", "mbar": "mbar", "bar": "bar", "psi": "psi"}


@dataclass(frozen=True)
class Heading:
    """One column: its heading as written, and what it was taken for.

    `role` is "" when the name is not known. `of` is the role that an uncertainty or an rms belongs to ("" = all).
    `unit` is None when none was stated, "" when the column is a ratio; `per` says to what the ratio was taken.
    `expanded` is whether the heading says that an uncertainty is an expanded one, with or without its `coverage`.
    """

    text: str
    name: str
    role: str
    of: str = ""
    unit: str | None = None
    per: str = ""
    coverage: float | None = None
    expanded: bool = False

    @property
    def kind(self) -> Kind:
        """What sort of values the column holds."""
        if self.role in _POSITIONS or (self.role in ("uncertainty", "rms") and self.of in _POSITIONS):
            return "length"
        if self.role == "pressure" or self.of == "pressure":
            return "pressure"
        if self.role in _VELOCITIES or self.role in ("uncertainty", "rms"):
            return "velocity"
        if self.role == "samples":
            return "number"
        return "text" if self.role else ""


def understand(text: str, unit: str | None = None) -> Heading:
    """Say what a column holds from its heading; a unit given separately counts more than one in the heading.

    Parameters
    ----------
    text : str
        The heading as written.
    unit : str, optional
        Unit from a row of units or from the caller.

    Returns
    -------
    Heading

    Examples
    --------
    >>> understand("position [mm]").role, understand("position [mm]").unit
    ('position', 'mm')
    >>> understand("U_mps").role, understand("U_mps").unit
    ('u', 'm/s')
    >>> understand("V/U∞").per, understand("r/c").role
    ('U∞', 'radius')
    """
    plain = unicodedata.normalize("NFC", text).strip().strip('"').strip()
    rest, coverage = _without_coverage(plain)
    heading = _with_brackets(text, rest) or _without_brackets(text, rest)
    if unit is not None:
        heading = replace(heading, unit=written_unit(unit))
        ratio = heading.unit in ("", "%") and heading.kind in ("length", "velocity")
        heading = replace(heading, per=(heading.per or "scale") if ratio else "")
    if coverage is not None and heading.name.lower() == "u":  # "U (k=2)" is no velocity
        heading = replace(heading, role="uncertainty")
    expanded = heading.role == "uncertainty" and re.search(rf"(?:^|[^a-z])(?:{_EXPANDED})", _key(heading.name))
    return replace(heading, coverage=coverage, expanded=bool(expanded))


def written_unit(text: str) -> str:
    """Write a unit the way the unit library reads it; "" for a ratio."""
    unit = text.strip().strip("[](){}").strip()
    if unit in ("-", "–", "—", "1", "/"):
        return ""
    known = _SPEEDS.get(_minus(unit).lower())
    return known if known is not None else unit.replace("μ", "µ")


def usual_unit(text: str, kind: Kind) -> str | None:
    """Give the usual unit of a kind that differs from what was written by its capitals only, as "mm" for "MM"."""
    unit = _minus(text.strip()).lower()
    known = {"length": {name: name for name in _LENGTHS}, "velocity": _SPEEDS, "pressure": _PRESSURES}
    return known.get(kind, {}).get(unit)


def may_be_uncertainty(text: str) -> bool:
    """Whether a heading that was not understood seems to mean an uncertainty."""
    return bool(re.search(r"uncert|expanded|error|±|\+/-|\bu_?95", text, re.IGNORECASE))


def is_unit(text: str) -> bool:
    """Whether a cell of a row of units is a unit, in brackets or without."""
    cell = text.strip()
    inner = cell.strip("[](){}").strip()
    return (cell[:1] in "[({" and cell != "") or _bare(inner) != "" or inner in ("", "-", "1", "%")


def _minus(text: str) -> str:
    return text.replace("⁻¹", "-1").replace("−", "-").replace("⋅", "·").replace("sec", "s")


def _bare(text: str) -> Kind:
    unit = _minus(text)
    if unit in _LENGTHS:
        return "length"
    if unit.lower() in _SPEEDS:
        return "velocity"
    return "pressure" if unit.lower() in _PRESSURES else ""


def _without_coverage(text: str) -> tuple[str, float | None]:
    """Take "(k=2)" or "(95 %)" out of a heading."""
    found = re.search(r"[\[(]?\s*\bk\s*=\s*(\d+(?:[.,]\d+)?)\s*[\])]?", text)
    if found:
        return (text[: found.start()] + " " + text[found.end() :]).strip(), float(found.group(1).replace(",", "."))
    found = re.search(r"[\[(]\s*95\s*%\s*[\])]", text)
    if found:
        return (text[: found.start()] + " " + text[found.end() :]).strip(), 1.96
    return text, None


def _with_brackets(text: str, rest: str) -> Heading | None:
    square, curly = r"\[\s*([^\[\]]*)\s*\]", r"\{\s*([^{}]*)\s*\}"
    found = re.fullmatch(rf"(.*?)\s*(?:{square}|\(\s*([^()]*(?:\([^()]*\))?[^()]*)\s*\)|{curly})", rest)
    if not found or not found.group(1).strip():
        return None
    # "v/(m/s)" is the ISO 80000-1 way to write "v [m/s]"
    name, unit = (
        found.group(1).strip().rstrip("/").strip(),
        next(part for part in found.groups()[1:] if part is not None),
    )
    ratio = re.fullmatch(r"([^/]+?)\s*/\s*([^/]+)", name)
    if ratio and written_unit(unit) in ("", "%"):
        return replace(_named(text, ratio.group(1)), unit=written_unit(unit), per=ratio.group(2))
    heading = _named(text, name)
    if written_unit(unit) in ("", "%") and heading.kind in ("length", "velocity"):
        return replace(heading, unit=written_unit(unit), per="scale")
    return replace(heading, unit=written_unit(unit))


def _without_brackets(text: str, rest: str) -> Heading:
    plain = _named(text, rest)
    if plain.role:
        return plain
    ratio = re.fullmatch(r"([^/]+?)\s*/\s*(.+)", rest)
    if ratio:
        heading = _named(text, ratio.group(1))
        below = ratio.group(2).strip("() ")
        if heading.role and _bare(below) == heading.kind:  # the ISO 80000-1 way: position/mm, v/(m/s)
            return replace(heading, unit=written_unit(below))
        if heading.kind in ("length", "velocity") and re.fullmatch(r"[^\s/]{1,12}", below):
            return replace(heading, unit="", per=below)
    for split in re.finditer(r"[\s_,]+", rest):  # the longest unit first: "v_m_s" before "v_m", "s"
        heading = _named(text, rest[: split.start()])
        unit = rest[split.end() :].replace("_", " ").strip()
        if heading.role and heading.kind == _bare(unit):
            return replace(heading, unit=_PRESSURES.get(unit.lower(), written_unit(unit)))
    return plain


def _key(name: str) -> str:
    """Write a name without signs and capitals."""
    key = name.strip().lower()
    for sign, word in (("θ", "theta"), ("ϑ", "theta"), ("φ", "phi"), ("σ", "sigma "), ("δ", "delta "), ("∞", "inf")):
        key = key.replace(sign, word)
    return " ".join(re.sub(r"[_\-.:]+", " ", key).split())


def _named(text: str, name: str) -> Heading:
    """Look a name up, also as the uncertainty or the rms of something."""
    of_something = re.fullmatch(r"u\s*\(\s*(\w+)\s*\)", name.strip().lower())
    key = _key(name)
    key = re.sub(r"^(mean|average|avg|time averaged) | (mean|average|avg)$", "", key)
    if of_something and of_something.group(1) in _ROLE:
        return Heading(text, name.strip(), "uncertainty", of=_ROLE[of_something.group(1)])
    if key in _ROLE:
        return Heading(text, name.strip(), _ROLE[key])
    for role, words in (("uncertainty", _SPREAD), ("rms", _RMS)):
        if re.fullmatch(words, key) or (role == "uncertainty" and re.fullmatch(_SPREAD_ALONE, key)):
            return Heading(text, name.strip(), role)
        found = re.fullmatch(rf"(?:{words})(?: (?:of|in|on))?(?: the)? ?(?P<of>.+)", key)
        found = found or re.fullmatch(rf"(?P<of>.+?) ?(?:{words})", key)
        if found and found.group("of") in _ROLE:
            of = _ROLE[found.group("of")]
            return Heading(text, name.strip(), role, of="" if of in ("velocity", "speed") else of)
    return Heading(text, name.strip(), "weight" if key in ("weight", "weights") else "")
