"""Survey: velocity components at points, with uncertainties and provenance."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vortexwidgets.uncertainty import Estimate, Given, as_estimate

if TYPE_CHECKING:
    from vortexwidgets.models.vortex import Vortex

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
Geometry = Literal["radial", "traverse", "plane"]

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
    "free_stream": "free_stream",
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


@dataclass(frozen=True, eq=False, kw_only=True)
class Survey:
    """Velocity components measured at points; circulation is positive counter-clockwise, seen against z.

    Use the constructors `radial`, `traverse` and `plane`. One sample is one component at one point, so a survey of two
    components has two samples per station. Surveys never change: `without` and `with_all` return new ones. Two surveys
    are equal when their contents are.

    Parameters
    ----------
    x, y : array_like, shape (N,)
        Position of each sample in the plane of the swirl. [m]
    direction : array_like, shape (N, 3)
        Unit vector of the measured component: (0, 1, 0) across a traverse, (0, 0, 1) along the axis of the vortex.
    velocity : array_like, shape (N,)
        Measured component. [m/s]
    uncertainty : array_like, shape (N,), optional
        Standard uncertainty (k = 1) of each sample, independent of the others; None when the scatter is not known. [m/s]
    set_aside : mapping of int to str
        Samples that are kept but not used, with the reason.
    geometry : {"radial", "traverse", "plane"}
        How the points lie: at known distances from the axis, on a line, or in a plane.
    miss_distance : Estimate, optional
        Stated distance between the line of a traverse and the axis; None when it was not stated. [m]
    velocity_gain, position_scale : number, (value, standard uncertainty) or Estimate
        1 with the standard uncertainty that is common to all velocities or to all positions. It does not average out.
    facts : mapping
        What is known about the test: title, fluid, temperature [K], ambient_pressure [Pa], free_stream [m/s], ... in SI.
    pressure, pressure_uncertainty : array_like, shape (N,), optional
        Static pressure measured at the samples, NaN where there is none. [Pa]
    provenance : Provenance
        File, hash, what each column was taken for, dropped rows.

    Raises
    ------
    SurveyError
        If arrays do not match, values are not finite, uncertainties are not positive, or positions have no spread.
    """

    x: FloatArray
    y: FloatArray
    direction: FloatArray
    velocity: FloatArray
    uncertainty: FloatArray | None = None
    set_aside: Mapping[int, str] = field(default_factory=dict)
    geometry: Geometry
    miss_distance: Estimate | None = None
    velocity_gain: Estimate = Estimate(1.0, 0.0, "velocity_gain")
    position_scale: Estimate = Estimate(1.0, 0.0, "position_scale")
    facts: Mapping[str, str | float | Estimate] = field(default_factory=dict)
    pressure: FloatArray | None = None
    pressure_uncertainty: FloatArray | None = None
    provenance: Provenance = Provenance()

    def __post_init__(self) -> None:
        number = np.size(self.velocity)
        for name in ("x", "y", "velocity", "uncertainty", "pressure", "pressure_uncertainty"):
            given = getattr(self, name)
            if given is not None:
                object.__setattr__(self, name, _frozen(given, (number,), name))
        object.__setattr__(self, "direction", _frozen(self.direction, (number, 3), "direction"))
        if self.geometry not in ("radial", "traverse", "plane"):
            raise SurveyError(f"geometry must be radial, traverse or plane, got {self.geometry!r}.")
        _check_samples(self)
        for name in ("velocity_gain", "position_scale"):
            object.__setattr__(self, name, _factor_of_one(getattr(self, name), name))
        if self.miss_distance is not None:
            object.__setattr__(self, "miss_distance", _estimate(self.miss_distance, "miss_distance"))
        aside = {int(index): str(reason) for index, reason in sorted(self.set_aside.items())}
        _check_indices(aside, number)
        object.__setattr__(self, "set_aside", aside)
        object.__setattr__(self, "facts", _facts(self.facts))

    @classmethod
    def radial(
        cls,
        *,
        radius: ArrayLike,
        swirl: ArrayLike,
        uncertainty: ArrayLike | None = None,
        axial: ArrayLike | None = None,
        velocity_gain: Given = 1.0,
        position_scale: Given = 1.0,
        provenance: Provenance | None = None,
        pressure: ArrayLike | None = None,
        **facts: Any,
    ) -> Survey:
        """Swirl at known distances from the axis, positive counter-clockwise; the centre is known.

        Parameters
        ----------
        radius : array_like, shape (N,)
            Distance from the axis, not negative; repeats and any order are welcome. [m]
        swirl : array_like, shape (N,)
            Azimuthal velocity. [m/s]
        uncertainty : number or array_like, shape (N,) or (components, N), optional
            Standard uncertainty of each sample. [m/s]
        axial : array_like, shape (N,), optional
            Velocity along the axis; NaN where it was not measured. [m/s]
        velocity_gain, position_scale, pressure, provenance, **facts
            As in the class.

        Returns
        -------
        Survey

        Raises
        ------
        SurveyError
            If a radius is negative, or as in the class.

        Examples
        --------
        >>> survey = Survey.radial(radius=[0.01, 0.02, 0.03], swirl=[1.0, 1.2, 0.9], uncertainty=0.05)
        >>> survey.points, survey.geometry
        (3, 'radial')
        """
        distance = np.ravel(np.asarray(radius, dtype=float))
        if np.any(distance < 0.0):
            raise SurveyError(
                f"radius must not be negative, got {distance.min():g} m; for positions on both sides of the axis use "
                "Survey.traverse, which finds the centre."
            )
        components = [(swirl, (0.0, 1.0, 0.0), "swirl"), (axial, (0.0, 0.0, 1.0), "axial")]
        stacked = _stack(distance, np.zeros_like(distance), components, uncertainty, pressure, provenance)
        return cls(
            geometry="radial", velocity_gain=velocity_gain, position_scale=position_scale, facts=facts, **stacked
        )

    @classmethod
    def traverse(
        cls,
        *,
        position: ArrayLike,
        velocity: ArrayLike,
        uncertainty: ArrayLike | None = None,
        along: ArrayLike | None = None,
        axial: ArrayLike | None = None,
        miss_distance: Given | None = None,
        velocity_gain: Given = 1.0,
        position_scale: Given = 1.0,
        provenance: Provenance | None = None,
        pressure: ArrayLike | None = None,
        **facts: Any,
    ) -> Survey:
        """Velocity across a straight line, positive to the left of increasing position; the centre is not known.

        The line is the x axis. The line may miss the axis of the vortex: the component along the line shows by how much.

        Parameters
        ----------
        position : array_like, shape (N,)
            Position along the line; repeats and any order are welcome. [m]
        velocity : array_like, shape (N,)
            Component across the line, in the plane of the swirl, positive to the left of increasing position. [m/s]
        uncertainty : number or array_like, shape (N,) or (components, N), optional
            Standard uncertainty of each sample; components in the order velocity, along, axial. [m/s]
        along, axial : array_like, shape (N,), optional
            Component along the line, positive with increasing position, and component along the axis of the vortex. [m/s]
        miss_distance : number, (value, standard uncertainty) or Estimate, optional
            Distance between the line and the axis when it is known. [m]
        velocity_gain, position_scale, pressure, provenance, **facts
            As in the class.

        Returns
        -------
        Survey

        Raises
        ------
        SurveyError
            As in the class.

        Examples
        --------
        >>> survey = Survey.traverse(position=[-0.02, 0.0, 0.01], velocity=[-1.2, 0.1, 1.0], along=[0.1, 0.3, 0.1])
        >>> survey.points, survey.stations, survey.two_components
        (6, 3, True)
        """
        line = np.ravel(np.asarray(position, dtype=float))
        components = [
            (velocity, (0.0, 1.0, 0.0), "velocity"),
            (along, (1.0, 0.0, 0.0), "along"),
            (axial, (0.0, 0.0, 1.0), "axial"),
        ]
        stacked = _stack(line, np.zeros_like(line), components, uncertainty, pressure, provenance)
        return cls(
            geometry="traverse",
            miss_distance=None if miss_distance is None else _estimate(miss_distance, "miss_distance"),
            velocity_gain=velocity_gain,
            position_scale=position_scale,
            facts=facts,
            **stacked,
        )

    @classmethod
    def plane(
        cls,
        *,
        x: ArrayLike,
        y: ArrayLike,
        u: ArrayLike,
        v: ArrayLike,
        w: ArrayLike | None = None,
        uncertainty: ArrayLike | None = None,
        velocity_gain: Given = 1.0,
        position_scale: Given = 1.0,
        provenance: Provenance | None = None,
        pressure: ArrayLike | None = None,
        **facts: Any,
    ) -> Survey:
        """Velocity vectors in a plane across the axis, x to the right, y upwards, circulation counter-clockwise positive.

        Parameters
        ----------
        x, y : array_like, shape (N,) or (rows, columns); or shape (columns,) and (rows,) with u of shape (rows, columns)
            Positions. [m]
        u, v, w : array_like
            Components along x, y and the axis of the vortex; vectors with NaN are left out and listed. [m/s]
        uncertainty : number or array_like, shape of `u` or (components, N), optional
            Standard uncertainty of each sample; components in the order u, v, w. [m/s]
        velocity_gain, position_scale, pressure, provenance, **facts
            As in the class.

        Returns
        -------
        Survey

        Raises
        ------
        SurveyError
            As in the class.

        Examples
        --------
        >>> survey = Survey.plane(x=[0.0, 0.1], y=[0.0, 0.1, 0.2], u=np.zeros((3, 2)), v=np.ones((3, 2)))
        >>> survey.points, survey.stations
        (12, 6)
        """
        across, up = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        shape = np.shape(u)
        if across.ndim == up.ndim == 1 and len(shape) == 2 and shape == (up.size, across.size):
            across, up = np.meshgrid(across, up)
        if across.shape != up.shape:
            raise SurveyError(
                f"x has shape {across.shape} and y has shape {up.shape}; give one x and one y per vector."
            )
        components = [(u, (1.0, 0.0, 0.0), "u"), (v, (0.0, 1.0, 0.0), "v"), (w, (0.0, 0.0, 1.0), "w")]
        stacked = _stack(across.ravel(), up.ravel(), components, uncertainty, pressure, provenance)
        return cls(geometry="plane", velocity_gain=velocity_gain, position_scale=position_scale, facts=facts, **stacked)

    @classmethod
    def simulated(
        cls,
        vortex: Vortex,
        *,
        position: ArrayLike | None = None,
        radius: ArrayLike | None = None,
        x: ArrayLike | None = None,
        y: ArrayLike | None = None,
        along: bool = False,
        noise: float = 0.0,
        seed: int = 0,
        background: tuple[float, float] = (0.0, 0.0),
        **facts: Any,
    ) -> Survey:
        """Survey that an ideal instrument with normal noise would return of a known vortex.

        Parameters
        ----------
        vortex : Vortex
            The truth; its centre says where the axis is, so a traverse misses it by ``vortex.centre[1]``.
        position : array_like, shape (N,), optional
            Stations of a traverse along y = 0. [m]
        radius : array_like, shape (N,), optional
            Stations of a radial survey about the centre of the vortex. [m]
        x, y : array_like, optional
            Points of a planar survey. [m]
        along : bool
            Whether a traverse also measures the component along its line.
        noise : float
            Standard deviation of every sample, also stated as its uncertainty unless it is zero. [m/s]
        seed : int
            Seed of the noise.
        background : (float, float)
            Uniform velocity added to the vortex. [m/s]
        **facts
            As in the class.

        Returns
        -------
        Survey

        Raises
        ------
        ValueError
            If not exactly one kind of points is given.
        """
        if (position is not None) + (radius is not None) + (x is not None and y is not None) != 1:
            raise ValueError("give the points in one way: position=, radius=, or both x= and y=.")
        generator = np.random.default_rng(seed)
        uncertainty = noise if noise > 0.0 else None

        def noisy(exact: ArrayLike) -> FloatArray:
            values = np.asarray(exact, dtype=float)
            return values + noise * generator.standard_normal(values.shape) if noise > 0.0 else values

        if radius is not None:
            distance = np.ravel(np.asarray(radius, dtype=float))
            return cls.radial(radius=distance, swirl=noisy(vortex.swirl(distance)), uncertainty=uncertainty, **facts)
        if position is not None:
            line = np.ravel(np.asarray(position, dtype=float))
            u, v = vortex.velocity(line, np.zeros_like(line))
            across = noisy(np.asarray(v) + background[1])
            second = noisy(np.asarray(u) + background[0]) if along else None
            return cls.traverse(position=line, velocity=across, along=second, uncertainty=uncertainty, **facts)
        points_x, points_y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        if points_x.ndim == points_y.ndim == 1 and points_x.shape != points_y.shape:
            points_x, points_y = np.meshgrid(points_x, points_y)
        u, v = vortex.velocity(points_x, points_y)
        measured_u, measured_v = noisy(np.asarray(u) + background[0]), noisy(np.asarray(v) + background[1])
        return cls.plane(x=points_x, y=points_y, u=measured_u, v=measured_v, uncertainty=uncertainty, **facts)

    @cached_property
    def included(self) -> BoolArray:
        """Which samples are used, shape (N,)."""
        mask = np.ones(self.velocity.size, dtype=bool)
        mask[list(self.set_aside)] = False
        mask.setflags(write=False)
        return mask

    @cached_property
    def in_plane(self) -> BoolArray:
        """Which samples are used and measure the swirl's plane, shape (N,)."""
        return self.included & (self.direction[:, 2] == 0.0)

    @cached_property
    def axial(self) -> BoolArray:
        """Which samples are used and measure the velocity along the axis of the vortex, shape (N,)."""
        return self.included & (self.direction[:, 2] != 0.0)

    @property
    def points(self) -> int:
        """Number of samples that are used."""
        return int(self.included.sum())

    @property
    def stations(self) -> int:
        """Number of different points at which a used sample was taken."""
        return len({*zip(self.x[self.included].tolist(), self.y[self.included].tolist(), strict=True)})

    @property
    def two_components(self) -> bool:
        """Whether the samples in use see both directions of the swirl's plane."""
        used = self.direction[self.in_plane]
        return bool(np.any(used[:, 0] != 0.0) and np.any(used[:, 1] != 0.0))

    def without(self, indices: Iterable[int], reason: str) -> Survey:
        """Survey with some samples set aside: kept and listed with the reason, but not used.

        Parameters
        ----------
        indices : iterable of int
            Samples, counted from 0.
        reason : str
            Why; it appears in the record.

        Returns
        -------
        Survey

        Raises
        ------
        SurveyError
            If an index is not a sample, the reason is empty, or fewer than three samples would be left.
        """
        if not reason.strip():
            raise SurveyError("say why the samples are set aside; the reason appears in the record.")
        return dataclasses.replace(self, set_aside={**self.set_aside, **{int(index): reason for index in indices}})

    def with_samples(self, indices: Iterable[int]) -> Survey:
        """Survey with some of the samples that were set aside in use again."""
        back = {int(index) for index in indices}
        _check_indices(back, self.velocity.size)
        return dataclasses.replace(self, set_aside={i: why for i, why in self.set_aside.items() if i not in back})

    def with_all(self) -> Survey:
        """Survey with every sample in use again."""
        return dataclasses.replace(self, set_aside={})

    def with_facts(self, **facts: Any) -> Survey:
        """Survey with facts added or replaced, in SI units; None removes a fact."""
        merged = {**self.facts, **facts}
        return dataclasses.replace(self, facts={key: value for key, value in merged.items() if value is not None})

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Survey):
            return NotImplemented
        return all(_same(getattr(self, item.name), getattr(other, item.name)) for item in dataclasses.fields(self))

    def __hash__(self) -> int:
        return hash((self.geometry, self.velocity.tobytes(), self.x.tobytes(), tuple(self.set_aside)))

    def __str__(self) -> str:
        title = self.facts.get("title")
        reach = np.ptp(self.x) if self.geometry != "plane" else max(np.ptp(self.x), np.ptp(self.y))
        kinds = [name for name, mask in (("in the plane", self.in_plane), ("axial", self.axial)) if mask.any()]
        parts = [
            f"{self.geometry} survey, {self.stations} stations over {reach:.4g} m",
            f"{self.points} samples {' and '.join(kinds)}",
        ]
        if self.set_aside:
            parts.append(f"{len(self.set_aside)} set aside")
        if self.provenance.dropped:
            parts.append(f"{len(self.provenance.dropped)} rows dropped")
        return (f"{title}: " if title else "") + ", ".join(parts)


def _frozen(values: ArrayLike, shape: tuple[int, ...], name: str) -> FloatArray:
    """Own read-only copy of the right shape."""
    array = np.array(values, dtype=float)
    if array.shape != shape:
        raise SurveyError(f"{name} has shape {array.shape}, expected {shape}: one entry per sample.")
    array.setflags(write=False)
    return array


def _check_samples(survey: Survey) -> None:
    """Say what is wrong with the numbers of a survey."""
    limits = (("x", FARTHEST, "m"), ("y", FARTHEST, "m"), ("velocity", FASTEST, "m/s"), ("direction", 1.0 + 1e-9, ""))
    for name, limit, unit in limits:
        values = getattr(survey, name).reshape(survey.velocity.size, -1)
        bad = np.flatnonzero(~(np.abs(values) <= limit).all(axis=1))
        if bad.size:
            value = values[bad[0]][~(np.abs(values[bad[0]]) <= limit)][0]
            raise SurveyError(
                f"{name} of sample {bad[0]} is {value:g} {unit}".rstrip()
                + f", beyond anything that is measured (limit {limit:g} {unit}".rstrip()
                + "); check the unit, or leave the sample out."
            )
    if survey.velocity.size - len(survey.set_aside) < FEWEST_SAMPLES:
        left = survey.velocity.size - len(survey.set_aside)
        raise SurveyError(f"the survey has {left} samples in use; at least {FEWEST_SAMPLES} are needed, add points.")
    if np.ptp(survey.x) == 0.0 and np.ptp(survey.y) == 0.0:
        raise SurveyError(
            f"all {survey.x.size} samples are at the same position ({survey.x[0]:g} m); a survey needs positions that differ."
        )
    lengths = np.linalg.norm(survey.direction, axis=1)
    if np.any(np.abs(lengths - 1.0) > 1e-9):
        worst = int(np.argmax(np.abs(lengths - 1.0)))
        raise SurveyError(f"direction of sample {worst} has length {lengths[worst]:g}; give unit vectors.")
    for name, unit in (("uncertainty", "m/s"), ("pressure_uncertainty", "Pa")):
        values = getattr(survey, name)
        if values is None:
            continue
        bad = np.flatnonzero(~((values > 0.0) & np.isfinite(values)) if name == "uncertainty" else values < 0.0)
        if bad.size:
            raise SurveyError(
                f"{name} must be positive, got {values[bad[0]]:g} {unit} at sample {bad[0]}; give the standard uncertainty, "
                "or leave all uncertainties out to have the scatter estimated from the fit."
            )


def _check_indices(indices: Iterable[int], number: int) -> None:
    for index in indices:
        if not 0 <= index < number:
            raise SurveyError(f"there is no sample {index}; the survey has samples 0 to {number - 1}.")


def _estimate(given: Given, quantity: str) -> Estimate:
    """Turn a person's number into an Estimate; a wrong one is the survey's fault."""
    try:
        return as_estimate(given, quantity)
    except ValueError as error:
        raise SurveyError(str(error)) from error


def _factor_of_one(given: Given, quantity: str) -> Estimate:
    estimate = _estimate(given, quantity)
    if estimate.value != 1.0:
        raise SurveyError(
            f"{quantity} must be 1 with its standard uncertainty, got {estimate.value:g}; correct the "
            f"{'velocities' if quantity == 'velocity_gain' else 'positions'} first, then state {quantity}=(1, uncertainty)."
        )
    return estimate


def _facts(facts: Mapping[str, Any]) -> dict[str, str | float | Estimate]:
    """Facts as text, numbers and Estimates; the numbers that are quantities are checked."""
    checked: dict[str, str | float | Estimate] = {}
    for name, value in facts.items():
        if isinstance(value, str):
            checked[name] = value
        elif name in FACT_QUANTITIES:
            checked[name] = _estimate(value, FACT_QUANTITIES[name])
        elif isinstance(value, Estimate):
            checked[name] = value
        elif isinstance(value, int | float | np.floating | np.integer):
            checked[name] = float(value)
        else:
            raise SurveyError(f"fact {name} must be text or a number, got {value!r}.")
    return checked


def _stack(
    x: FloatArray,
    y: FloatArray,
    components: list[tuple[ArrayLike | None, tuple[float, float, float], str]],
    uncertainty: ArrayLike | None,
    pressure: ArrayLike | None,
    provenance: Provenance | None,
) -> dict[str, Any]:
    """Fields of a survey from one array per component; stations with a missing value are left out and listed."""
    given = [
        (np.asarray(values, dtype=float).ravel(), vector, name)
        for values, vector, name in components
        if values is not None
    ]
    for values, _, name in given:
        if values.shape != x.shape:
            raise SurveyError(f"{name} has {values.size} values for {x.size} positions; give one value per position.")
    spread = _spread(uncertainty, len(given), x.size)
    static = None if pressure is None else np.asarray(pressure, dtype=float).ravel()
    if static is not None and static.shape != x.shape:
        raise SurveyError(
            f"pressure has {static.size} values for {x.size} positions; give one value per position, NaN if none."
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
    """Standard uncertainties, shape (components, number)."""
    if uncertainty is None:
        return None
    given = np.asarray(uncertainty, dtype=float)
    if given.ndim == 2 and given.shape != (components, number):
        given = given.ravel()
    try:
        return np.array(np.broadcast_to(given, (components, number)))
    except ValueError:
        raise SurveyError(
            f"uncertainty has shape {np.shape(uncertainty)} for {components} components at {number} positions; give one "
            "number, one per position, or one row per component."
        ) from None


def _same(one: object, other: object) -> bool:
    if isinstance(one, np.ndarray) and isinstance(other, np.ndarray):
        return np.array_equal(one, other, equal_nan=True)
    if one is None or other is None or isinstance(one, np.ndarray) or isinstance(other, np.ndarray):
        return one is other
    return bool(one == other)
