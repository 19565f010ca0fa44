"""Fluid values with temperature, uncertainty and source: water, sea water, air, helium; Site."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any, Literal

from vortexwidgets import fluid_equations as equations
from vortexwidgets.fluid_equations import STANDARD_ATMOSPHERE, ZERO_CELSIUS
from vortexwidgets.formatting import format_number, table
from vortexwidgets.property_library import (
    celsius,
    checked_state,
    from_zero,
    library,
    moist_air,
    phase_of,
    saturated,
    with_uncertainty,
)
from vortexwidgets.quantities import check
from vortexwidgets.uncertainty import Estimate, Given, as_estimate, propagate

STANDARD_GRAVITY = 9.80665
"""[m/s²] exact, 3rd CGPM (1901)."""

LAMBDA_POINT = 2.1768
"""[K] Below, helium-4 under its own vapour is a superfluid: H. Preston-Thomas, Metrologia 27 (1990) 3-10, ITS-90."""

LOWEST_ABSOLUTE = 50e3
"""[Pa] A reference pressure below this looks like a gauge reading; common practice."""

Orientation = Literal["surface", "submerged", "air"]
Inception = Literal["incipient", "desinent"]


@dataclass(frozen=True)
class Fluid:
    """A fluid at one temperature and pressure.

    Parameters
    ----------
    name : str
    temperature : float, (float, float) or Estimate
        [K]
    pressure : float, (float, float) or Estimate
        Absolute. [Pa]
    density : float, (float, float) or Estimate
        [kg/m³]
    kinematic_viscosity : float, (float, float) or Estimate
        [m²/s]
    vapour_pressure, surface_tension : float, (float, float), Estimate or None
        None for a gas. [Pa], [N/m]
    heat_capacity_ratio : float or None
        None for a liquid.
    source : str
        One sentence: equation and its stated uncertainty.

    Raises
    ------
    ValueError
        If a number is outside the range of its quantity.
    """

    name: str
    temperature: Estimate
    pressure: Estimate
    density: Estimate
    kinematic_viscosity: Estimate
    vapour_pressure: Estimate | None = None
    surface_tension: Estimate | None = None
    heat_capacity_ratio: float | None = None
    source: str = "stated by the user"

    def __post_init__(self) -> None:
        if not self.name:
            raise ValueError("A fluid needs a name; give for example name='glycerine 40 %'.")
        _settle(self, "temperature", "pressure", "density", "kinematic_viscosity", "vapour_pressure", "surface_tension")
        if self.heat_capacity_ratio is not None:
            object.__setattr__(self, "heat_capacity_ratio", check("heat_capacity_ratio", self.heat_capacity_ratio))

    @property
    def is_gas(self) -> bool:
        """Whether the fluid has no vapour pressure, so that it cannot cavitate."""
        return self.vapour_pressure is None

    def __str__(self) -> str:
        rows = [
            [name.replace("_", " "), str(getattr(self, name))]
            for name in (
                "temperature",
                "pressure",
                "density",
                "kinematic_viscosity",
                "vapour_pressure",
                "surface_tension",
            )
            if getattr(self, name) is not None
        ]
        if self.heat_capacity_ratio is not None:
            rows.append(["heat capacity ratio", format_number(self.heat_capacity_ratio)])
        return f"{self.name}\n{table(rows)}\n{self.source}"


@dataclass(frozen=True)
class Site:
    """Where the vortex is: reference pressure, depth, orientation, speed.

    Parameters
    ----------
    ambient_pressure : float, (float, float) or Estimate, optional
        Absolute static pressure at the elevation of the axis, where the swirl has died away. [Pa]
    surface_pressure : float, (float, float) or Estimate, optional
        Absolute pressure on the free surface; with `depth` it gives the pressure at the axis. [Pa]
    depth : float, (float, float) or Estimate, optional
        Of the axis, or of the survey, below the free surface. [m]
    gravity : float
        [m/s²]
    reference_radius : float, optional
        Radius of a wall or tap whose pressure is the reference, in place of the far field. [m]
    orientation : "surface", "submerged" or "air", optional
        A vertical vortex that reaches a free surface, one that does not, or one in a gas.
    speed : float, (float, float) or Estimate, optional
        Speed that coefficients are formed with. [m/s]
    speed_name : str
        What that speed is, as "free stream" or "nD".
    tensile_strength : float, (float, float) or Estimate
        Tension that the water bears: it cavitates at vapour pressure less this. [Pa]
    gas_saturation : float, optional
        Dissolved gas as a fraction of saturation.
    inception : "incipient" or "desinent", optional
        How the onset of cavitation is judged.
    translation_speed : float, (float, float) or Estimate, optional
        Speed at which the vortex passes. [m/s]
    elevation : float, (float, float) or Estimate, optional
        Of the site, for the record. [m]
    submergence : float, (float, float) or Estimate, optional
        Of an intake below the free surface. [m]
    confirm_absolute : bool
        Says that a pressure below 50 kPa is absolute.

    Raises
    ------
    ValueError
        If a pressure looks like a gauge reading, a word is not one of those above, or a number is outside its range.
    """

    ambient_pressure: Estimate | None = None
    surface_pressure: Estimate | None = None
    depth: Estimate | None = None
    gravity: float = STANDARD_GRAVITY
    reference_radius: float | None = None
    orientation: Orientation | None = None
    speed: Estimate | None = None
    speed_name: str = "free stream"
    tensile_strength: Estimate = 0.0  # type: ignore[assignment]  # becomes an Estimate in __post_init__
    gas_saturation: float | None = None
    inception: Inception | None = None
    translation_speed: Estimate | None = None
    elevation: Estimate | None = None
    submergence: Estimate | None = None
    confirm_absolute: bool = False

    def __post_init__(self) -> None:
        _settle(self, "ambient_pressure", "surface_pressure", "depth", "speed", "tensile_strength", "translation_speed",
                "elevation", "submergence")  # fmt: skip
        for name in ("gravity", "reference_radius", "gas_saturation"):
            if getattr(self, name) is not None:
                object.__setattr__(self, name, check(name, getattr(self, name)))
        for name, words in (
            ("orientation", ("surface", "submerged", "air")),
            ("inception", ("incipient", "desinent")),
        ):
            word = getattr(self, name)
            if word is not None and word not in words:
                raise ValueError(
                    f"{name} must be one of {', '.join(words)}, got {word!r:.60}; leave it out if unknown."
                )
        if not self.speed_name:
            raise ValueError("speed_name is empty; say what the speed is, as 'free stream' or 'nD'.")
        if self.orientation != "air" and not self.confirm_absolute:
            self._ask_about_gauge("ambient_pressure", self.ambient_pressure)
            self._ask_about_gauge("surface_pressure", self.surface_pressure)

    @staticmethod
    def _ask_about_gauge(name: str, pressure: Estimate | None) -> None:
        if pressure is not None and pressure.value < LOWEST_ABSOLUTE:
            raise ValueError(
                f"{name} is {pressure}: is that a gauge reading? Give the absolute pressure (gauge + atmospheric, near "
                "101.3 kPa), or say confirm_absolute=True if it is absolute, or orientation='air' in a gas."
            )

    def axis_pressure(self, fluid: Fluid) -> Estimate | None:
        """Absolute pressure at the elevation of the axis, far away. [Pa]

        Parameters
        ----------
        fluid : Fluid
            Its density carries the surface pressure down.

        Returns
        -------
        Estimate or None
            The ambient pressure, or surface pressure + ρ g depth with its budget. In a gas without a depth it is the
            surface pressure (a barometer beside the vortex; 12 Pa in a metre of height). None when not enough is known.

        Raises
        ------
        ValueError
            If ambient pressure and surface pressure with depth are all given and contradict each other.

        Examples
        --------
        Worked by hand: 101 325 Pa + 999.1 kg/m³ · 9.80665 m/s² · 1.2 m = 113.08 kPa.

        >>> round(Site(surface_pressure=101325.0, depth=1.2).axis_pressure(water(15.0)).value, -1)
        113080.0
        """
        below = self._pressure_below_surface(fluid)
        if self.ambient_pressure is None:
            return below
        if below is not None and self.depth is not None:
            apart = abs(below.value - self.ambient_pressure.value)
            allowed = 0.01 * below.value + 3.0 * (below.uncertainty + self.ambient_pressure.uncertainty)
            if apart > allowed:
                raise ValueError(
                    f"ambient_pressure {self.ambient_pressure} contradicts surface_pressure + density·gravity·depth = "
                    f"{below}; leave one of them out, the ambient pressure is the one at the elevation of the axis."
                )
        return self.ambient_pressure

    def _pressure_below_surface(self, fluid: Fluid) -> Estimate | None:
        if self.surface_pressure is None:
            return None
        if self.depth is None:
            return as_estimate(self.surface_pressure, "ambient_pressure") if fluid.is_gas else None
        return propagate(
            lambda surface_pressure, density, depth: surface_pressure + density * self.gravity * depth,
            {"surface_pressure": self.surface_pressure, "density": fluid.density, "depth": self.depth},
            quantity="ambient_pressure",
        )


def _settle(value: Any, *names: str) -> None:
    """Turn what a person gave into Estimates, in place while a frozen value is made."""
    for name in names:
        given = getattr(value, name)
        if given is not None:
            object.__setattr__(value, name, as_estimate(given, name))


# The fluids ---------------------------------------------------------------------------------------------------------


def water(temperature: Given = 15.0, *, pressure: Given = STANDARD_ATMOSPHERE) -> Fluid:
    """Pure liquid water.

    Parameters
    ----------
    temperature : float or (float, float)
        With its standard uncertainty. [°C] An Estimate is in kelvin, as all Estimates are in SI.
    pressure : float, (float, float) or Estimate
        Absolute. [Pa]

    Returns
    -------
    Fluid

    Raises
    ------
    ValueError
        If the temperature is below 0 °C or above 360 °C, the pressure is above 1 GPa, or the water would be steam.

    References
    ----------
    .. [1] IAPWS R6-95(2018), density; R12-08, viscosity; R7-97(2012), saturation pressure; R1-76(2014),
       surface tension.

    Examples
    --------
    The CIPM formula gives 997.047 kg/m³ at 25 °C (M. Tanaka et al., Metrologia 38 (2001) 301-309, from memory).

    >>> round(water(25.0).density.value, 3)
    997.048
    """
    t, p = checked_state("water", temperature, pressure, (0.0, 360.0), (100.0, 1e9))
    vapour = from_zero(saturated("P", "IF97::Water"))
    boiling = vapour(t.value, p.value)
    if p.value < boiling:
        raise ValueError(
            f"At {celsius(t)} and {format_number(p.value, 'Pa')} water is steam (it boils below "
            f"{format_number(boiling, 'Pa')}); give the absolute pressure of the liquid, and the temperature in °C."
        )
    density = from_zero(library("D", "Water", "liquid"))
    viscosity = from_zero(library("V", "Water", "liquid"))
    return Fluid(
        "water",
        t,
        p,
        with_uncertainty(density, t, p, 1.5e-5, "density"),
        with_uncertainty(lambda a, b: viscosity(a, b) / density(a, b), t, p, 5e-3, "kinematic_viscosity"),
        with_uncertainty(vapour, t, p, 1.25e-4, "vapour_pressure"),
        with_uncertainty(lambda a, _: equations.water_surface_tension(a), t, p, 2.5e-3, "surface_tension"),
        source="IAPWS R6-95 (density, 0.003 %), R12-08 (viscosity, 1 %), R7-97 (saturation pressure, 0.025 %), R1-76 "
        "(surface tension, 0.5 %); the stated limits are taken as two standard uncertainties.",
    )


def sea_water(temperature: Given = 15.0, *, salinity: Given = 35.0, pressure: Given = STANDARD_ATMOSPHERE) -> Fluid:
    """Sea water of standard composition.

    Parameters
    ----------
    temperature : float or (float, float)
        In situ. [°C] An Estimate is in kelvin.
    salinity : float, (float, float) or Estimate
        Absolute. [g/kg] Practical salinity 35 is 35.165 g/kg.
    pressure : float, (float, float) or Estimate
        Absolute. [Pa]

    Returns
    -------
    Fluid

    Raises
    ------
    ValueError
        If the temperature is outside 0 to 40 °C, the salinity outside 0 to 42 g/kg, or the pressure outside 2.5 kPa to
        100 MPa or so low that the water would boil.

    Notes
    -----
    EOS-80 is used because the property library's own sea water ignores pressure (4 kg/m³ at 1000 m). It agrees with
    TEOS-10 within 0.005 kg/m³ in the ocean; 0.01 kg/m³ is taken as its standard uncertainty.

    References
    ----------
    .. [1] See `vortexwidgets.fluid_equations`.
    """
    t, p = checked_state("sea water", temperature, pressure, (0.0, 40.0), (600.0, 1e8))
    s = as_estimate(salinity, "salinity")
    if s.value > 42.0:
        raise ValueError(
            f"The equations of sea water hold to 42 g/kg, got salinity {s.value:g} g/kg; give g of salt per kg."
        )
    pure_viscosity = from_zero(library("V", "Water", "liquid"))
    pure_vapour = from_zero(saturated("P", "IF97::Water"))

    def vapour(a: float, b: float, salt: float) -> float:
        return pure_vapour(a, b) * equations.sea_water_vapour_pressure_ratio(salt)

    def viscosity(a: float, b: float, salt: float) -> float:
        # Pure water's own viscosity as a function of temperature and pressure, times the ratio at one atmosphere.
        return (
            pure_viscosity(a, b)
            * equations.sea_water_viscosity_ratio(a, salt)
            / equations.sea_water_density(a, salt, b)
        )

    boiling = vapour(t.value, p.value, s.value)
    if p.value < boiling:
        raise ValueError(
            f"At {celsius(t)} and {format_number(p.value, 'Pa')} sea water boils (it does below "
            f"{format_number(boiling, 'Pa')}); give the absolute pressure of the liquid."
        )
    return Fluid(
        "sea water",
        t,
        p,
        with_uncertainty(lambda a, b, salt: equations.sea_water_density(a, salt, b), t, p, 1e-5, "density", s),
        with_uncertainty(viscosity, t, p, 1e-2, "kinematic_viscosity", s),
        with_uncertainty(vapour, t, p, 2e-3, "vapour_pressure", s),
        with_uncertainty(
            lambda a, _, salt: equations.sea_water_surface_tension(a, salt), t, p, 2.5e-3, "surface_tension", s
        ),
        source=f"Salinity {s}. EOS-80 (density, 0.01 kg/m³), Sharqawy et al. 2010 on IAPWS R12-08 (viscosity, 1 %), "
        "Nayar et al. 2016 on IAPWS R7-97 (vapour pressure, 0.2 %), IAPWS G14-19 (surface tension, 0.25 %); standard "
        "uncertainties.",
    )


def air(temperature: Given = 15.0, *, pressure: Given = STANDARD_ATMOSPHERE, humidity: Given = 0.0) -> Fluid:
    """Air, dry or moist.

    Parameters
    ----------
    temperature : float or (float, float)
        [°C] An Estimate is in kelvin.
    pressure : float, (float, float) or Estimate
        Absolute. [Pa]
    humidity : float, (float, float) or Estimate
        Relative humidity as a fraction.

    Returns
    -------
    Fluid

    Raises
    ------
    ValueError
        If the temperature is outside -70 to 600 °C (moist air: -40 to 90 °C), the pressure outside 1 kPa to 10 MPa or
        the humidity outside 0 to 1.

    References
    ----------
    .. [1] E. W. Lemmon, R. T Jacobsen, S. G. Penoncello and D. G. Friend, J. Phys. Chem. Ref. Data 29 (2000) 331-385.
    .. [2] E. W. Lemmon and R. T Jacobsen, Int. J. Thermophys. 25 (2004) 21-69.
    .. [3] S. Herrmann, H.-J. Kretzschmar and D. P. Gatley, HVAC&R Research 15 (2009) 961-986, moist air.

    Examples
    --------
    The U.S. Standard Atmosphere 1976 has 1.225 kg/m³ at 15 °C and 101 325 Pa (from memory).

    >>> round(air(15.0).density.value, 3)
    1.226
    """
    wet = as_estimate(humidity, "humidity")
    is_moist = wet.value > 0.0 or wet.uncertainty > 0.0
    name = "moist air" if is_moist else "air"
    t, p = checked_state(name, temperature, pressure, (-40.0, 90.0) if is_moist else (-70.0, 600.0), (1e3, 1e7))

    dry_density, dry_viscosity = library("D", "Air"), library("V", "Air")

    def density(a: float, b: float, moisture: float = 0.0) -> float:
        return 1.0 / moist_air("Vha", a, b, moisture) if is_moist else dry_density(a, b)

    def viscosity(a: float, b: float, moisture: float = 0.0) -> float:
        return moist_air("mu", a, b, moisture) if is_moist else dry_viscosity(a, b)

    moisture = wet if is_moist else None
    ratio = library("C", "Air")(t.value, p.value) / library("CVMASS", "Air")(t.value, p.value)
    return Fluid(
        "air",
        t,
        p,
        with_uncertainty(density, t, p, 5e-4, "density", moisture),
        with_uncertainty(
            lambda a, b, *c: viscosity(a, b, *c) / density(a, b, *c), t, p, 5e-3, "kinematic_viscosity", moisture
        ),
        heat_capacity_ratio=ratio,
        source=(f"Relative humidity {100 * wet.value:.3g} %. " if is_moist else "Dry. ")
        + "Lemmon et al. 2000 (density, 0.1 %), Lemmon and Jacobsen 2004 (viscosity, 1 %)"
        + (", mixed with steam as Herrmann et al. 2009" if is_moist else "")
        + "; the stated limits are taken as two standard uncertainties.",
    )


def helium(temperature: Given = -269.15, *, pressure: Given = STANDARD_ATMOSPHERE) -> Fluid:
    """Helium-4 above the lambda point, gas or liquid (helium I).

    Parameters
    ----------
    temperature : float or (float, float)
        [°C] -269.15 °C is 4 K. An Estimate is in kelvin.
    pressure : float, (float, float) or Estimate
        Absolute. [Pa]

    Returns
    -------
    Fluid
        A liquid has vapour pressure and surface tension, a gas its ratio of heat capacities.

    Raises
    ------
    ValueError
        If the temperature is below the lambda point 2.1768 K, where the normal-fluid equation does not hold although it
        may answer, or above 1000 K, or the pressure is outside 1 Pa to 100 MPa, or the helium would be solid.

    References
    ----------
    .. [1] D. O. Ortiz Vega, doctoral thesis, Texas A&M University (2013), equation of state.
    .. [2] V. D. Arp, R. D. McCarty and D. G. Friend, NIST Technical Note 1334 (1998), viscosity.
    .. [3] A. Mulero, I. Cachadiña and M. I. Parra, J. Phys. Chem. Ref. Data 41 (2012) 043105, surface tension.
    """
    t, p = checked_state("helium", temperature, pressure, (-ZERO_CELSIUS, 726.85), (1.0, 1e8))
    if t.value < LAMBDA_POINT:
        raise ValueError(
            f"helium at {t.value:g} K is below the lambda point {LAMBDA_POINT} K: it is a superfluid and the equation "
            "of the normal fluid does not hold; give a higher temperature."
        )
    phase = phase_of(t.value, p.value, "Helium")
    is_liquid = phase in ("liquid", "supercritical_liquid")
    has_surface = phase == "liquid"
    density_doubt, viscosity_doubt = (1e-2, 5e-2) if is_liquid else (5e-4, 1e-2)
    kept = "liquid" if has_surface else "gas" if phase == "gas" else ""
    density, viscosity = library("D", "Helium", kept), library("V", "Helium", kept)
    ratio = None
    if not is_liquid:
        ratio = library("C", "Helium")(t.value, p.value) / library("CVMASS", "Helium")(t.value, p.value)
        if not 1.0 < ratio < 2.0:  # near the critical point no single exponent describes the expansion
            ratio = None
    return Fluid(
        "helium",
        t,
        p,
        with_uncertainty(density, t, p, density_doubt, "density"),
        with_uncertainty(lambda a, b: viscosity(a, b) / density(a, b), t, p, viscosity_doubt, "kinematic_viscosity"),
        with_uncertainty(saturated("P", "Helium"), t, p, 5e-3, "vapour_pressure") if has_surface else None,
        with_uncertainty(saturated("I", "Helium"), t, p, 5e-2, "surface_tension") if has_surface else None,
        heat_capacity_ratio=ratio,
        source=f"{phase.replace('_', ' ').capitalize()}. Ortiz Vega 2013 (density, {100 * density_doubt:g} %), "
        f"Arp et al. 1998 (viscosity, {100 * viscosity_doubt:g} %)"
        + (", Mulero et al. 2012 (surface tension, 5 %)" if has_surface else "")
        + "; standard uncertainties, judged.",
    )


FLUIDS: Mapping[str, Callable[..., Fluid]] = MappingProxyType(
    {"water": water, "sea water": sea_water, "air": air, "helium": helium}
)
"""Fluids by name."""

_OTHER_NAMES = {
    "seawater": "sea water", "salt water": "sea water", "saltwater": "sea water", "brine": "sea water",
    "fresh water": "water", "freshwater": "water", "tap water": "water", "pure water": "water", "h2o": "water",
    "dry air": "air", "moist air": "air", "he": "helium", "helium 4": "helium", "liquid helium": "helium",
}  # fmt: skip


def fluid_named(name: str, temperature: Given | None = None, **options: Given) -> Fluid:
    """Look a fluid up by the name that a person wrote.

    Parameters
    ----------
    name : str
        As "water", "Sea water", "seawater", "air", "helium".
    temperature : float or (float, float), optional
        [°C] An Estimate is in kelvin.
    **options
        `pressure`, and `salinity` of sea water or `humidity` of air.

    Returns
    -------
    Fluid

    Raises
    ------
    ValueError
        If the name is not known, or an option does not belong to the fluid.

    Examples
    --------
    >>> fluid_named("Seawater", 15.0).name
    'sea water'
    """
    plain = " ".join(name.lower().replace("-", " ").replace("_", " ").split())
    key = _OTHER_NAMES.get(plain, plain)
    if key not in FLUIDS:
        close = difflib.get_close_matches(plain, [*FLUIDS, *_OTHER_NAMES], n=1)
        hint = f" Did you mean '{close[0]}'?" if close else ""
        raise ValueError(
            f"No fluid named '{name[:60]}'.{hint} Known fluids: {', '.join(FLUIDS)}; for another one give a "
            "Fluid(name, temperature, pressure, density, kinematic_viscosity)."
        )
    allowed = {"sea water": ("pressure", "salinity"), "air": ("pressure", "humidity")}.get(key, ("pressure",))
    for option in options:
        if option not in allowed:
            belongs = {"salinity": "sea water", "humidity": "air"}.get(option)
            remedy = f"name the fluid '{belongs}' or leave it out" if belongs else "leave it out"
            raise ValueError(f"{key} takes no {option}; {remedy}.")
    if temperature is not None:
        options["temperature"] = temperature
    return FLUIDS[key](**options)
