"""Survey: velocity components at points, with uncertainties and provenance."""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike

from vortexwidgets.survey.samples import (
    BoolArray,
    Component,
    DroppedRow,
    FloatArray,
    Provenance,
    SurveyError,
    as_numbers,
    check_indices,
    check_miss_distance,
    check_samples,
    checked_facts,
    factor_of_one,
    own_column,
    stacked_columns,
    stated_estimate,
)
from vortexwidgets.uncertainty import Estimate, Given

if TYPE_CHECKING:
    from vortexwidgets.models.vortex import Vortex

__all__ = ["DroppedRow", "Geometry", "Provenance", "Survey", "SurveyError", "require_survey"]

Geometry = Literal["radial", "traverse", "plane"]
UNIT_GAIN = Estimate(1.0, 0.0, "velocity_gain")
UNIT_SCALE = Estimate(1.0, 0.0, "position_scale")


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
        Standard uncertainty (k = 1) of each sample, independent; None when the scatter is not known. [m/s]
    set_aside : mapping of int to str
        Samples that are kept but not used, with the reason.
    geometry : {"radial", "traverse", "plane"}
        How the points lie: at known distances from the axis, on a line, or in a plane.
    miss_distance : Estimate, optional
        Stated distance between the line of a traverse and the axis, not negative and not longer than the line; None
        when it was not stated. [m]
    velocity_gain, position_scale : number, (value, standard uncertainty) or Estimate
        1 with the standard uncertainty that is common to all velocities or to all positions. It does not average out.
    facts : mapping
        What is known about the test: title, fluid, temperature [K], ambient_pressure [Pa], free_stream [m/s], ... (SI).
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
    velocity_gain: Estimate = UNIT_GAIN
    position_scale: Estimate = UNIT_SCALE
    facts: Mapping[str, str | float | Estimate] = field(default_factory=dict)
    pressure: FloatArray | None = None
    pressure_uncertainty: FloatArray | None = None
    provenance: Provenance = field(default_factory=Provenance)

    def __post_init__(self) -> None:
        number = np.size(self.velocity)
        for name in ("x", "y", "velocity", "uncertainty", "pressure", "pressure_uncertainty"):
            given = getattr(self, name)
            if given is not None:
                object.__setattr__(self, name, own_column(given, (number,), name))
        object.__setattr__(self, "direction", own_column(self.direction, (number, 3), "direction"))
        if self.geometry not in ("radial", "traverse", "plane"):
            raise SurveyError(f"geometry must be radial, traverse or plane, got {self.geometry!r}.")
        columns = ("x", "y", "direction", "velocity", "uncertainty", "pressure_uncertainty")
        check_samples({name: getattr(self, name) for name in columns}, len(self.set_aside))
        for name in ("velocity_gain", "position_scale"):
            object.__setattr__(self, name, factor_of_one(getattr(self, name), name))
        if self.miss_distance is not None:
            object.__setattr__(self, "miss_distance", stated_estimate(self.miss_distance, "miss_distance"))
            check_miss_distance(self.miss_distance, self.x)
        aside = {int(index): str(reason) for index, reason in sorted(self.set_aside.items())}
        check_indices(aside, number)
        object.__setattr__(self, "set_aside", aside)
        object.__setattr__(self, "facts", checked_facts(self.facts))

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
        distance = np.ravel(as_numbers(radius, "radius"))
        if np.any(distance < 0.0):
            raise SurveyError(
                f"radius must not be negative, got {distance.min():g} m; for positions on both sides of the axis use "
                "Survey.traverse, which finds the centre."
            )
        components: list[Component] = [(swirl, (0.0, 1.0, 0.0), "swirl"), (axial, (0.0, 0.0, 1.0), "axial")]
        stacked = stacked_columns(distance, np.zeros_like(distance), components, uncertainty, pressure, provenance)
        return cls(
            geometry="radial",
            velocity_gain=factor_of_one(velocity_gain, "velocity_gain"),
            position_scale=factor_of_one(position_scale, "position_scale"),
            facts=facts,
            **stacked,
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

        The line is the x axis. The line may miss the axis of the vortex: the component along it shows by how much.

        Parameters
        ----------
        position : array_like, shape (N,)
            Position along the line; repeats and any order are welcome. [m]
        velocity : array_like, shape (N,)
            Component across the line, in the plane of the swirl, positive to the left of increasing position. [m/s]
        uncertainty : number or array_like, shape (N,) or (components, N), optional
            Standard uncertainty of each sample; components in the order velocity, along, axial. [m/s]
        along, axial : array_like, shape (N,), optional
            Component along the line, positive with increasing position, and along the axis of the vortex. [m/s]
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
        line = np.ravel(as_numbers(position, "position"))
        components: list[Component] = [
            (velocity, (0.0, 1.0, 0.0), "velocity"),
            (along, (1.0, 0.0, 0.0), "along"),
            (axial, (0.0, 0.0, 1.0), "axial"),
        ]
        stacked = stacked_columns(line, np.zeros_like(line), components, uncertainty, pressure, provenance)
        return cls(
            geometry="traverse",
            miss_distance=None if miss_distance is None else stated_estimate(miss_distance, "miss_distance"),
            velocity_gain=factor_of_one(velocity_gain, "velocity_gain"),
            position_scale=factor_of_one(position_scale, "position_scale"),
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
        """Velocity vectors in a plane across the axis, x to the right, y up; circulation is positive counter-clockwise.

        Parameters
        ----------
        x, y : array_like, shape (N,) or (rows, columns); or (columns,) and (rows,) with u of shape (rows, columns)
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
        across, up = as_numbers(x, "x"), as_numbers(y, "y")
        shape = np.shape(u)
        if across.ndim == up.ndim == 1 and len(shape) == 2 and shape == (up.size, across.size):
            across, up = np.meshgrid(across, up)
        if across.shape != up.shape:
            raise SurveyError(
                f"x has shape {across.shape} and y has shape {up.shape}; give one x and one y per vector."
            )
        components: list[Component] = [(u, (1.0, 0.0, 0.0), "u"), (v, (0.0, 1.0, 0.0), "v"), (w, (0.0, 0.0, 1.0), "w")]
        stacked = stacked_columns(across.ravel(), up.ravel(), components, uncertainty, pressure, provenance)
        return cls(
            geometry="plane",
            velocity_gain=factor_of_one(velocity_gain, "velocity_gain"),
            position_scale=factor_of_one(position_scale, "position_scale"),
            facts=facts,
            **stacked,
        )

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
        return np.asarray(self.included & (self.direction[:, 2] == 0.0))

    @cached_property
    def axial(self) -> BoolArray:
        """Which samples are used and measure the velocity along the axis of the vortex, shape (N,)."""
        return np.asarray(self.included & (self.direction[:, 2] != 0.0))

    @property
    def points(self) -> int:
        """Number of samples that are used."""
        return int(self.included.sum())

    @property
    def stations(self) -> int:
        """Number of different points at which a used sample was taken."""
        return len({*zip(self.x[self.included].tolist(), self.y[self.included].tolist(), strict=True)})

    @cached_property
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
        check_indices(back, self.velocity.size)
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


def require_survey(value: object) -> Survey:
    """Hand a survey back; say what to do where a file name or something else was given for one.

    Raises
    ------
    SurveyError
        If it is not a survey.
    """
    if isinstance(value, Survey):
        return value
    if isinstance(value, str | os.PathLike):
        shown = repr(os.fspath(value))[:80]
        raise SurveyError(f"a survey is needed, got the file name {shown}; read it first: vx.read_survey({shown}).")
    raise SurveyError(
        f"a survey is needed, got {value!r:.60}; make one with vx.read_survey, Survey.traverse, Survey.radial or "
        "Survey.plane."
    )


def _same(one: object, other: object) -> bool:
    if isinstance(one, np.ndarray) and isinstance(other, np.ndarray):
        return np.array_equal(one, other, equal_nan=True)
    if one is None or other is None or isinstance(one, np.ndarray) or isinstance(other, np.ndarray):
        return one is other
    return bool(one == other)
