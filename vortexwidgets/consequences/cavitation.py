"""Cavitation: does the water boil on the axis, and by how much pressure does it do so or not."""

from __future__ import annotations

import dataclasses
import math
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from vortexwidgets.consequences.consequence import (
    INSIDE_INTERVAL,
    LEVEL,
    NOT_DECIDED,
    Consequence,
    Criterion,
    decide,
    draw_sentence,
    undetermined,
)
from vortexwidgets.consequences.section import label_distance, mirrored, section_radii, share_of_drop
from vortexwidgets.formatting import format_estimate, format_number
from vortexwidgets.uncertainty import Estimate, propagate

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vortexwidgets.core_pressure import Core
    from vortexwidgets.fluids import Fluid, Site

NAME = "Cavitation"
STANDARD_ATMOSPHERE = 101325.0  # Pa; gas saturation is stated against it, common practice

_QUESTION = "Does the water on the axis fall to the pressure at which it cavitates?"
_CRITERION = Criterion(
    "Inception (pressure on the axis at or below the vapour pressure less the tensile strength)",
    "R. E. A. Arndt, Annu. Rev. Fluid Mech. 13 (1981) 273-328 (from memory): inception where σ = -C_p,min; "
    "with tension borne, where the least pressure is p_v - T.",
)
_SOURCE = (
    "C_p,min = -Δp/(½ρU²) and σ = (p∞ - p_v)/(½ρU²), C. E. Brennen, Cavitation and Bubble Dynamics, "
    "Oxford University Press, 1995, section 1.4 (from memory)."
)
_CAUTION = (
    "A static criterion with the steady drop of the instantaneous vortex; fluctuation of the core is not included "
    "and lowers the pressure further. Real inception depends on nuclei: water with few bears tension and cavitates "
    "later, water rich in gas earlier, so compare like with like. Noise, erosion and loss of thrust or head can "
    "follow: have a machine that people depend on judged by whoever is licensed to, under the rules that hold there."
)

_SUBMERGED = (
    "A submerged or horizontal vortex does not dip the surface by Δp/(ρg), so no dip is given; it draws air only if it "
    "connects with the surface."
)
_MARGIN = "pressure"


def dynamic_pressure(*, density: float, speed: float) -> float:
    """Dynamic pressure ½ρU². [Pa]

    Raises
    ------
    ValueError
        If the density or the speed is not positive.
    """
    for name, value, unit in (("density", density, "kg/m³"), ("speed", speed, "m/s")):
        if np.any(np.asarray(value) <= 0.0):
            raise ValueError(
                f"{name} must be positive, got {value:g} {unit}; give the one coefficients are formed with."
            )
    return 0.5 * density * speed**2


def cavitation_number(pressure: float, *, vapour_pressure: float, density: float, speed: float) -> float:
    r"""Cavitation number of a flow.

    Parameters
    ----------
    pressure : float
        Absolute static pressure at the elevation of the axis, far away. [Pa]
    vapour_pressure : float
        [Pa]
    density : float
        [kg/m³]
    speed : float
        Reference speed, which has to be named with the number. [m/s]

    Returns
    -------
    float

    Notes
    -----
    :math:`\sigma = (p_\infty - p_v) / (\tfrac12 \rho U^2)`.

    Examples
    --------
    By hand: (101 kPa - 1 kPa) / (½ · 1000 · 10²  Pa) = 2.

    >>> cavitation_number(101e3, vapour_pressure=1e3, density=1000.0, speed=10.0)
    2.0
    """
    return (pressure - vapour_pressure) / dynamic_pressure(density=density, speed=speed)


def pressure_coefficient(drop: float, *, density: float, speed: float) -> float:
    r"""Least pressure coefficient of a vortex, negative: :math:`C_{p,\min} = -\Delta p / (\tfrac12 \rho U^2)`.

    Parameters
    ----------
    drop : float
        Core pressure drop of the instantaneous vortex. [Pa]
    density : float
        [kg/m³]
    speed : float
        Reference speed. [m/s]

    Examples
    --------
    By hand: 60 kPa / (½ · 1000 · 10² Pa) = 1.2.

    >>> pressure_coefficient(60e3, density=1000.0, speed=10.0)
    -1.2
    """
    return -drop / dynamic_pressure(density=density, speed=speed)


def inception_number(drop: float, *, density: float, speed: float, tensile_strength: float = 0.0) -> float:
    """Cavitation number at which a vortex begins to cavitate.

    Parameters
    ----------
    drop : float
        Core pressure drop of the instantaneous vortex. [Pa]
    density : float
        [kg/m³]
    speed : float
        Reference speed, the same as that of the cavitation number. [m/s]
    tensile_strength : float
        Tension that the water bears. [Pa]

    Returns
    -------
    float
        -C_p,min - T/(½ρU²); cavitation where σ is at or below it.

    Examples
    --------
    By hand: (60 kPa - 10 kPa) / (½ · 1000 · 10² Pa) = 1.

    >>> inception_number(60e3, density=1000.0, speed=10.0, tensile_strength=10e3)
    1.0
    """
    return (drop - tensile_strength) / dynamic_pressure(density=density, speed=speed)


def pressure_margin(pressure: float, drop: float, vapour_pressure: float, tensile_strength: float = 0.0) -> float:
    """Pressure on the axis above the critical one; at or below zero it cavitates. [Pa]

    Parameters
    ----------
    pressure : float
        Absolute static pressure at the elevation of the axis, far away. [Pa]
    drop : float
        Core pressure drop of the instantaneous vortex. [Pa]
    vapour_pressure : float
        [Pa]
    tensile_strength : float
        Tension that the water bears. [Pa]

    Notes
    -----
    (p∞ - Δp) - (p_v - T). No reference speed enters: its sign is that of σ less the inception number.

    Examples
    --------
    By hand: 101 - 60 - (2 - 0) = 39 kPa.

    >>> pressure_margin(101e3, 60e3, 2e3)
    39000.0
    """
    return (pressure - drop) - (vapour_pressure - tensile_strength)


def gas_release_pressure(vapour_pressure: float, gas_saturation: float) -> float:
    """Pressure below which dissolved gas can come out of solution. [Pa]

    Parameters
    ----------
    vapour_pressure : float
        [Pa]
    gas_saturation : float
        Dissolved gas as a fraction of what water in contact with the open atmosphere holds.

    Notes
    -----
    Henry's law: gas at a fraction a of saturation is in equilibrium with bubbles at the partial pressure
    a (101 325 Pa - p_v), to which the vapour adds p_v. Below it bubbles grow by diffusion, which takes time.

    Examples
    --------
    Saturated water (a = 1) is in equilibrium with the atmosphere, whatever its vapour pressure.

    >>> gas_release_pressure(2339.0, 1.0)
    101325.0
    """
    return vapour_pressure + gas_saturation * (STANDARD_ATMOSPHERE - vapour_pressure)


def assess(core: Core, fluid: Fluid, site: Site) -> Consequence | None:
    """Judge whether the vortex cavitates; None in a gas."""
    vapour = fluid.vapour_pressure
    if vapour is None or fluid.heat_capacity_ratio is not None:
        return None
    drop, ambient, notes = _pressures(core, fluid, site)
    tension = site.tensile_strength
    critical = propagate(
        lambda **p: p["vapour pressure"] - p["tensile strength"],
        {"vapour pressure": vapour, "tensile strength": tension},
        quantity=_MARGIN,
    )
    details: list[tuple[str, Estimate]] = [("Vapour pressure", vapour), ("Critical pressure p_v - T", critical)]
    margin = undetermined(_MARGIN)
    verdict, probability = NOT_DECIDED, None
    if ambient is not None:
        margin = _margin(ambient, drop, vapour, tension)
        verdict, probability = decide(margin, 0.0, met_when="at or below")
        if verdict == NOT_DECIDED and probability is not None:
            notes.insert(0, INSIDE_INTERVAL)
    elif not math.isnan(drop.value):
        details.append(("Pressure far away at which it would cavitate", _critical_ambient(drop, critical)))
    details += _numbers(drop, ambient, vapour, fluid, site)
    notes += _speed_notes(site)
    gas_details, gas_notes = _gas(core, vapour, site)
    notes += gas_notes
    notes += _inception_notes(site)
    if tension.value == 0.0:
        notes.append("No tensile strength is given, so the water is taken to bear none; that is the cautious side.")
    if site.orientation == "submerged":
        notes.append(_SUBMERGED)
    return Consequence(
        name=NAME,
        question=_QUESTION,
        estimate=margin,
        criterion=_CRITERION,
        verdict=verdict,
        probability=probability,
        source=_SOURCE,
        caution=_CAUTION,
        details=(*details, *gas_details),
        notes=tuple(notes),
        curves=_curves(core, drop, ambient, critical, site),
    )


def _pressures(core: Core, fluid: Fluid, site: Site) -> tuple[Estimate, Estimate | None, list[str]]:
    """Drop and far pressure that belong together, and what has to be said of them."""
    notes = []
    drop, ambient = core.drop, core.ambient
    stated = site.axis_pressure(fluid)
    if math.isnan(drop.value):
        notes.append("No core pressure drop is known, because no model fits the survey.")
    elif ambient is None and stated is not None:
        # The swirl beyond the last station takes the pressure still lower, so what is known is a least drop.
        drop = Estimate(drop.interval(LEVEL)[0], math.nan, drop.quantity, bound="lower")
        ambient = stated
        notes.append(
            "The drop is known only relative to the last station, so it is a least value and the margin an upper "
            "limit; measure farther out."
        )
    elif ambient is None:
        notes.append(
            "The absolute pressure on the axis is not known: give Site(ambient_pressure=...) at the elevation of "
            "the axis, or surface_pressure and depth."
        )
    if core.drop.bound == "lower":
        what = "the drop is a lower bound" + ("" if ambient is None else " and the margin an upper limit")
        notes += [f"{why}, so {what}; {remedy}." for why, remedy in _why_a_bound(core)]
    if ambient is not None:
        notes.append("The drop is that of the instantaneous vortex, not what a tap reads or a mean profile gives.")
    return drop, ambient, notes


def _why_a_bound(core: Core) -> list[tuple[str, str]]:
    """What leaves the drop open, as far as the core says, each with what would close it."""
    reasons = []
    if core.missed_axis:
        reasons.append(("The line may have missed the axis", "give the miss distance or the second component"))
    if core.core_radius.bound == "upper":
        reasons.append(
            (
                "The survey gives only an upper limit of the core's size in the best profile",
                "measure nearer to the axis",
            )
        )
    elif not reasons or math.isinf(core.envelope[1]):
        reasons.append(
            (
                "At least one profile that the data do not reject leaves the core open, in its size or its shape",
                "take more samples in and around the core, or more precise ones",
            )
        )
    return reasons


def _margin(ambient: Estimate, drop: Estimate, vapour: Estimate, tension: Estimate) -> Estimate:
    if math.isnan(drop.value):
        return undetermined(_MARGIN)
    inputs = {"reference pressure": ambient, "vapour pressure": vapour, "tensile strength": tension}
    if drop.bound is not None:
        rest = propagate(
            lambda **p: pressure_margin(p["reference pressure"], 0.0, p["vapour pressure"], p["tensile strength"]),
            inputs,
            quantity=_MARGIN,
        )
        bound: Literal["lower", "upper"] = "upper" if drop.bound == "lower" else "lower"
        end = rest.interval(LEVEL)[1 if bound == "upper" else 0]
        return Estimate(end - drop.value, math.nan, _MARGIN, bound=bound)

    def formula(**p: Any) -> Any:
        return pressure_margin(
            p["reference pressure"], p["core pressure drop"], p["vapour pressure"], p["tensile strength"]
        )

    everything = {"core pressure drop": drop, **inputs}
    linear = propagate(formula, everything, quantity=_MARGIN)
    if drop.quantiles is None:
        return linear
    drawn = propagate(formula, everything, method="monte carlo", quantity=_MARGIN)
    return dataclasses.replace(linear, quantiles=drawn.quantiles, degrees_of_freedom=math.inf)


def _critical_ambient(drop: Estimate, critical: Estimate) -> Estimate:
    if drop.bound is not None:
        return Estimate(drop.value + critical.value, math.nan, _MARGIN, bound=drop.bound)
    return propagate(
        lambda **p: p["core pressure drop"] + p["critical pressure"],
        {"core pressure drop": drop, "critical pressure": critical},
        quantity=_MARGIN,
    )


def _numbers(
    drop: Estimate, ambient: Estimate | None, vapour: Estimate, fluid: Fluid, site: Site
) -> list[tuple[str, Estimate]]:
    """σ and its inception value, where a speed is named."""
    speed = site.speed
    if speed is None:
        return []
    base = {"density": fluid.density, "speed": speed}
    rows = []
    if ambient is not None:
        sigma = propagate(
            lambda **p: cavitation_number(
                p["reference pressure"],
                vapour_pressure=p["vapour pressure"],
                density=p["density"],
                speed=p["speed"],
            ),
            {"reference pressure": ambient, "vapour pressure": vapour, **base},
            quantity="cavitation_number",
        )
        rows.append((f"Cavitation number σ ({site.speed_name})", sigma))
    name = f"Inception number of this vortex ({site.speed_name})"
    if math.isnan(drop.value):
        return rows
    if drop.bound is not None:
        least = inception_number(
            drop.value,
            density=fluid.density.value,
            speed=speed.value,
            tensile_strength=site.tensile_strength.value,
        )
        return [*rows, (name, Estimate(least, math.nan, "cavitation_number", bound=drop.bound))]
    inception = propagate(
        lambda **p: inception_number(
            p["core pressure drop"],
            density=p["density"],
            speed=p["speed"],
            tensile_strength=p["tensile strength"],
        ),
        {"core pressure drop": drop, "tensile strength": site.tensile_strength, **base},
        quantity="cavitation_number",
    )
    return [*rows, (name, inception)]


def _speed_notes(site: Site) -> list[str]:
    if site.speed is None:
        return [
            "No reference speed is given. The verdict does not need one; Site(speed=..., speed_name=...) adds σ and "
            "the inception number, to compare with those quoted elsewhere."
        ]
    return [f"Coefficients are formed with the {site.speed_name}, {format_estimate(site.speed)}."]


def _inception_notes(site: Site) -> list[str]:
    if site.inception is None:
        return [
            "Neither incipient nor desinent is stated. The static criterion does not tell them apart; say which a "
            "measured number is before comparing."
        ]
    side = "at or below" if site.inception == "incipient" else "at or above"
    return [
        f"The comparison is with {site.inception} cavitation: an observed {site.inception} number lies {side} the "
        "static one where the water bears tension on the way down and bubbles survive on the way up (common "
        "practice)."
    ]


def _gas(core: Core, vapour: Estimate, site: Site) -> tuple[list[tuple[str, Estimate]], list[str]]:
    if site.gas_saturation is None:
        return [], [
            "The gas content is not stated; Site(gas_saturation=...) says whether gas can come out of solution."
        ]
    release = Estimate(gas_release_pressure(vapour.value, site.gas_saturation), 0.0, _MARGIN)
    name = "Pressure below which dissolved gas can come out"
    if core.pressure is None or math.isnan(core.pressure.value):
        return [(name, release)], []
    below = core.pressure.value < release.value
    lies = "lies below" if below else "may lie below" if core.pressure.bound == "upper" else "lies above"
    note = (
        f"At {100.0 * site.gas_saturation:.0f} % of saturation the axis {lies} the "
        f"{format_number(release.value, 'Pa')} at which gas comes out of solution"
        + ("." if lies == "lies above" else "; a gas core can show before vapour does (gaseous cavitation).")
    )
    return [(name, release)], [note]


# The picture: a section through the vortex ---------------------------------------------------------------------------


def _curves(
    core: Core, drop: Estimate, ambient: Estimate | None, critical: Estimate, site: Site
) -> tuple[tuple[str, tuple[float, ...]], ...]:
    if ambient is None or math.isnan(drop.value):
        return ()
    radius = section_radii(core.vortex.peak_radius)
    share = share_of_drop(core.vortex, radius, reference_radius=site.reference_radius)
    low, high = drop.interval(LEVEL)
    lines = {
        "radius": radius,
        "pressure": ambient.value - drop.value * share,
        "pressure if the drop is least": ambient.value - low * share,
        "critical pressure": np.array([critical.value]),
    }
    if math.isfinite(high):
        lines["pressure if the drop is largest"] = ambient.value - high * share
    return tuple((name, tuple(numbers.tolist())) for name, numbers in lines.items())


def draw(axes: Axes, consequence: Consequence) -> None:
    """Draw the pressure across the vortex above the pressure at which the water cavitates."""
    radius = consequence.curve("radius")
    if not radius.size:
        draw_sentence(axes, consequence)
        return
    from vortexwidgets.plots.style import dress, label_axis, theme_in_use

    theme = theme_in_use()
    dress(axes, theme)
    across = mirrored(radius, odd=True)
    pressure = mirrored(consequence.curve("pressure"))
    critical = float(consequence.curve("critical pressure")[0])
    least = mirrored(consequence.curve("pressure if the drop is least"))
    largest = consequence.curve("pressure if the drop is largest")
    bottom = min(float(pressure.min()), critical)
    if largest.size:
        axes.fill_between(
            across, mirrored(largest), least, color=theme.colour(0), alpha=0.18, linewidth=0.0, label="95 %"
        )
        bottom = min(bottom, float(largest.min()))
    bounded = consequence.estimate.bound == "upper"
    axes.plot(
        across, pressure, color=theme.colour(0), linewidth=1.8, label="pressure, at most" if bounded else "pressure"
    )
    top = float(pressure.max())
    span = max(top - bottom, 1.0)
    axes.axhspan(bottom - span, critical, color=theme.warning, alpha=0.13, linewidth=0.0)
    axes.axhline(critical, color=theme.warning, linewidth=1.4)
    axes.annotate(
        "cavitates below this line",
        (across[0], critical),
        xytext=(3, -3),
        textcoords="offset points",
        va="top",
        ha="left",
        color=theme.warning,
        fontsize=8.0,
    )
    axes.set_xlim(float(across[0]), float(across[-1]))
    axes.set_ylim(bottom - 0.16 * span, top + 0.06 * span)
    label_distance(axes)
    label_axis(axes, "y", "absolute pressure", "Pa")
    axes.legend(
        loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=3, frameon=False, fontsize=8.0, labelcolor=theme.text
    )
