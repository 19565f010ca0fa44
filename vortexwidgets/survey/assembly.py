"""Assembly: columns and facts into a Survey, with the signs, scales and markers that people's files have."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from vortexwidgets.survey.samples import FEWEST_SAMPLES
from vortexwidgets.survey.scaling import Readings
from vortexwidgets.survey.survey import DroppedRow, Provenance, Survey, SurveyError

_LETTER_OF = {"u": "x", "v": "y", "w": "z"}
_COMPONENT_ALONG = {"x": "u", "y": "v", "z": "w"}
_FRAME = {"z": ("x", "y"), "x": ("y", "z"), "y": ("z", "x")}  # right and up, seen against the axis of the vortex
_PICTURE = {"right": (1.0, 0.0), "left": (-1.0, 0.0), "up": (0.0, 1.0), "down": (0.0, -1.0)}
_CONSUMED = (  # facts that have done their work once the survey is assembled
    "coverage_factor", "samples", "effective_samples", "axes", "view", "vortex_axis", "uncertainty", "velocity_gain",
    "position_scale", "miss_distance", "velocity_scale",
)  # fmt: skip


def assemble(readings: Readings, sha256: str, notes: Sequence[str]) -> Survey:
    """Make a Survey of the readings of one file: which geometry, which signs.

    Raises
    ------
    SurveyError
        If a column that is needed is missing, has no unit, or holds values that cannot be used.
    """
    arguments = _arguments(readings)
    usable = len(readings.rows) - len(readings.reasons)
    if usable < FEWEST_SAMPLES:
        first = min(readings.reasons, default=None)
        example = "" if first is None else f" (row {readings.rows[first]}: {readings.reasons[first]})"
        raise SurveyError(
            f"{readings.file}: {usable} of {len(readings.rows)} rows are usable{example}; at least "
            f"{FEWEST_SAMPLES} are needed, add points."
        )
    keep = np.array([index not in readings.reasons for index in range(len(readings.rows))])
    for name in ("position", "radius", "x", "y", "velocity", "swirl", "along", "axial", "u", "v", "w", "pressure"):
        if arguments.get(name) is not None:
            arguments[name] = arguments[name][keep]
    if arguments["uncertainty"] is not None:
        arguments["uncertainty"] = arguments["uncertainty"][:, keep]
    provenance = Provenance(
        file=readings.file,
        sha256=sha256,
        columns=tuple(f"{item.heading.text} -> {readings.meaning(item)}" for item in readings.series),
        dropped=tuple(DroppedRow(readings.rows[index], reason) for index, reason in sorted(readings.reasons.items())),
        notes=(*notes, *readings.facts.notes, *readings.notes),
    )
    known = {name: value for name, value in readings.facts.values.items() if name not in _CONSUMED}
    make: Callable[..., Survey] = arguments.pop("make")
    try:
        return make(provenance=provenance, **readings.common(), **arguments, **_renamed(known))
    except SurveyError as error:
        raise SurveyError(f"{readings.file}: {error}") from error


def _arguments(readings: Readings) -> dict[str, Any]:
    """Decide between radial, traverse and plane from what the columns are."""
    letters = [letter for letter in "xyz" if letter in readings.by_role]
    for letter in list(letters):
        values = readings.by_role[letter].values
        if len(letters) > 1 and np.nanmin(values, initial=np.inf) == np.nanmax(values, initial=-np.inf):
            letters.remove(letter)
            readings.taken[readings.by_role[letter].heading.text] = f"the same in all rows ({values[0]:g}), not needed"
    components = [role for role in ("u", "v", "w") if role in readings.by_role]
    if not any(role in readings.by_role for role in ("velocity", "swirl", "speed", *components)):
        raise SurveyError(
            f"{readings.file}: no column holds a velocity across the line or in the plane; the headings are "
            f"{readings.names()}. Name one 'velocity [m/s]', 'swirl [m/s]', or 'u [m/s]' and 'v [m/s]'."
        )
    if len(letters) == 3:
        raise SurveyError(
            f"{readings.file}: x, y and z all vary; give one plane across the axis (two coordinates) or one line."
        )
    if len(letters) == 2 and len(components) >= 2:
        return _plane(readings, letters)
    if "position" in readings.by_role:
        return _traverse(readings, "position")
    if "radius" in readings.by_role:
        return (
            _radial(readings) if np.nanmin(readings.by_role["radius"].values) >= 0.0 else _traverse(readings, "radius")
        )
    if len(letters) == 1:
        return _traverse(readings, letters[0])
    if len(letters) == 2:
        raise SurveyError(
            f"{readings.file}: a plane ({' and '.join(letters)}) needs two velocity components; add the missing "
            "one, or give the position along the line as 'position [mm]'."
        )
    raise SurveyError(
        f"{readings.file}: no column holds a position; the headings are {readings.names()}. Name one 'position [mm]', "
        "'radius [mm]', or 'x [mm]' and 'y [mm]'."
    )


def _radial(readings: Readings) -> dict[str, Any]:
    swirl = readings.first("swirl", "velocity", "v", "speed", "u", "w")
    axial = readings.first("axial", "w", besides=swirl)
    radius = readings.length("radius", "distance from the axis")
    sign = _handedness(readings)
    turned = _sign_turned(readings) if sign < 0.0 else ""
    values = readings.velocity(swirl, "swirl, positive counter-clockwise" + turned) * sign
    along = None if axial is None else readings.velocity(axial, "velocity along the axis of the vortex")
    readings.drop_missing(radius, values)
    roles = [swirl] + ([axial] if axial else [])
    return {
        "make": Survey.radial,
        "radius": radius,
        "swirl": values,
        "axial": along,
        "uncertainty": readings.uncertainties(roles),
        "pressure": readings.pressure(),
    }


def _traverse(readings: Readings, place: str) -> dict[str, Any]:
    cross, sign, parallel, axial = _line_components(readings, place)
    if cross == "speed" and np.nanmin(readings.by_role["speed"].values) >= 0.0:
        heading = readings.by_role["speed"].heading.text
        raise SurveyError(
            f"{readings.file}, column '{heading}': a speed has no sign; a traverse needs the component across the "
            "line, positive to the left of increasing position; give that, or name the position 'radius' where the "
            "centre is known."
        )
    position = readings.length(place, "position along the line, the centre is fitted")
    meaning = "component across the line, positive to the left of increasing position"
    velocity = readings.velocity(cross, meaning + (_sign_turned(readings) if sign < 0.0 else "")) * sign
    along = None if parallel is None else readings.velocity(parallel, "component along the line")
    third = None if axial is None else readings.velocity(axial, "velocity along the axis of the vortex")
    readings.drop_missing(position, velocity, *([along] if along is not None else []))
    return {
        "make": Survey.traverse,
        "position": position,
        "velocity": velocity,
        "along": along,
        "axial": third,
        "uncertainty": readings.uncertainties([role for role in (cross, parallel, axial) if role is not None]),
        "miss_distance": readings.facts.estimate("miss_distance"),
        "pressure": readings.pressure(),
    }


def _line_components(readings: Readings, place: str) -> tuple[str, float, str | None, str | None]:
    """Find the components across, along and out of the picture, and the sign of the first."""
    here = readings.by_role
    letter = place if place in "xyz" else "x"
    axis = readings.facts.text("vortex_axis")
    generic = readings.first("velocity", "swirl")
    if not axis:
        possible = [a for a in "zxy" if a != letter]
        axis = next((a for a in possible if _COMPONENT_ALONG[_third(a, letter)] in here), possible[0])
    if axis == letter:
        raise SurveyError(
            f"{readings.file}: the line runs along {letter}, and so does the axis of the vortex; a traverse crosses it."
        )
    across = _third(axis, letter)
    cross = generic or (_COMPONENT_ALONG[across] if _COMPONENT_ALONG[across] in here else None)
    vectors = _picture(readings, axis)
    if cross is None:
        cross = generic = next(role for role in ("speed", "u", "v", "w") if role in here)
    if generic is not None:
        sign = _handedness(readings)
    else:
        left = (-vectors[letter][1], vectors[letter][0])
        sign = vectors[across][0] * left[0] + vectors[across][1] * left[1]
        readings.notes.append(f"circulation is counted counter-clockwise, seen against {axis}")
    taken: set[str | None] = {cross}
    parallel = next((r for r in ("along", _COMPONENT_ALONG[letter]) if r in here and r not in taken), None)
    taken.add(parallel)
    axial = next((r for r in ("axial", _COMPONENT_ALONG[axis]) if r in here and r not in taken), None)
    return cross, sign, parallel, axial


def _plane(readings: Readings, letters: list[str]) -> dict[str, Any]:
    axis = readings.facts.text("vortex_axis") or next(letter for letter in "zxy" if letter not in letters)
    right, up = _FRAME[axis]
    if axis in letters:
        raise SurveyError(
            f"{readings.file}: the axis of the vortex is {axis}, but the plane is {' and '.join(letters)}."
        )
    for letter in (right, up):
        if _COMPONENT_ALONG[letter] not in readings.by_role:
            raise SurveyError(
                f"{readings.file}: a plane of {right} and {up} needs the components {_COMPONENT_ALONG[right]} and "
                f"{_COMPONENT_ALONG[up]}; '{_COMPONENT_ALONG[letter]} [m/s]' is missing."
            )
    vectors = _picture(readings, axis)
    turned = {letter: _turned(readings, letter, vectors[letter], is_right=letter == right) for letter in (right, up)}
    place = {letter: readings.length(letter, f"position along {letter}{turned[letter]}") for letter in (right, up)}
    flow = {
        letter: readings.velocity(_COMPONENT_ALONG[letter], f"component along {letter}{turned[letter]}")
        for letter in (right, up)
    }
    third = readings.first("axial", _COMPONENT_ALONG[axis])
    out = None if third is None else readings.velocity(third, "velocity along the axis of the vortex")
    readings.drop_missing(*place.values(), *flow.values())
    x, y = (sum(vectors[letter][k] * place[letter] for letter in (right, up)) for k in (0, 1))
    u, v = (sum(vectors[letter][k] * flow[letter] for letter in (right, up)) for k in (0, 1))
    swapped = vectors[right][0] == 0.0
    roles = [_COMPONENT_ALONG[letter] for letter in ((up, right) if swapped else (right, up))]
    return {
        "make": Survey.plane,
        "x": x,
        "y": y,
        "u": u,
        "v": v,
        "w": out,
        "uncertainty": readings.uncertainties(roles + ([third] if third else [])),
        "pressure": readings.pressure(),
    }


def _picture(readings: Readings, axis: str) -> dict[str, tuple[float, float]]:
    """Where the two coordinates of the plane point, seen against the axis of the vortex."""
    right, up = _FRAME[axis]
    vectors = {right: _PICTURE["right"], up: _PICTURE["up"]}
    stated = readings.facts.text("axes")
    for part in filter(None, stated.split(", ")):
        letter, direction = part.split(" ")
        if letter in vectors:
            vectors[letter] = _PICTURE[direction]
    if vectors[right][0] * vectors[up][0] + vectors[right][1] * vectors[up][1] != 0.0:
        raise SurveyError(
            f"{readings.file}: axes '{stated}' point along the same line; state both, as 'x right, y down'."
        )
    mirror = -1.0 if readings.facts.text("view") == "upstream" else 1.0
    if mirror < 0.0:
        readings.note("view from upstream: mirrored, so that circulation is counter-clockwise seen from downstream")
    if stated:
        readings.note(f"axes '{stated}': turned to x right, y up")
    return {letter: (mirror * vector[0], vector[1]) for letter, vector in vectors.items()}


def _turned(readings: Readings, letter: str, vector: tuple[float, float], *, is_right: bool) -> str:
    """Say what became of a coordinate that does not point right, or up, as it usually does, and why."""
    here, aside = vector if is_right else vector[::-1]
    if here > 0.0:
        return ""
    parts = [part for part in readings.facts.text("axes").split(", ") if part.startswith(f"{letter} ")]
    why = _because(readings, ", ".join(parts), mirrored=vector[0] != 0.0)
    if here < 0.0:
        return f" (sign turned{why})"
    direction = ("up" if aside > 0.0 else "down") if is_right else ("right" if aside > 0.0 else "left")
    return f" (taken as pointing {direction}{why})"


def _sign_turned(readings: Readings) -> str:
    why = _because(readings, readings.facts.text("axes"), mirrored=True)
    return f" (sign turned{why or ', so that circulation is counter-clockwise against the axis'})"


def _because(readings: Readings, axes: str, *, mirrored: bool) -> str:
    reasons = [f"the axes are '{axes}'"] if axes else []
    if mirrored and readings.facts.text("view") == "upstream":
        reasons.append("the view is from upstream")
    return f", because {' and '.join(reasons)}" if reasons else ""


def _handedness(readings: Readings) -> float:
    """Return -1 where the file's picture is mirrored."""
    vectors = _picture(readings, "z")
    return vectors["x"][0] * vectors["y"][1] - vectors["x"][1] * vectors["y"][0]


def _third(one: str, other: str) -> str:
    return next(letter for letter in "xyz" if letter not in (one, other))


def _renamed(facts: Mapping[str, Any]) -> dict[str, Any]:
    """Keep a free comment from posing as an argument of a constructor."""
    reserved = {item.name for item in dataclasses.fields(Survey)}
    reserved |= {"position", "radius", "swirl", "along", "axial", "u", "v", "w", "make"}
    return {f"{name}_" if name in reserved else name: value for name, value in facts.items()}
