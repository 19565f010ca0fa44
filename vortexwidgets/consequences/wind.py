"""Wind: the pressure drop that a still observer feels under the axis, and its rate as the vortex passes."""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from vortexwidgets.consequences.consequence import (
    INSIDE_INTERVAL,
    LEVEL,
    NOT_DECIDED,
    Consequence,
    Criterion,
    chance_text,
    decide,
    draw_sentence,
    undetermined,
)
from vortexwidgets.consequences.section import label_distance, mirrored, section_radii, share_of_drop
from vortexwidgets.formatting import format_number
from vortexwidgets.uncertainty import Estimate, propagate

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vortexwidgets.core_pressure import Core
    from vortexwidgets.fluids import Fluid, Site
    from vortexwidgets.models.vortex import Vortex

FloatArray = npt.NDArray[np.float64]

NAME = "Wind"
COMPRESSIBLE_SHARE = 0.02  # of the ambient pressure; above it the gas expands noticeably
RATIO_OF_AIR = 1.4

_MPH, _FOOT, _PSI = 0.44704, 0.3048, 6894.757


@dataclass(frozen=True)
class DesignTornado:
    """One row of a design-basis table, in SI units: speeds [m/s], radius [m], drop [Pa], rate [Pa/s]."""

    region: str
    largest_wind: float
    translation_speed: float
    rotational_speed: float
    peak_radius: float
    pressure_drop: float
    pressure_rate: float


DESIGN_TORNADOES: tuple[DesignTornado, ...] = tuple(
    DesignTornado(region, top * _MPH, along * _MPH, around * _MPH, 150.0 * _FOOT, drop * _PSI, rate * _PSI)
    for region, top, along, around, drop, rate in (
        ("I", 230.0, 46.0, 184.0, 1.2, 0.5),
        ("II", 200.0, 40.0, 160.0, 0.9, 0.4),
        ("III", 160.0, 32.0, 128.0, 0.6, 0.2),
    )
)
"""US NRC Regulatory Guide 1.76 Rev. 1 (March 2007), table 1, from memory; severest region first."""

_MILDEST = DESIGN_TORNADOES[-1]
_QUESTION = "How far does the pressure fall on a still observer under the axis, and how fast as the vortex passes?"
_CRITERION = Criterion(
    f"Design-basis pressure drop of region III ({format_number(_MILDEST.pressure_drop, 'Pa', digits=2)}) reached",
    "US NRC Regulatory Guide 1.76 Rev. 1 (March 2007), table 1, the mildest of its three regions, from memory: a "
    "comparison, not a requirement that holds here.",
)
_SOURCE = (
    "p(0) = p∞[1 - (γ-1)/γ · Δp/p∞]^(γ/(γ-1)), cyclostrophic balance with p/ρ^γ constant; rate = translation speed "
    "times the largest ρv²/r, which is (V_t/R_m)Δp for Rankine (Regulatory Guide 1.76 Rev. 1)."
)
_CAUTION = (
    "Pressure is one load of several: wind, debris and the venting of the building decide with it, and people are "
    "at risk long before a design-basis value is reached. Anything built or occupied follows the local code and the "
    "judgement of a licensed engineer; warnings are the business of the weather service."
)


# The vortex alone ----------------------------------------------------------------------------------------------------


def compressible_drop(
    drop: npt.ArrayLike, *, ambient_pressure: npt.ArrayLike, heat_capacity_ratio: float = RATIO_OF_AIR
) -> FloatArray:
    r"""Pressure drop of an expanding gas from the drop at constant density.

    Parameters
    ----------
    drop : array_like, shape (...)
        Δp = ∫ρv²/r dr with the density far away. [Pa]
    ambient_pressure : array_like, shape (...)
        Absolute pressure far away. [Pa]
    heat_capacity_ratio : float
        γ of the gas.

    Returns
    -------
    ndarray, shape (...)
        p∞ - p(0). [Pa] All of p∞ where the gas would have to expand into a vacuum.

    Raises
    ------
    ValueError
        If the ambient pressure is not positive or γ is not above 1.

    Notes
    -----
    :math:`p(0) = p_\infty [1 - \frac{\gamma-1}{\gamma} \Delta p/p_\infty]^{\gamma/(\gamma-1)}`. The drop at constant
    density is too deep: by 1.7 % of itself at 5 kPa, 2.9 % at 8.3 kPa, 7.4 % at 21.5 kPa, in air at 101 325 Pa.

    Examples
    --------
    By hand, γ = 2 and Δp = p∞/2: p(0) = p∞ (1 - 1/4)² = 0.5625 p∞.

    >>> float(compressible_drop(50e3, ambient_pressure=100e3, heat_capacity_ratio=2.0))
    43750.0
    """
    far = np.asarray(ambient_pressure, dtype=float)
    if np.any(far <= 0.0):
        raise ValueError(f"ambient_pressure must be positive, got {float(far.min()):g} Pa; give the absolute pressure.")
    if not heat_capacity_ratio > 1.0:
        raise ValueError(f"heat_capacity_ratio must be above 1, got {heat_capacity_ratio:g}; 1.4 for air.")
    exponent = heat_capacity_ratio / (heat_capacity_ratio - 1.0)
    left = np.maximum(1.0 - np.asarray(drop, dtype=float) / (exponent * far), 0.0)
    return np.asarray(far * (1.0 - left**exponent))


def pressure_rate(vortex: Vortex, *, translation_speed: float, density: float) -> float:
    r"""Largest rate of pressure change at a point over which the axis passes. [Pa/s]

    Parameters
    ----------
    vortex : Vortex
        With a core.
    translation_speed : float
        [m/s]
    density : float
        [kg/m³]

    Returns
    -------
    float

    Raises
    ------
    ValueError
        If the translation speed is negative or the density is not positive.

    Notes
    -----
    :math:`U_t \max_r \rho v_\theta^2 / r`. Rankine: (U_t/R) Δp, at the edge of its core. At constant density, which
    is on the safe side in a gas that expands.

    Examples
    --------
    By hand, Rankine with 80 m/s at 40 m and 1.25 kg/m³: Δp = 8000 Pa, and 20 m/s / 40 m · 8000 Pa = 4000 Pa/s.

    >>> import math
    >>> from vortexwidgets import Vortex
    >>> rankine = Vortex("rankine", circulation=2.0 * math.pi * 40.0 * 80.0, core_radius=40.0)
    >>> round(pressure_rate(rankine, translation_speed=20.0, density=1.25), 6)
    4000.0
    """
    _check_positive("density", density, "kg/m³")
    if translation_speed < 0.0:
        raise ValueError(
            f"translation_speed must not be negative, got {translation_speed:g} m/s; give it without a sign."
        )
    return translation_speed * density * _steepest(vortex)


def _steepest(vortex: Vortex) -> float:
    """Largest v²/r over all radii."""
    from scipy.optimize import minimize_scalar

    def steepness(log_radius: float) -> float:
        r = math.exp(log_radius)
        return float(vortex.swirl(r)) ** 2 / r

    grid = np.log(vortex.peak_radius) + np.linspace(
        -4.0, 2.0, 241
    )  # holds the peak radius itself, where Rankine has it
    values = np.array([steepness(float(point)) for point in grid])
    best = int(values.argmax())
    ends = float(grid[max(best - 1, 0)]), float(grid[min(best + 1, grid.size - 1)])
    found = minimize_scalar(lambda point: -steepness(point), bounds=ends, method="bounded", options={"xatol": 1e-10})
    return max(float(values[best]), -float(found.fun))


def pressure_history(
    vortex: Vortex,
    time: npt.ArrayLike,
    *,
    translation_speed: float,
    density: float,
    miss_distance: float = 0.0,
) -> FloatArray:
    """Pressure below the ambient one at a point while the vortex passes, at constant density.

    Parameters
    ----------
    vortex : Vortex
    time : array_like, shape (...)
        From the moment of closest approach. [s]
    translation_speed : float
        [m/s]
    density : float
        [kg/m³]
    miss_distance : float
        Distance by which the axis misses the point. [m]

    Returns
    -------
    ndarray, shape of `time`
        [Pa]

    Raises
    ------
    ValueError
        If the translation speed is negative or the density is not positive.

    Examples
    --------
    Rankine with v = 80 m/s at 40 m and 1.25 kg/m³: ρv² on the axis, half of it at 40 m (by hand).

    >>> import math
    >>> from vortexwidgets import Vortex
    >>> rankine = Vortex("rankine", circulation=2.0 * math.pi * 40.0 * 80.0, core_radius=40.0)
    >>> [round(float(p)) for p in pressure_history(rankine, [0.0, 2.0], translation_speed=20.0, density=1.25)]
    [8000, 4000]
    """
    _check_positive("density", density, "kg/m³")
    if translation_speed < 0.0:
        raise ValueError(
            f"translation_speed must not be negative, got {translation_speed:g} m/s; give it without a sign."
        )
    radius = np.hypot(translation_speed * np.asarray(time, dtype=float), miss_distance)
    return np.asarray(vortex.pressure_drop(radius, density=density), dtype=float)


def combined_wind(peak_swirl: float, *, translation_speed: float) -> float:
    """Largest wind on the side where swirl and translation add. [m/s]

    Parameters
    ----------
    peak_swirl : float
        Of either sign. [m/s]
    translation_speed : float
        [m/s]

    Examples
    --------
    Regulatory Guide 1.76 Rev. 1, region I, in mph (from memory): 184 + 46 = 230.

    >>> combined_wind(184.0, translation_speed=46.0)
    230.0
    """
    return abs(peak_swirl) + translation_speed


def swirl_for_drop(drop: float, *, density: float, pressure_constant: float = 1.0) -> float:
    """Peak swirl that belongs to a core pressure drop, √(Δp/(Kρ)). [m/s]

    Parameters
    ----------
    drop : float
        [Pa]
    density : float
        [kg/m³]
    pressure_constant : float
        K of the profile; 1 for Rankine.

    Raises
    ------
    ValueError
        If the drop is negative, or density or constant is not positive.

    Examples
    --------
    By hand: √(10 000 Pa / (1 · 1 kg/m³)) = 100 m/s.

    >>> swirl_for_drop(10e3, density=1.0)
    100.0
    """
    _check_positive("density", density, "kg/m³")
    _check_positive("pressure_constant", pressure_constant, "")
    if drop < 0.0:
        raise ValueError(
            f"drop must not be negative, got {drop:g} Pa; give the pressure far away less that on the axis."
        )
    return math.sqrt(drop / (pressure_constant * density))


def required_pressure_constant(drop: float, peak_swirl: float, *, density: float) -> float:
    """K that a pressure drop and a peak swirl need to belong together, Δp/(ρv²).

    Parameters
    ----------
    drop : float
        [Pa]
    peak_swirl : float
        Of either sign. [m/s]
    density : float
        [kg/m³]

    Raises
    ------
    ValueError
        If the swirl is zero or the density is not positive.

    Examples
    --------
    A published tornado pair of 50.4 m/s and 194 hPa, with 1.05 kg/m³.

    >>> round(required_pressure_constant(19.4e3, 50.4, density=1.05), 1)
    7.3
    """
    _check_positive("density", density, "kg/m³")
    if peak_swirl == 0.0:
        raise ValueError("peak_swirl must not be zero, got 0 m/s; no swirl has no pressure drop.")
    return drop / (density * peak_swirl**2)


def compare_readings(drop: float, peak_swirl: float, *, density: float) -> str:
    """Say whether a measured pressure drop and a measured swirl can belong together, by the K that they need.

    Parameters
    ----------
    drop : float
        Measured pressure far away less that on the axis. [Pa]
    peak_swirl : float
        Measured, of either sign. [m/s]
    density : float
        [kg/m³]

    Returns
    -------
    str

    Raises
    ------
    ValueError
        If the swirl is zero or the density is not positive.

    Notes
    -----
    The published profiles lie between K = 1 (Rankine) and 2 (Kaufmann). A modified Rankine vortex, whose swirl falls as
    r^-n, has K = (1 + 1/n)/2 and reaches any K with a slow enough fall.
    """
    constant = required_pressure_constant(drop, peak_swirl, density=density)
    pair = f"{abs(peak_swirl):.3g} m/s with {format_number(drop, 'Pa', digits=3)} needs K = {constant:.2g}"
    if constant > 2.0:
        return (
            f"{pair}, when a Rankine core has 1 and Kaufmann 2. A modified Rankine of exponent "
            f"{1.0 / (2.0 * constant - 1.0):.2g} has it, so it is not impossible, but the two readings probably do "
            "not belong together: other place, other time, or a pressure that is not the vortex's alone."
        )
    if constant < 1.0:
        return (
            f"{pair}, less than the 1 of a Rankine core, the least of the usual profiles: the sensor probably "
            "missed the axis or averaged it away, or the swirl is too high."
        )
    return f"{pair}, between the 1 of a Rankine core and the 2 of Kaufmann: the two readings agree."


def _check_positive(name: str, value: float, unit: str) -> None:
    if not value > 0.0:
        raise ValueError(f"{name} must be positive, got {value:g} {unit}".rstrip() + ".")


# The consequence -----------------------------------------------------------------------------------------------------


def assess(core: Core, fluid: Fluid, site: Site) -> Consequence | None:
    """Judge the drop on a still observer; None in a liquid."""
    if fluid.heat_capacity_ratio is None or site.orientation in ("surface", "submerged"):
        return None
    notes: list[str] = []
    fall = _fall(core, fluid, site, notes)
    verdict, probability = decide(fall, _MILDEST.pressure_drop, met_when="at or above")
    if verdict == NOT_DECIDED and probability is not None:
        notes.insert(0, INSIDE_INTERVAL)
    details: list[tuple[str, Estimate]] = []
    if not math.isnan(core.drop.value):
        details.append(("Drop at constant density", core.drop))
        details += _passing(core, site, notes)
        notes += _regions(fall, core)
        constant = required_pressure_constant(core.drop.value, core.vortex.peak_swirl, density=core.density.value)
        # A limit of the drop is no reading; the ends are those of Rankine and Kaufmann themselves.
        if fall.bound is None and not 0.95 <= constant <= 2.05:
            notes.append(compare_readings(core.drop.value, core.vortex.peak_swirl, density=core.density.value))
    return Consequence(
        name=NAME,
        question=_QUESTION,
        estimate=fall,
        criterion=_CRITERION,
        verdict=verdict,
        probability=probability,
        source=_SOURCE,
        caution=_CAUTION,
        details=tuple(details),
        notes=tuple(notes),
        curves=_curves(core, fall, site),
    )


def _fall(core: Core, fluid: Fluid, site: Site, notes: list[str]) -> Estimate:
    """Ambient pressure less that on the axis, with expansion where the ambient pressure is known."""
    drop, quantity = core.drop, "pressure_drop"
    if math.isnan(drop.value):
        notes.append("No core pressure drop is known, because no model fits the survey.")
        return undetermined(quantity)
    if drop.bound is not None:
        notes.append("The core pressure drop is a lower bound, so this one is too.")
    ambient = core.ambient if core.ambient is not None else site.axis_pressure(fluid)
    if core.ambient is None and ambient is not None:
        notes.append(
            "The drop is known only relative to the last station, so it is a least value; measure farther out."
        )
        drop = Estimate(drop.interval(LEVEL)[0], math.nan, drop.quantity, bound="lower")
    if ambient is None:
        notes.append(
            "The ambient pressure is not known, so the drop is taken at constant density, which is slightly too "
            "deep; give Site(ambient_pressure=...)."
        )
        return dataclasses.replace(drop, quantity=quantity)
    share = drop.value / ambient.value
    if share > COMPRESSIBLE_SHARE:
        notes.append(
            f"The drop is {100.0 * share:.1f} % of the ambient pressure, above 2 %: the air expands, and constant "
            "density would be too deep."
        )
    ratio = fluid.heat_capacity_ratio or RATIO_OF_AIR

    def formula(**p: Any) -> Any:
        return compressible_drop(
            p["core pressure drop"], ambient_pressure=p["reference pressure"], heat_capacity_ratio=ratio
        )

    if drop.bound is not None:
        # The denser the gas stays, the deeper the drop: the low end of the ambient pressure is that of the least drop.
        end = max(ambient.interval(LEVEL)[0 if drop.bound == "lower" else 1], 1.0)
        limit = float(compressible_drop(drop.value, ambient_pressure=end, heat_capacity_ratio=ratio))
        return Estimate(limit, math.nan, quantity, bound=drop.bound)
    inputs = {"core pressure drop": drop, "reference pressure": ambient}
    linear = propagate(formula, inputs, quantity=quantity)
    if drop.quantiles is None:
        return linear
    drawn = propagate(formula, inputs, method="monte carlo", quantity=quantity)
    return dataclasses.replace(linear, quantiles=drawn.quantiles, degrees_of_freedom=math.inf)


def _passing(core: Core, site: Site, notes: list[str]) -> list[tuple[str, Estimate]]:
    """Rate and combined wind, where the vortex moves."""
    speed = site.translation_speed
    if speed is None:
        notes.append("Give Site(translation_speed=...) for the rate of pressure change and the combined wind.")
        return []
    rows: list[tuple[str, Estimate]] = []
    wind = _combined(core, speed)
    if wind is not None:
        rows.append(("Combined wind", wind))
        if core.missed_axis:
            notes.append(
                "The line may have missed the axis, where the swirl is larger than what it met: the combined wind is a "
                "lower bound."
            )
    if core.drop.bound is not None or core.missed_axis:
        rate = _least_rate(core, speed)
        notes.append(
            "The rate of pressure change is not given, because the core is not resolved."
            if rate is None
            else "The rate is a lower bound, as the drop is: the least drop over the largest core, at the least speed, "
            "each at its 95 % limit, for the shapes of the models that are not rejected."
        )
    else:
        rate = _rate(core, speed)
        notes.append(
            "The rate of pressure change is not given, because the core is not resolved."
            if rate is None
            else "In the rate, peak swirl and peak radius are taken as independent; the density is that far away, on "
            "the safe side."
        )
    return rows if rate is None else [("Largest rate of pressure change", rate), *rows]


def _combined(core: Core, speed: Estimate) -> Estimate | None:
    """Peak swirl plus translation speed; its 95 % lower limit where the line may have missed the largest swirl."""
    if not core.peak_swirl.is_determined:
        return None
    swirl = dataclasses.replace(core.peak_swirl, value=abs(core.peak_swirl.value), quantiles=None)
    wind = propagate(
        lambda **p: p["peak swirl"] + p["translation speed"],
        {"peak swirl": swirl, "translation speed": speed},
        quantity="speed",
    )
    if core.missed_axis:
        return Estimate(max(wind.interval(LEVEL)[0], 0.0), math.nan, "speed", bound="lower")
    return wind


def _least_rate(core: Core, speed: Estimate) -> Estimate | None:
    """Lower bound of the largest ρv²/r times translation speed: for a given shape it goes with Δp/r."""
    least, largest, slowest = (
        core.drop.interval(LEVEL)[0],
        core.peak_radius.interval(LEVEL)[1],
        speed.interval(LEVEL)[0],
    )
    if not (least > 0.0 and slowest > 0.0 and math.isfinite(largest)):
        return None
    shape = min(
        _steepest(vortex) * vortex.peak_radius / float(vortex.pressure_drop(0.0, density=1.0))
        for vortex in (core.vortex, *core.supported)
    )
    return Estimate(shape * least / largest * slowest, math.nan, "pressure_rate", bound="lower")


def _rate(core: Core, speed: Estimate) -> Estimate | None:
    """Largest ρv²/r times translation speed, from peak swirl and radius, whose shape factor the models differ in."""
    if not (core.peak_swirl.is_determined and core.peak_radius.is_determined):
        return None
    factors = [
        _steepest(vortex) * vortex.peak_radius / vortex.peak_swirl**2 for vortex in (core.vortex, *core.supported)
    ]
    spread = float(np.std(factors[1:])) if len(factors) > 2 else 0.0
    return propagate(
        lambda **p: (
            p["choice of model"] * p["density"] * p["peak swirl"] ** 2 / p["peak radius"] * p["translation speed"]
        ),
        {
            "choice of model": (factors[0], spread),
            "density": core.density,
            "peak swirl": core.peak_swirl,
            "peak radius": core.peak_radius,
            "translation speed": speed,
        },
        quantity="pressure_rate",
    )


def _regions(fall: Estimate, core: Core) -> list[str]:
    """Compare with each row of the design-basis table."""
    parts = []
    for row in DESIGN_TORNADOES:
        verdict, chance = decide(fall, row.pressure_drop, met_when="at or above")
        odds = "" if chance is None else f", probability {chance_text(chance)}"
        parts.append(f"region {row.region} ({format_number(row.pressure_drop, 'Pa', digits=2)}) {verdict}{odds}")
    sentence = f"Design-basis drops of Regulatory Guide 1.76 Rev. 1 (from memory): {'; '.join(parts)}."
    size = core.vortex.peak_radius
    if size < 0.1 * _MILDEST.peak_radius:
        sentence += (
            f" Those vortices peak at {_MILDEST.peak_radius:.0f} m and this one at "
            f"{format_number(size, 'm', digits=3)}, so only what is smaller than its core feels the whole drop."
        )
    return [sentence]


# The picture: what the observer feels --------------------------------------------------------------------------------


def _curves(core: Core, fall: Estimate, site: Site) -> tuple[tuple[str, tuple[float, ...]], ...]:
    if math.isnan(fall.value):
        return ()
    radius = section_radii(core.vortex.peak_radius)
    share = share_of_drop(core.vortex, radius, reference_radius=site.reference_radius)
    low, high = fall.interval(LEVEL)
    lines = {"radius": radius, "pressure": -fall.value * share, "pressure if the drop is least": -low * share}
    if math.isfinite(high):
        lines["pressure if the drop is largest"] = -high * share
    if site.translation_speed is not None and site.translation_speed.value > 0.0:
        lines["time"] = radius / site.translation_speed.value
    return tuple((name, tuple(numbers.tolist())) for name, numbers in lines.items())


def draw(axes: Axes, consequence: Consequence) -> None:
    """Draw the pressure change that a still observer feels, in time where the vortex passes."""
    radius = consequence.curve("radius")
    if not radius.size:
        draw_sentence(axes, consequence)
        return
    from vortexwidgets.plots.style import dress, label_axis, theme_in_use

    theme = theme_in_use()
    dress(axes, theme)
    time = consequence.curve("time")
    across = mirrored(time if time.size else radius, odd=True)
    pressure = mirrored(consequence.curve("pressure"))
    least = mirrored(consequence.curve("pressure if the drop is least"))
    largest = mirrored(consequence.curve("pressure if the drop is largest"))
    lowest = float(min(pressure.min(), largest.min(initial=0.0)))
    if largest.size:
        axes.fill_between(across, largest, least, color=theme.colour(0), alpha=0.18, linewidth=0.0, label="95 %")
    bounded = consequence.estimate.bound == "lower"
    axes.plot(
        across, pressure, color=theme.colour(0), linewidth=1.8, label="pressure, at most" if bounded else "pressure"
    )
    axes.axhline(0.0, color=theme.quiet, linewidth=0.9)
    for row in DESIGN_TORNADOES:
        if row.pressure_drop < -2.5 * lowest:
            lowest = min(lowest, -row.pressure_drop)
            axes.axhline(-row.pressure_drop, color=theme.warning, linewidth=1.1, linestyle=(0.0, (5.0, 3.0)))
            axes.annotate(
                f"design basis, region {row.region}",
                (across[0], -row.pressure_drop),
                xytext=(3, 2),
                textcoords="offset points",
                va="bottom",
                ha="left",
                color=theme.warning,
                fontsize=8.0,
            )
    axes.set_xlim(float(across[0]), float(across[-1]))
    depth = max(-lowest, 1e-3)  # a drop of nothing still has an axis
    axes.set_ylim(-1.08 * depth, 0.08 * depth)
    if time.size:
        label_axis(axes, "x", "time from the passage of the axis", "s")
    else:
        label_distance(axes)
    label_axis(axes, "y", "pressure change", "Pa")
    axes.legend(
        loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=3, frameon=False, fontsize=8.0, labelcolor=theme.text
    )
