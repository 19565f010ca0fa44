"""Samples: one measured component at one point each, checked and stacked into columns."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vortexwidgets.uncertainty import Estimate, Given, as_estimate

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
Component = tuple[ArrayLike | None, tuple[float, float, float], str]
"""Values at the stations (None: not measured), unit vector of the component, name of the argument."""

FEWEST_SAMPLES = 3
"""Circulation, core radius and one position of the axis: fewer samples leave nothing to fit."""

FASTEST = 1e5
"""[m/s] A larger velocity is a wrong unit or a marker of an instrument, not a flow."""

FARTHEST = 1e7
"""[m] A larger coordinate is a wrong unit."""

FACT_QUANTITIES: dict[str, str] = {
    "temperature": "temperature",
    "salinity": "salinity",
    "ambient_pressure": "ambient_pressure",
    "surface_pressure": "surface_pressure",
    "depth": "depth",
    "submergence": "submergence",
    "free_stream": "free_stream",
    "density": "density",
    "kinematic_viscosity": "kinematic_viscosity",
    "vapour_pressure": "vapour_pressure",
    "surface_tension": "surface_tension",
    "elevation": "elevation",
    "gravity": "gravity",
    "wander": "wander",
    "probe_width": "probe_width",
    "translation_speed": "translation_speed",
    "length_scale": "length_scale",
    "reference_radius": "reference_radius",
    "tensile_strength": "tensile_strength",
}
"""Facts that are numbers, and the quantity (SI unit, valid range) each of them is."""


class SurveyError(ValueError):
    """A survey cannot be read or used; the message says where, what was found and what to do."""


@dataclass(frozen=True)
class DroppedRow:
    """One row that is not in the survey, and why.

    `row` is the line of the file as an editor counts it, or the index of the sample where arrays were given.
    """

    row: int
    reason: str


@dataclass(frozen=True)
class Provenance:
    """Where a survey comes from and what was done to it on the way in."""

    file: str = ""
    sha256: str = ""
    columns: tuple[str, ...] = ()
    dropped: tuple[DroppedRow, ...] = ()
    notes: tuple[str, ...] = ()


def as_numbers(values: ArrayLike, name: str) -> FloatArray:
    """Turn what was given for an argument into an array of numbers."""
    try:
        return np.asarray(values, dtype=float)
    except (TypeError, ValueError):
        shown = repr(values) if len(repr(values)) <= 60 else repr(values)[:57] + "..."
        raise SurveyError(f"{name} must be numbers in SI units, got {shown}; NaN stands for a missing value.") from None


def own_column(values: ArrayLike, shape: tuple[int, ...], name: str) -> FloatArray:
    """Copy a column, check its shape and lock it."""
    array = np.array(as_numbers(values, name))
    if array.shape != shape:
        raise SurveyError(f"{name} has shape {array.shape}, expected {shape}: one entry per sample.")
    array.setflags(write=False)
    return array


def check_samples(fields: Mapping[str, FloatArray | None], set_aside: int) -> None:
    """Say what is wrong with the numbers of a survey; `fields` are its columns by name."""
    columns = {name: values for name, values in fields.items() if values is not None}
    number = columns["velocity"].size
    for name, limit, unit in (("x", FARTHEST, "m"), ("y", FARTHEST, "m"), ("velocity", FASTEST, "m/s")):
        bad = np.flatnonzero(~(np.abs(columns[name]) <= limit))
        if bad.size:
            raise SurveyError(
                f"{name} of sample {bad[0]} is {columns[name][bad[0]]:g} {unit}, beyond anything that is measured "
                f"(limit {limit:g} {unit}); check the unit, or leave the sample out."
            )
    if number - set_aside < FEWEST_SAMPLES:
        raise SurveyError(
            f"the survey has {number - set_aside} samples in use; at least {FEWEST_SAMPLES} are needed, add points."
        )
    x, y = columns["x"], columns["y"]
    if np.ptp(x) == 0.0 and np.ptp(y) == 0.0:
        raise SurveyError(
            f"all {number} samples are at the same position ({x[0]:g} m); a survey needs positions that differ."
        )
    lengths = np.linalg.norm(columns["direction"], axis=1)
    worst = int(np.argmax(np.abs(lengths - 1.0)))
    if not abs(lengths[worst] - 1.0) < 1e-9:
        raise SurveyError(f"direction of sample {worst} has length {lengths[worst]:g}; give unit vectors.")
    for name, unit in (("uncertainty", "m/s"), ("pressure_uncertainty", "Pa")):
        if name in columns:
            bad = np.flatnonzero(~((columns[name] > 0.0) & (columns[name] < np.inf)))
            if bad.size:
                raise SurveyError(
                    f"{name} must be positive, got {columns[name][bad[0]]:g} {unit} at sample {bad[0]}; give the "
                    "standard uncertainty, or leave all uncertainties out to have the scatter estimated from the fit."
                )


def check_indices(indices: Iterable[int], number: int) -> None:
    """Say which index is no sample."""
    for index in indices:
        if not 0 <= index < number:
            raise SurveyError(f"there is no sample {index}; the survey has samples 0 to {number - 1}.")


def stated_estimate(given: Given, quantity: str) -> Estimate:
    """Turn a person's number into an Estimate; a wrong one is the survey's fault."""
    try:
        return as_estimate(given, quantity)
    except ValueError as error:
        raise SurveyError(str(error)) from error


def check_miss_distance(missed: Estimate, x: FloatArray) -> None:
    """Refuse a miss distance that is negative, or so large that the line saw no vortex."""
    extent = float(np.ptp(x))
    if missed.value < 0.0:
        raise SurveyError(
            f"miss_distance must not be negative, got {missed.value:g} m; give the distance between line and axis "
            "without a sign."
        )
    if missed.value > extent:
        raise SurveyError(
            f"miss_distance is {missed.value:g} m, but the survey is only {extent:g} m long, so its line passed far "
            "from the vortex; check the unit (a bare number is in m), or leave it out if it is not known."
        )


def factor_of_one(given: Given, quantity: str) -> Estimate:
    """Read the uncertainty that is common to all velocities, or to all positions."""
    estimate = stated_estimate(given, quantity)
    if estimate.value != 1.0:
        column = "velocities" if quantity == "velocity_gain" else "positions"
        raise SurveyError(
            f"{quantity} must be 1 with its standard uncertainty, got {estimate.value:g}; correct the {column} first, "
            f"then state {quantity}=(1, uncertainty)."
        )
    return estimate


def checked_facts(facts: Mapping[str, Any]) -> dict[str, str | float | Estimate]:
    """Keep facts as text, numbers and Estimates; the numbers that are quantities are checked."""
    checked: dict[str, str | float | Estimate] = {}
    for name, value in facts.items():
        if isinstance(value, str):
            checked[name] = value
        elif name in FACT_QUANTITIES:
            checked[name] = stated_estimate(value, FACT_QUANTITIES[name])
        elif isinstance(value, Estimate):
            checked[name] = value
        elif isinstance(value, int | float | np.floating | np.integer):
            checked[name] = float(value)
        else:
            raise SurveyError(f"fact {name} must be text or a number, got {value!r}.")
    return checked


def stacked_columns(
    x: FloatArray,
    y: FloatArray,
    components: list[Component],
    uncertainty: ArrayLike | None,
    pressure: ArrayLike | None,
    provenance: Provenance | None,
) -> dict[str, Any]:
    """Make the fields of a survey from one array per component; stations with a missing value are listed as dropped."""
    given = [
        (as_numbers(values, name).ravel(), vector, name) for values, vector, name in components if values is not None
    ]
    for values, _, name in given:
        if values.shape != x.shape:
            raise SurveyError(f"{name} has {values.size} values for {x.size} positions; give one value per position.")
    spread = _spread(uncertainty, len(given), x.size)
    static = None if pressure is None else as_numbers(pressure, "pressure").ravel()
    if static is not None and static.shape != x.shape:
        raise SurveyError(
            f"pressure has {static.size} values for {x.size} positions; give one per position, NaN if none."
        )
    swirl = [values for values, vector, _ in given if vector[2] == 0.0]
    complete = np.isfinite(x) & np.isfinite(y) & np.all(np.isfinite(swirl), axis=0)
    kept: list[tuple[FloatArray, ...]] = []
    for row, (values, vector, _) in enumerate(given):
        mask = complete & np.isfinite(values)
        share = np.full(x.size, np.nan) if spread is None else spread[row]
        tap = np.full(x.size, np.nan) if static is None else static
        directions = np.tile(np.asarray(vector), (int(mask.sum()), 1))
        kept.append((x[mask], y[mask], directions, values[mask], share[mask], tap[mask]))
    origin = provenance or Provenance()
    lost = tuple(DroppedRow(int(index), "a value is missing") for index in np.flatnonzero(~complete))
    stacked = [np.concatenate(parts) for parts in zip(*kept, strict=True)]
    return {
        "x": stacked[0],
        "y": stacked[1],
        "direction": stacked[2],
        "velocity": stacked[3],
        "uncertainty": None if spread is None else stacked[4],
        "pressure": None if static is None else stacked[5],
        "provenance": dataclasses.replace(origin, dropped=(*origin.dropped, *lost)),
    }


def _spread(uncertainty: ArrayLike | None, components: int, number: int) -> FloatArray | None:
    """Spread the uncertainty over (components, number)."""
    if uncertainty is None:
        return None
    given = as_numbers(uncertainty, "uncertainty")
    if given.ndim == 2 and given.shape != (components, number):
        given = given.ravel()
    try:
        return np.array(np.broadcast_to(given, (components, number)))
    except ValueError:
        raise SurveyError(
            f"uncertainty has shape {np.shape(uncertainty)} for {components} components at {number} positions; give "
            "one number, one per position, or one row per component."
        ) from None
