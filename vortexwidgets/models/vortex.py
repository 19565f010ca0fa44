"""Vortex: a model with numbers."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from vortexwidgets.quantities import check

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel

FloatArray = npt.NDArray[np.float64]

_STRENGTHS = ("circulation", "swirl_scale", "rotation_rate")


@dataclass(frozen=True, init=False, repr=False)
class Vortex:
    r"""A vortex of a published model, positive counter-clockwise, frozen and equal by value.

    Parameters
    ----------
    model : str or VortexModel
        "lamb-oseen", "rankine", ...
    circulation : float
        Circulation far away, for models that have one. [m²/s]
    swirl_scale : float
        V = Γ/(2π r_c), the alternative to `circulation` where there is a core, and the strength of models without a
        circulation far away. [m/s]
    rotation_rate : float
        Strength of the forced vortex. [rad/s]
    core_radius : float
        The model's own length. [m]
    centre : tuple of float
        Where the axis stands. [m]
    **shape
        Shape parameters of the model by name, such as ``exponent=2.0``; the model's default where not given.

    Attributes
    ----------
    model : VortexModel
    strength : tuple of (str, float)
        Name and value of the number that carries the sign.
    core_radius : float
        0 for a free vortex, infinite for a forced one. [m]
    centre : tuple of float
        [m]
    shape : mapping of str to float

    Raises
    ------
    ValueError
        If a number is missing, of no use to the model, or outside its range.

    Notes
    -----
    ``dataclasses.replace(vortex, core_radius=0.02)`` changes one number; shape parameters are changed by name alike.

    Examples
    --------
    A Rankine vortex of Γ = 2π m²/s and r_c = 1 m has 1 m/s at its edge, and Δp = ρ V² on the axis (by hand).

    >>> vortex = Vortex("rankine", circulation=2 * math.pi, core_radius=1.0)
    >>> vortex.peak_radius, vortex.peak_swirl
    (1.0, 1.0)
    >>> float(vortex.pressure_drop(0.0, density=1000.0))
    1000.0
    >>> Vortex("rankine", circulation=1.0, core_radius=-0.1)
    Traceback (most recent call last):
        ...
    ValueError: core_radius must be positive, got -0.1 m; give the model's own core radius in m.
    """

    model: VortexModel
    strength: tuple[str, float]
    core_radius: float
    centre: tuple[float, float]
    shape: Mapping[str, float] = field(hash=False)

    def __init__(
        self,
        model: str | VortexModel,
        *,
        circulation: float | None = None,
        swirl_scale: float | None = None,
        rotation_rate: float | None = None,
        core_radius: float | None = None,
        centre: tuple[float, float] = (0.0, 0.0),
        strength: tuple[str, float] | None = None,
        shape: Mapping[str, float] | None = None,
        **changes: float,
    ) -> None:
        from vortexwidgets.models.catalogue import model_named

        chosen = model_named(model)
        given = {
            name: value
            for name, value in zip(_STRENGTHS, (circulation, swirl_scale, rotation_rate), strict=True)
            if value is not None
        }
        if not given and strength is not None:
            given = dict([strength])
        numbers = _shape(chosen, {**(shape or {}), **changes}, changes)
        radius = _core_radius(chosen, core_radius)
        object.__setattr__(self, "model", chosen)
        object.__setattr__(self, "strength", (chosen.strength, _strength(chosen, given, radius)))
        object.__setattr__(self, "core_radius", radius)
        object.__setattr__(self, "centre", _centre(centre))
        object.__setattr__(self, "shape", MappingProxyType(numbers))

    # Numbers --------------------------------------------------------------------------------------------------------

    @property
    def circulation(self) -> float:
        """Circulation far away; 0 or infinite where the model has no other. [m²/s]"""
        name, value = self.strength
        if name == "circulation":
            return value
        far = self.model.circulation_far_away
        return 2.0 * math.pi * self._length * self._scale * far if self._scale != 0.0 else 0.0

    @property
    def swirl_scale(self) -> float:
        """V = Γ/(2π r_c); infinite for a free vortex, NaN for a forced one. [m/s]"""
        if self.model.has_core:
            return self._scale
        return math.copysign(math.inf, self.strength[1]) if self.core_radius == 0.0 else math.nan

    @property
    def rotation_rate(self) -> float:
        """Rate at which the fluid on the axis turns, half its vorticity; NaN for a free vortex. [rad/s]"""
        if self.strength[0] == "rotation_rate":
            return self.strength[1]
        return 0.5 * float(self.vorticity(0.0)) if self.model.has_core else math.nan

    @property
    def peak_radius(self) -> float:
        """Distance at which the swirl is largest; 0 for a free vortex, infinite for a forced one. [m]"""
        return self.model.peak_of(*self.shape.values())[0] * self._length

    @property
    def peak_swirl(self) -> float:
        """Largest swirl velocity with its sign; infinite where the model has none. [m/s]"""
        return self.model.peak_of(*self.shape.values())[1] * self._scale if self._scale != 0.0 else 0.0

    @property
    def pressure_constant(self) -> float:
        """K in p∞ - p(0) = K ρ v_peak²; NaN where the model has none. [-]"""
        return self.model.pressure_constant(*self.shape.values())

    # Fields ---------------------------------------------------------------------------------------------------------

    def swirl(self, radius: npt.ArrayLike) -> FloatArray:
        """Azimuthal velocity, positive counter-clockwise.

        Parameters
        ----------
        radius : array_like, shape (...)
            Distance from the axis. [m]

        Returns
        -------
        ndarray, shape of `radius`
            [m/s]

        Raises
        ------
        ValueError
            If a radius is negative or no number.
        """
        return self._of("swirl", radius, self._scale)

    def vorticity(self, radius: npt.ArrayLike) -> FloatArray:
        """Vorticity along the axis; of a free vortex that outside its axis.

        Parameters
        ----------
        radius : array_like, shape (...)
            Distance from the axis. [m]

        Returns
        -------
        ndarray, shape of `radius`
            [1/s]

        Raises
        ------
        ValueError
            If a radius is negative or no number.
        """
        return self._of("vorticity", radius, self._scale / self._length)

    def enclosed_circulation(self, radius: npt.ArrayLike) -> FloatArray:
        """Circulation along a circle about the axis.

        Parameters
        ----------
        radius : array_like, shape (...)
            Radius of the circle. [m]

        Returns
        -------
        ndarray, shape of `radius`
            [m²/s]

        Raises
        ------
        ValueError
            If a radius is negative or no number.
        """
        return self._of("enclosed_circulation", radius, 2.0 * math.pi * self._length * self._scale)

    def pressure_drop(self, radius: npt.ArrayLike, *, density: float) -> FloatArray:
        """Pressure far away less pressure at a radius, by radial equilibrium at constant density.

        Parameters
        ----------
        radius : array_like, shape (...)
            Distance from the axis. [m]
        density : float
            [kg/m³]

        Returns
        -------
        ndarray, shape of `radius`
            Infinite for a forced vortex, which has no far away. [Pa]

        Raises
        ------
        ValueError
            If a radius is negative or the density is not positive.
        """
        return self._of("pressure_drop", radius, check("density", density) * self._scale**2)

    def velocity(self, x: npt.ArrayLike, y: npt.ArrayLike) -> tuple[FloatArray, FloatArray]:
        """Velocity components in the plane; zero on the axis.

        Parameters
        ----------
        x, y : array_like, shapes that broadcast
            [m]

        Returns
        -------
        u, v : ndarray
            [m/s]

        Raises
        ------
        ValueError
            If a coordinate is no number.
        """
        dx, dy = np.broadcast_arrays(_numbers(x, "x") - self.centre[0], _numbers(y, "y") - self.centre[1])
        radius = np.hypot(dx, dy)
        off_axis = np.where(radius > 0.0, radius, self._length)
        rate = self.swirl(off_axis) / off_axis
        return -rate * dy, rate * dx

    def grown(self, *, viscosity: float, time: float) -> Vortex:
        """The same vortex after a time in which its core has grown by diffusion, r_c² = r_0² + 4νt.

        Parameters
        ----------
        viscosity : float
            Kinematic viscosity. [m²/s]
        time : float
            [s]

        Raises
        ------
        ValueError
            If the model has no law of growth, the viscosity is not positive or the time is negative.

        References
        ----------
        .. [1] H. Lamb, Hydrodynamics, 6th ed., Cambridge University Press, 1932, art. 334a.
        """
        if self.model.motion != "growing":
            raise ValueError(
                f"{self.model.name} has no law by which its core grows; use one that diffuses, such as 'lamb-oseen'."
            )
        if not 0.0 <= time < math.inf:
            raise ValueError(f"time must not be negative, got {time} s; give the time that has passed.")
        radius = math.sqrt(self.core_radius**2 + 4.0 * check("kinematic_viscosity", viscosity) * time)
        scale = self._scale * (self.core_radius / radius) ** self.model.decay
        if self.strength[0] == "circulation":
            return self._with(radius, self.strength)
        return self._with(radius, ("swirl_scale", scale))

    # The value itself -----------------------------------------------------------------------------------------------

    def __repr__(self) -> str:
        numbers = {self.strength[0]: self.strength[1]}
        if self.model.has_core:
            numbers["core_radius"] = self.core_radius
        text = ", ".join(f"{name}={value!r}" for name, value in {**numbers, **self.shape}.items())
        centre = "" if self.centre == (0.0, 0.0) else f", centre={self.centre!r}"
        return f"Vortex({self.model.key!r}, {text}{centre})"

    def __reduce__(self) -> tuple[Any, ...]:
        from vortexwidgets.models.catalogue import MODELS

        # By key, so that the model on the other side is the very one of its catalogue.
        model = self.model.key if MODELS.get(self.model.key) is self.model else self.model
        return _rebuild, (model, self.strength, self.core_radius, self.centre, dict(self.shape))

    @property
    def _length(self) -> float:
        return self.core_radius if self.model.has_core else 1.0

    @property
    def _scale(self) -> float:
        """V, with r_c = 1 m for a model without a core."""
        name, value = self.strength
        return value / (2.0 * math.pi * self._length) if name == "circulation" else value

    def _of(self, quantity: Any, radius: npt.ArrayLike, scale: float) -> FloatArray:
        r = _numbers(radius, "radius")
        if r.size and r.min() < 0.0:
            raise ValueError(f"radius must not be negative, got {r.min():g} m; give the distance from the axis.")
        if scale == 0.0:
            return np.zeros(r.shape)[()]
        result: FloatArray = scale * self.model.kernel(quantity)(r / self._length, *self.shape.values())
        return result

    def _with(self, core_radius: float, strength: tuple[str, float]) -> Vortex:
        return Vortex(self.model, strength=strength, core_radius=core_radius, centre=self.centre, shape=self.shape)


def _numbers(values: npt.ArrayLike, name: str) -> FloatArray:
    try:
        return np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError):
        raise ValueError(f"{name} must be a number or an array of numbers in m, got {values!r:.60}.") from None


def _rebuild(
    model: str | VortexModel,
    strength: tuple[str, float],
    core_radius: float,
    centre: tuple[float, float],
    shape: dict[str, float],
) -> Vortex:
    return Vortex(model, strength=strength, core_radius=core_radius, centre=centre, shape=shape)


def _core_radius(model: VortexModel, value: float | None) -> float:
    if model.has_core:
        if value is None:
            raise ValueError(f"{model.name} needs core_radius, its own length in m.")
        return check("core_radius", value)
    none = 0.0 if model.strength == "circulation" else math.inf
    if value is not None and value != none:
        raise ValueError(f"A {model.name.lower()} vortex has no core radius, got {value!r} m; leave it out.")
    return none


def _strength(model: VortexModel, given: Mapping[str, float], core_radius: float) -> float:
    allowed = [model.strength]
    if model.strength == "circulation" and model.has_core:
        allowed.append("swirl_scale")
    wrong = [name for name in given if name not in allowed]
    if wrong:
        raise ValueError(f"{model.name} takes {' or '.join(allowed)}, got {wrong[0]} = {given[wrong[0]]!r}.")
    if len(given) != 1:
        got = "neither" if len(allowed) > 1 else "none"
        raise ValueError(f"{model.name} takes {' or '.join(allowed)}, got {' and '.join(given) or got}; give one.")
    ((name, value),) = given.items()
    number = check(name, value)
    return number if name == model.strength else 2.0 * math.pi * core_radius * number


def _centre(value: tuple[float, float]) -> tuple[float, float]:
    try:
        x, y = value
    except (TypeError, ValueError) as error:
        raise ValueError(f"centre must be two numbers (x, y) in m, got {value!r:.60}.") from error
    return check("centre_x", x), check("centre_y", y)


def _shape(model: VortexModel, values: Mapping[str, float], named: Mapping[str, float]) -> dict[str, float]:
    known = {parameter.name: parameter for parameter in model.shape}
    unknown = [name for name in values if name not in known and name in named]
    if unknown:
        import difflib

        names = [*_STRENGTHS, "core_radius", "centre", *known]
        close = difflib.get_close_matches(unknown[0], names, n=1)
        hint = f"; did you mean '{close[0]}'?" if close else "."
        shape = f"shape parameters: {', '.join(known)}" if known else "no shape parameter"
        raise ValueError(f"{model.name} has no number '{unknown[0]:.60}'{hint} It has {shape}.")
    found = {}
    for name, parameter in known.items():
        low, high = parameter.valid
        number = values.get(name, parameter.default)
        if isinstance(number, bool | str) or not hasattr(number, "__float__") or not low < float(number) < high:
            raise ValueError(f"{name} of {model.name} must lie between {low:g} and {high:g}, got {number!r:.60}.")
        found[name] = float(number)
    return found
