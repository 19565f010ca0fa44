"""Every physical quantity once: name, symbol, SI unit, valid range, typical range."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

ANY = (-math.inf, math.inf)
POSITIVE = (0.0, math.inf)


@dataclass(frozen=True)
class Quantity:
    """One physical quantity, as every part of the package names, checks and shows it.

    Parameters
    ----------
    key : str
        Full name, the one used for arguments, labels and tables.
    symbol, text_symbol : str
        LaTeX and Unicode.
    unit : str
        SI unit in Unicode, empty for a plain number. Salinity alone keeps the g/kg in which oceanography states it.
    description : str
        One sentence without its full stop.
    valid : tuple of float
        Values outside are refused. [SI]
    typical : tuple of float
        Ends of a slider. [SI]
    display_units : mapping of str to str
        Unit for people by system, "SI" or "US".
    zero_allowed : bool
        Whether the lower end of `valid` is itself valid.
    remedy : str
        What a refusal tells a person to do.
    """

    key: str
    symbol: str
    text_symbol: str
    unit: str
    description: str
    valid: tuple[float, float] = ANY
    typical: tuple[float, float] = (0.0, 1.0)
    display_units: Mapping[str, str] = field(default_factory=dict, hash=False)
    zero_allowed: bool = False
    remedy: str = ""

    @property
    def name(self) -> str:
        """Name with blanks, for labels."""
        return self.key.replace("_", " ")


_LENGTH = {"SI": "mm", "US": "in"}
_DISTANCE = {"SI": "m", "US": "ft"}
_SPEED = {"SI": "m/s", "US": "ft/s"}
_PRESSURE = {"SI": "kPa", "US": "psi"}
_ABSOLUTE = "give the absolute pressure in Pa, near 101325 Pa in the open air"

_ALL = (
    # Where
    Quantity("radius", "r", "r", "m", "Distance from the axis", POSITIVE, (1e-3, 1.0), _LENGTH, True),
    Quantity("position", "s", "s", "m", "Position along the measured line", ANY, (-0.2, 0.2), _LENGTH),
    Quantity("centre_x", "x_0", "x₀", "m", "First coordinate of the axis", ANY, (-0.1, 0.1), _LENGTH),
    Quantity("centre_y", "y_0", "y₀", "m", "Second coordinate of the axis", ANY, (-0.1, 0.1), _LENGTH),
    Quantity("miss_distance", "h", "h", "m", "Distance by which the measured line misses the axis", ANY, (0.0, 0.05),
             _LENGTH),
    Quantity("elevation", "z", "z", "m", "Height above the reference level", ANY, (-100.0, 1000.0), _DISTANCE),
    Quantity("depth", "d", "d", "m", "Depth of the axis below the free surface", POSITIVE, (0.1, 10.0), _DISTANCE, True,
             "give the depth in m, positive downwards"),
    Quantity("submergence", "S", "S", "m", "Depth of the intake below the free surface", POSITIVE, (0.1, 10.0),
             _DISTANCE, True, "give the depth in m, positive downwards"),
    Quantity("length_scale", "L", "L", "m", "Length by which positions are divided", POSITIVE, (1e-3, 10.0), _LENGTH,
             remedy="give the length in m"),
    Quantity("reference_radius", "R", "R", "m", "Radius at which the reference pressure holds", POSITIVE, (1e-2, 10.0),
             _LENGTH, remedy="give the radius of the wall or tap in m, or leave it out for the far field"),
    # The vortex
    Quantity("core_radius", "r_c", "r_c", "m", "Length scale of the profile", POSITIVE, (1e-3, 1.0), _LENGTH,
             remedy="give the model's own core radius in m"),
    Quantity("peak_radius", "r_p", "r_p", "m", "Radius of the largest swirl velocity", POSITIVE, (1e-3, 1.0), _LENGTH,
             remedy="give the radius in m"),
    Quantity("circulation", r"\Gamma", "Γ", "m²/s", "Circulation far from the axis, positive counter-clockwise", ANY,
             (0.01, 10.0), {"SI": "m²/s", "US": "ft²/s"}),
    Quantity("enclosed_circulation", r"\Gamma(r)", "Γ(r)", "m²/s", "Circulation within a radius", ANY, (0.01, 10.0),
             {"SI": "m²/s", "US": "ft²/s"}),
    Quantity("swirl_scale", "V", "V", "m/s", "Velocity scale Γ/(2π r_c) of the profile", ANY, (0.1, 100.0), _SPEED),
    Quantity("rotation_rate", r"\Omega", "Ω", "rad/s", "Rate of solid-body rotation, positive counter-clockwise", ANY,
             (0.1, 100.0), {"SI": "rad/s", "US": "rpm"}),
    Quantity("exponent", "n", "n", "", "Shape exponent of the profile", POSITIVE, (0.5, 10.0),
             remedy="give a positive number"),
    # What is measured
    Quantity("velocity", "v", "v", "m/s", "Velocity component", ANY, (-50.0, 50.0), _SPEED),
    Quantity("swirl", r"v_\theta", "v_θ", "m/s", "Azimuthal velocity, positive counter-clockwise", ANY, (-50.0, 50.0),
             _SPEED),
    Quantity("peak_swirl", "v_p", "v_p", "m/s", "Largest swirl velocity, with its sign", ANY, (0.1, 50.0), _SPEED),
    Quantity("axial_velocity", "w", "w", "m/s", "Velocity along the axis", ANY, (-50.0, 50.0), _SPEED),
    Quantity("background_velocity", "U_b", "U_b", "m/s", "Uniform flow in which the vortex sits", ANY, (-5.0, 5.0),
             _SPEED),
    Quantity("velocity_gradient", "G", "G", "1/s", "Gradient of the flow in which the vortex sits", ANY, (-10.0, 10.0)),
    Quantity("vorticity", r"\omega", "ω", "1/s", "Vorticity, positive counter-clockwise", ANY, (0.0, 1000.0)),
    Quantity("wander", r"\sigma_w", "σ_w", "m", "Standard deviation of the axis along one direction", POSITIVE,
             (0.0, 0.02), _LENGTH, True, "give a standard deviation in m"),
    Quantity("probe_width", "b", "b", "m", "Width over which the probe averages", POSITIVE, (0.0, 0.02), _LENGTH, True,
             "give a width in m"),
    Quantity("velocity_gain", "g", "g", "", "Factor common to all velocities", POSITIVE, (0.9, 1.1),
             remedy="give a number near 1 with its standard uncertainty"),
    Quantity("position_scale", "q", "q", "", "Factor common to all positions", POSITIVE, (0.9, 1.1),
             remedy="give a number near 1 with its standard uncertainty"),
    # Pressure
    Quantity("pressure", "p", "p", "Pa", "Static pressure", ANY, (0.0, 2e5), _PRESSURE),
    Quantity("pressure_drop", r"\Delta p(r)", "Δp(r)", "Pa", "Pressure far away less pressure at a radius", ANY,
             (0.0, 1e5), _PRESSURE),
    Quantity("core_pressure", "p(0)", "p(0)", "Pa", "Absolute pressure on the axis", ANY, (0.0, 2e5), _PRESSURE),
    Quantity("core_pressure_drop", r"\Delta p", "Δp", "Pa", "Pressure far away less pressure on the axis", ANY,
             (0.0, 1e5), _PRESSURE),
    Quantity("ambient_pressure", r"p_\infty", "p∞", "Pa", "Absolute pressure far away at the elevation of the axis",
             POSITIVE, (8e4, 2e5), _PRESSURE, remedy=_ABSOLUTE),
    Quantity("surface_pressure", "p_s", "p_s", "Pa", "Absolute pressure on the free surface", POSITIVE, (8e4, 1.1e5),
             _PRESSURE, remedy=_ABSOLUTE),
    Quantity("pressure_rate", r"\dot p", "dp/dt", "Pa/s", "Largest rate of pressure change", ANY, (0.0, 1e4),
             {"SI": "kPa/s", "US": "psi/s"}),
    Quantity("pressure_constant", "K", "K", "", "K in drop = K ρ v_p²", ANY, (1.0, 2.0)),
    Quantity("cavitation_number", r"\sigma", "σ", "", "(p∞ - p_v) / (½ρU²)", ANY, (0.1, 10.0)),
    Quantity("pressure_coefficient", "C_p", "C_p", "", "Pressure difference divided by ½ρU²", ANY, (-10.0, 1.0)),
    Quantity("tensile_strength", "T", "T", "Pa", "Tension that the water bears before it cavitates", POSITIVE,
             (0.0, 1e5), _PRESSURE, True, "give a tension as a positive pressure, 0 Pa when none is known"),
    # The fluid
    Quantity("temperature", r"\vartheta", "T", "K", "Temperature of the fluid", POSITIVE, (273.15, 313.15),
             {"SI": "°C", "US": "°F"}, remedy="give the temperature with its unit"),
    Quantity("density", r"\rho", "ρ", "kg/m³", "Density of the fluid", POSITIVE, (1.0, 1100.0),
             {"SI": "kg/m³", "US": "lb/ft³"}, remedy="give the density in kg/m³"),
    Quantity("kinematic_viscosity", r"\nu", "ν", "m²/s", "Kinematic viscosity of the fluid", POSITIVE, (1e-7, 1e-4),
             {"SI": "mm²/s", "US": "ft²/s"}, remedy="give the viscosity in m²/s, near 1e-6 m²/s for water"),
    Quantity("vapour_pressure", "p_v", "p_v", "Pa", "Pressure at which the fluid boils", POSITIVE, (600.0, 1e4),
             _PRESSURE, remedy="give an absolute pressure in Pa"),
    Quantity("surface_tension", "S", "S", "N/m", "Surface tension against air or the fluid's own vapour", POSITIVE,
             (0.02, 0.08), {"SI": "mN/m", "US": "mN/m"}, remedy="give it in N/m, near 0.073 N/m for water"),
    Quantity("salinity", "S_A", "S_A", "g/kg", "Absolute salinity", POSITIVE, (0.0, 42.0),
             {"SI": "g/kg", "US": "g/kg"}, True, "give the mass of salt in g per kg of sea water, near 35"),
    Quantity("humidity", r"\varphi", "φ", "", "Relative humidity as a fraction", (0.0, 1.0), (0.0, 1.0), {}, True,
             "give a fraction between 0 and 1"),
    Quantity("gas_saturation", "a", "a", "", "Dissolved gas as a fraction of saturation", POSITIVE, (0.1, 1.2), {},
             True, "give a fraction, 1 for water saturated with air"),
    Quantity("heat_capacity_ratio", r"\gamma", "γ", "", "Ratio of the heat capacities of a gas", (1.0, 2.0),
             (1.1, 1.67), remedy="give a number between 1 and 2, near 1.40 for air"),
    # The site
    Quantity("gravity", "g", "g", "m/s²", "Acceleration of free fall", POSITIVE, (9.78, 9.84), {},
             remedy="give it in m/s², near 9.81"),
    Quantity("speed", "U", "U", "m/s", "Speed that a coefficient is formed with", POSITIVE, (0.1, 100.0),
             _SPEED, remedy="give the speed in m/s, or leave it out when there is none"),
    Quantity("free_stream", r"U_\infty", "U∞", "m/s", "Speed of the undisturbed flow", POSITIVE, (0.1, 100.0),
             _SPEED, remedy="give the speed in m/s, or leave it out when there is none"),
    Quantity("translation_speed", "U_t", "U_t", "m/s", "Speed at which the vortex passes", POSITIVE, (0.0, 30.0),
             _SPEED, True, "give the speed in m/s without a sign"),
    # What follows
    Quantity("dip_depth", "h_d", "h_d", "m", "Depth of the free surface below its far level", ANY, (0.0, 0.5), _LENGTH),
    Quantity("time", "t", "t", "s", "Time", ANY, (0.0, 100.0)),
    Quantity("frequency", "f", "f", "1/s", "Frequency", POSITIVE, (0.1, 1000.0), {}, True, "give it in 1/s"),
    Quantity("angle", r"\beta", "β", "rad", "Angle", ANY, (-0.5, 0.5), {"SI": "deg", "US": "deg"}),
    Quantity("ratio", "q", "q", "", "Ratio of two equal quantities", ANY, (0.0, 1.0)),
    Quantity("reynolds_number", r"\mathrm{Re}", "Re", "", "Reynolds number", ANY, (1e3, 1e7)),
    Quantity("probability", "P", "P", "", "Probability", (0.0, 1.0), (0.0, 1.0), {}, True,
             "give a fraction between 0 and 1"),
)  # fmt: skip

QUANTITIES: Mapping[str, Quantity] = MappingProxyType({quantity.key: quantity for quantity in _ALL})
"""Every quantity by its key."""


def quantity_named(key: str) -> Quantity:
    """Look a quantity up.

    Raises
    ------
    ValueError
        If there is none of that name; the message says which is closest.
    """
    quantity = QUANTITIES.get(key)
    if quantity is None:
        import difflib

        close = difflib.get_close_matches(key, QUANTITIES, n=1)
        hint = f"; did you mean '{close[0]}'?" if close else f"; known are {', '.join(QUANTITIES)}."
        raise ValueError(f"No quantity named '{key[:60]}'{hint}")
    return quantity


def check(key: str, value: float) -> float:
    """Return a value that lies in the valid range of its quantity, as a float.

    Parameters
    ----------
    key : str
        Key of the quantity.
    value : float
        [SI]

    Returns
    -------
    float

    Raises
    ------
    ValueError
        If the value is no finite number, or outside the range; the message says what to give instead.

    Examples
    --------
    >>> check("core_radius", -0.1)
    Traceback (most recent call last):
        ...
    ValueError: core_radius must be positive, got -0.1 m; give the model's own core radius in m.
    """
    quantity = quantity_named(key)
    if isinstance(value, bool | str | bytes | complex) or not hasattr(value, "__float__"):
        raise ValueError(f"{key} must be a number{_in(quantity)}, got {value!r:.60}{_remedy(quantity)}")
    try:
        number = float(value)
    except (TypeError, ValueError) as error:
        raise ValueError(f"{key} must be one number{_in(quantity)}, got {value!r:.60}{_remedy(quantity)}") from error
    if not math.isfinite(number):
        raise ValueError(f"{key} must be a finite number{_in(quantity)}, got {number}{_remedy(quantity)}")
    low, high = quantity.valid
    if low < number < high or (quantity.zero_allowed and number in (low, high)):
        return number
    if math.isfinite(high):
        rule = f"lie between {low:g} and {high:g}{_in(quantity)}"
    else:
        rule = "not be negative" if quantity.zero_allowed else "be positive"
    raise ValueError(f"{key} must {rule}, got {number:g} {quantity.unit}".rstrip() + _remedy(quantity))


def _in(quantity: Quantity) -> str:
    return f" in {quantity.unit}" if quantity.unit else ""


def _remedy(quantity: Quantity) -> str:
    return f"; {quantity.remedy}." if quantity.remedy else "."
