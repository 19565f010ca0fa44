"""Free surface: how deep the surface dips above a vertical vortex, and whether an air core reaches the intake."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from vortexwidgets.consequences.consequence import (
    LEVEL,
    MET,
    NOT_DECIDED,
    NOT_MET,
    Consequence,
    Criterion,
    Verdict,
    decide,
    draw_sentence,
    scaled,
    undetermined,
)
from vortexwidgets.consequences.section import label_distance, mirrored, section_radii, share_of_drop
from vortexwidgets.fluids import STANDARD_GRAVITY
from vortexwidgets.formatting import format_estimate, format_number
from vortexwidgets.uncertainty import Estimate, propagate

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vortexwidgets.core_pressure import Core
    from vortexwidgets.fluids import Fluid, Site
    from vortexwidgets.models.vortex import Vortex

FloatArray = npt.NDArray[np.float64]

NAME = "Free-surface dip"
LARGEST_CAPILLARY_RATIO = 0.2  # common practice; above it the dip is not Δp/(ρg) any more
_WATER = "#3b8ed0"  # blue on light and on dark paper
_HALVINGS = 40  # the innermost panel adds less than 1e-24 of a profile that vanishes on the axis
THINNING_RESERVE = 4.0  # a core half as wide at the intake has four times the drop

_QUESTION = "How deep does the surface dip above the vortex, and does an air core reach the intake?"
_CRITERION = Criterion(
    "Air core to the intake (dip at least as deep as the intake lies; ruled out below a quarter of that)",
    "Common practice: air is drawn steadily once the tip of the dip reaches the intake. The reserve of four is a "
    "convention of this package: the core thins towards the intake, and half the core radius makes four times the "
    "drop.",
)
_SOURCE = (
    "h = Δp/(ρg), hydrostatic surface above a columnar vortex: G. K. Batchelor, An Introduction to Fluid Dynamics, "
    "Cambridge University Press, 1967, section 7.5 (from memory)."
)
_CAUTION = (
    "The core thins towards the intake, so this dip is a least value there, and bubbles are pulled off and drawn in "
    "before a full air core stands (common practice). Vortices come and go: judge the share of time as well. A "
    "model smaller than the machine dips less because of viscosity and surface tension. Acceptance of an intake "
    "follows the standard named in the contract and the judgement of whoever is licensed to give it."
)

_NEEDS_ORIENTATION = (
    "It is not known how the vortex stands to the surface: give Site(orientation='surface') for a vertical vortex that "
    "reaches it, or 'submerged'."
)


# The vortex alone ----------------------------------------------------------------------------------------------------


def dip_depth(vortex: Vortex, radius: npt.ArrayLike, *, gravity: float = STANDARD_GRAVITY) -> FloatArray:
    r"""Depth of the free surface below its far level, positive downwards.

    Parameters
    ----------
    vortex : Vortex
        Vertical, reaching the surface.
    radius : array_like, shape (...)
        Distance from the axis. [m]
    gravity : float
        [m/s²]

    Returns
    -------
    ndarray, shape of `radius`
        [m]

    Raises
    ------
    ValueError
        If a radius is negative or gravity is not positive.

    Notes
    -----
    :math:`h(r) = \Delta p(r) / (\rho g)` [1]_; the density cancels. Capillary rise is left out, see `capillary_rise`.

    References
    ----------
    .. [1] G. K. Batchelor, An Introduction to Fluid Dynamics, Cambridge University Press, 1967, section 7.5 (from
       memory).

    Examples
    --------
    A Rankine core of peak swirl v dips by v²/g, half of it outside the core; here v = 1 m/s (by hand).

    >>> import math
    >>> from vortexwidgets import Vortex
    >>> rankine = Vortex("rankine", circulation=2.0 * math.pi * 0.05, core_radius=0.05)
    >>> [round(float(h), 6) for h in dip_depth(rankine, [0.0, 0.05], gravity=10.0)]
    [0.1, 0.05]
    """
    _check_gravity(gravity)
    return np.asarray(vortex.pressure_drop(_radii(radius), density=1.0), dtype=float) / gravity


def dip_of_swirl(
    peak_swirl: npt.ArrayLike, *, pressure_constant: float, gravity: float = STANDARD_GRAVITY
) -> FloatArray:
    """Depth of the dip on the axis from the peak swirl, K v²/g. [m]

    Parameters
    ----------
    peak_swirl : array_like, shape (...)
        Of either sign. [m/s]
    pressure_constant : float
        K of the profile: 1 for Rankine, 1.702 for Lamb-Oseen, 2 for Kaufmann.
    gravity : float
        [m/s²]

    Returns
    -------
    ndarray, shape of `peak_swirl`
        [m]

    Raises
    ------
    ValueError
        If gravity or the constant is not positive.

    Notes
    -----
    The dip goes with the square of the swirl. For a weak vortex, whose swirl is not larger than a few of its standard
    uncertainties, first-order propagation therefore gives nonsense; use method="monte carlo" (JCGM 101, 9.4).

    Examples
    --------
    >>> float(dip_of_swirl(1.0, pressure_constant=2.0, gravity=10.0))
    0.2
    """
    _check_gravity(gravity)
    if not pressure_constant > 0.0:
        raise ValueError(
            f"pressure_constant must be positive, got {pressure_constant:g}; 1 to 2 for the usual profiles."
        )
    return np.asarray(pressure_constant * np.asarray(peak_swirl, dtype=float) ** 2 / gravity)


def surface_rise(vortex: Vortex, radius: npt.ArrayLike, *, gravity: float = STANDARD_GRAVITY) -> FloatArray:
    r"""Height of the free surface at a radius above its level on the axis.

    Parameters
    ----------
    vortex : Vortex
        Vertical; a forced vortex is the rotating bucket.
    radius : array_like, shape (...)
        Distance from the axis. [m]
    gravity : float
        [m/s²]

    Returns
    -------
    ndarray, shape of `radius`
        [m]

    Raises
    ------
    ValueError
        If a radius is negative, gravity is not positive, or the swirl is not zero on the axis (a free vortex).

    Notes
    -----
    :math:`\int_0^r v_\theta^2 / (g s)\,ds`; a forced vortex gives Ω²r²/(2g).

    Examples
    --------
    By hand: (2 rad/s)² (0.5 m)² / (2 · 10 m/s²) = 0.05 m.

    >>> from vortexwidgets import Vortex
    >>> round(float(surface_rise(Vortex("forced", rotation_rate=2.0), 0.5, gravity=10.0)), 12)
    0.05
    """
    _check_gravity(gravity)
    return _integrated(vortex, _radii(radius), power=-1) / gravity


def dip_volume(vortex: Vortex, radius: float, *, gravity: float = STANDARD_GRAVITY) -> float:
    r"""Volume between the free surface and the level plane through its rim at a radius. [m³]

    Parameters
    ----------
    vortex : Vortex
        Vertical; a forced vortex is the rotating bucket.
    radius : float
        Of the rim. [m]
    gravity : float
        [m/s²]

    Raises
    ------
    ValueError
        If the radius is negative, gravity is not positive, or the swirl is not zero on the axis.

    Notes
    -----
    :math:`(\pi/g)\int_0^R v_\theta^2\,s\,ds`, by parts from the shape. Divided by πR² it is how far the mean level lies
    below the rim; what exceeds the free room above the still level spills.

    Examples
    --------
    Half of the cylinder around a paraboloid (by hand: ½ π 1² · 0.2 m³).

    >>> from vortexwidgets import Vortex
    >>> round(dip_volume(Vortex("forced", rotation_rate=2.0), 1.0, gravity=10.0), 9)
    0.314159265
    """
    _check_gravity(gravity)
    return math.pi * float(_integrated(vortex, _radii(radius), power=1)) / gravity


def capillary_rise(
    vortex: Vortex, *, surface_tension: float, density: float, gravity: float = STANDARD_GRAVITY
) -> float:
    """Height by which surface tension lifts the bottom of the dip, S ω0²/(2ρg²). [m]

    Parameters
    ----------
    vortex : Vortex
    surface_tension : float
        [N/m]
    density : float
        [kg/m³]
    gravity : float
        [m/s²]

    Raises
    ------
    ValueError
        If gravity or the density is not positive.

    Notes
    -----
    Near the axis the surface is a paraboloid of curvature (ω0/2)²/g in both directions; both together bear S ω0²/(2g).
    """
    _check_gravity(gravity)
    if not density > 0.0:
        raise ValueError(f"density must be positive, got {density:g} kg/m³; give that of the liquid.")
    return surface_tension * float(vortex.vorticity(0.0)) ** 2 / (2.0 * density * gravity**2)


def capillary_ratio(
    vortex: Vortex, *, surface_tension: float, density: float, gravity: float = STANDARD_GRAVITY
) -> float:
    """Capillary rise as a share of the dip's depth; above 0.2 the dip is not given. [-]

    Parameters
    ----------
    vortex : Vortex
    surface_tension : float
        [N/m]
    density : float
        [kg/m³]
    gravity : float
        [m/s²]

    Raises
    ------
    ValueError
        If gravity or the density is not positive.
    """
    rise = capillary_rise(vortex, surface_tension=surface_tension, density=density, gravity=gravity)
    return rise / float(dip_depth(vortex, 0.0, gravity=gravity))


def _check_gravity(gravity: float) -> None:
    if not gravity > 0.0:
        raise ValueError(f"gravity must be positive, got {gravity:g} m/s²; give it near 9.81 m/s².")


def _radii(radius: npt.ArrayLike) -> FloatArray:
    values = np.asarray(radius, dtype=float)
    if np.any(values < 0.0):
        raise ValueError(
            f"radius must not be negative, got {float(values.min()):g} m; give the distance from the axis."
        )
    return values


def _integrated(vortex: Vortex, radius: FloatArray, *, power: int) -> FloatArray:
    """Integrate v² s^power over s from the axis to each radius."""
    node, weight = np.polynomial.legendre.leggauss(8)
    result = np.zeros(radius.size)
    for number, last in enumerate(radius.ravel().tolist()):
        if last == 0.0:
            continue
        # Halving panels in ln s resolve a core of any size; an edge at the core radius takes the kink of a profile.
        edges = math.log(last) - math.log(2.0) * np.arange(_HALVINGS, -1.0, -1.0)
        if math.isfinite(vortex.core_radius) and 0.0 < vortex.core_radius < last:
            edges = np.unique(np.append(edges, math.log(vortex.core_radius)))
        half = 0.5 * np.diff(edges)[:, None]
        s = np.exp(0.5 * (edges[1:] + edges[:-1])[:, None] + half * node)
        v = np.asarray(vortex.swirl(s), dtype=float)
        if abs(v[0, 0]) > 1e-3 * float(np.abs(v).max()) > 0.0:
            raise ValueError(
                f"The swirl of {vortex.model.name} does not vanish on the axis ({abs(v[0, 0]):.3g} m/s at "
                f"{s[0, 0]:.3g} m), so the surface has no bottom; use dip_depth at a radius, or a profile with a "
                "core."
            )
        result[number] = float(np.sum(half * weight * v**2 * s ** (power + 1)))
    return result.reshape(radius.shape)


# The consequence -----------------------------------------------------------------------------------------------------


def assess(core: Core, fluid: Fluid, site: Site) -> Consequence | None:
    """Judge dip and air-drawing; None in a gas, and for a submerged vortex, which does not dip the surface by Δp/(ρg).

    A submerged vortex draws air only if it connects with the surface; what its low pressure does is the question of
    cavitation, which says so.
    """
    if fluid.is_gas or fluid.heat_capacity_ratio is not None or site.orientation in ("air", "submerged"):
        return None
    if math.isnan(core.drop.value):
        return _open("No core pressure drop is known, because no model fits the survey.")
    depth = scaled(core.drop, 1.0 / (core.density.value * site.gravity), "dip_depth", without="density")
    if site.orientation is None:
        return _open(_NEEDS_ORIENTATION, (("Dip if it is vertical and reaches the surface", depth),))
    notes: list[str] = []
    details: list[tuple[str, Estimate]] = []
    if fluid.surface_tension is None:
        notes.append("The surface tension is not known, so capillary rise is not checked; give it with the fluid.")
    else:
        ratio = _capillary_share(core, fluid.surface_tension, site.gravity)
        details.append(("Capillary rise as a share of the dip", ratio))
        if ratio.value > LARGEST_CAPILLARY_RATIO:
            return _open(
                f"The dip is not given: surface tension lifts its bottom by {ratio.value:.2f} of the "
                f"{format_number(depth.value, 'm', digits=3)} that Δp/(ρg) would give, and that holds up to "
                f"{LARGEST_CAPILLARY_RATIO}. The surface dips less; observe it.",
                tuple(details),
            )
    if core.drop.bound is not None:
        notes.append("The core pressure drop is a lower bound, so the dip is one too.")
    low, high = depth.interval(LEVEL)
    if low <= 0.0:
        notes.append("The 95 % interval of the dip reaches zero: the survey does not show that there is one.")
    verdict, probability, more, sentences = _air(depth, site)
    return Consequence(
        name=NAME,
        question=_QUESTION,
        estimate=depth,
        criterion=_CRITERION,
        verdict=verdict,
        probability=probability,
        source=_SOURCE,
        caution=_CAUTION,
        details=(*details, *more),
        notes=(*sentences, *notes),
        curves=_curves(core, depth, (low, high), site),
    )


def _capillary_share(core: Core, surface_tension: Estimate, gravity: float) -> Estimate:
    """Capillary rise as a share of the dip; the circulation cancels, so it goes with S/r_c²."""
    share = capillary_ratio(
        core.vortex, surface_tension=surface_tension.value, density=core.density.value, gravity=gravity
    )
    if not core.core_radius.is_determined:
        return Estimate(share, math.nan, "ratio")
    return propagate(
        lambda **p: (
            share * (p["surface tension"] / surface_tension.value) * (core.core_radius.value / p["core radius"]) ** 2
        ),
        {"surface tension": surface_tension, "core radius": core.core_radius},
        quantity="ratio",
    )


def _open(sentence: str, details: tuple[tuple[str, Estimate], ...] = ()) -> Consequence:
    """Return a consequence that is not decided, with the reason."""
    return Consequence(
        NAME,
        _QUESTION,
        undetermined("dip_depth"),
        _CRITERION,
        NOT_DECIDED,
        None,
        _SOURCE,
        _CAUTION,
        details,
        (sentence,),
    )


def _air(depth: Estimate, site: Site) -> tuple[Verdict, float | None, list[tuple[str, Estimate]], list[str]]:
    """Verdict on an air core to the intake: the dip is a least value there, so short of it is not yet ruled out."""
    if site.submergence is None:
        return NOT_DECIDED, None, [], ["Give Site(submergence=...), how deep the intake lies, to judge air-drawing."]
    where = format_estimate(site.submergence)
    if depth.bound is not None:
        deepest = site.submergence.interval(LEVEL)[1]
        if depth.value >= deepest:
            return MET, 1.0, [], [f"The dip is at least as deep as the intake at {where}."]
        return NOT_DECIDED, None, [], [f"The intake lies at {where}; a least value of the dip leaves it open."]
    ratio = propagate(
        lambda **p: p["dip depth"] / p["submergence"],
        {"dip depth": depth, "submergence": site.submergence},
        method="linear" if depth.quantiles is None else "monte carlo",
        quantity="ratio",
    )
    reached, probability = decide(ratio, 1.0, met_when="at or above")
    thinned, _ = decide(ratio, 1.0 / THINNING_RESERVE, met_when="at or above")
    rows = [("Dip as a share of the depth of the intake", ratio)]
    if reached == MET:
        return MET, probability, rows, [f"The tip of the dip reaches the intake at {where}."]
    if thinned == NOT_MET:
        thin = math.sqrt(max(ratio.value, 0.0))
        return NOT_MET, probability, rows, [
            f"The core would have to thin to {100.0 * thin:.0f} % of its radius for the dip to reach the intake at "
            f"{where}."
        ]  # fmt: skip
    return NOT_DECIDED, probability, rows, [
        f"The dip of the surveyed core may stay short of the intake at {where}, but a core half as wide there would "
        "bring it down; survey nearer to the intake. The probability is that of the surveyed core alone."
    ]  # fmt: skip


# The picture: a section through the surface --------------------------------------------------------------------------


def _curves(
    core: Core, depth: Estimate, interval: tuple[float, float], site: Site
) -> tuple[tuple[str, tuple[float, ...]], ...]:
    radius = section_radii(core.vortex.peak_radius)
    share = share_of_drop(core.vortex, radius, reference_radius=site.reference_radius)
    low, high = interval
    lines = {"radius": radius, "surface": -depth.value * share, "surface if the dip is least": -max(low, 0.0) * share}
    if math.isfinite(high):
        lines["surface if the dip is deepest"] = -high * share
    if site.submergence is not None:
        lines["intake"] = np.array([-site.submergence.value])
    return tuple((name, tuple(numbers.tolist())) for name, numbers in lines.items())


def draw(axes: Axes, consequence: Consequence) -> None:
    """Draw a section through the surface, with the intake where it is near."""
    radius = consequence.curve("radius")
    if not radius.size:
        draw_sentence(axes, consequence)
        return
    from vortexwidgets.plots.style import dress, label_axis, theme_in_use

    theme = theme_in_use()
    dress(axes, theme)
    across = mirrored(radius, odd=True)
    surface = mirrored(consequence.curve("surface"))
    least = mirrored(consequence.curve("surface if the dip is least"))
    deepest = mirrored(consequence.curve("surface if the dip is deepest"))
    lowest = float(min(surface.min(), deepest.min(initial=0.0)))
    intake = consequence.curve("intake")
    near = bool(intake.size) and float(intake[0]) > 3.0 * lowest
    bottom = 1.25 * min(lowest, float(intake[0]) if near else lowest)
    top = -0.14 * bottom
    axes.set_ylim(bottom, top)
    axes.set_xlim(float(across[0]), float(across[-1]))
    axes.fill_between(across, surface, bottom, color=_WATER, alpha=0.16, linewidth=0.0)
    if deepest.size:
        axes.fill_between(across, deepest, least, color=_WATER, alpha=0.35, linewidth=0.0, label="95 %")
    bounded = consequence.estimate.bound == "lower"
    axes.plot(across, surface, color=theme.colour(0), linewidth=1.8, label="surface, at most" if bounded else "surface")
    axes.axhline(0.0, color=theme.quiet, linewidth=0.9, linestyle=(0.0, (4.0, 3.0)), label="still level")
    if near:
        axes.axhline(float(intake[0]), color=theme.warning, linewidth=1.6, label="depth of the intake")
    elif intake.size:
        axes.annotate(
            f"intake at {format_number(-float(intake[0]), 'm', digits=3)}, below this picture",
            (0.5, 0.0),
            xycoords="axes fraction",
            xytext=(0, 5),
            textcoords="offset points",
            ha="center",
            va="bottom",
            color=theme.warning,
            fontsize=8.0,
        )
    label_distance(axes)
    label_axis(axes, "y", "height above the still level", "m")
    axes.legend(
        loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=4, frameon=False, fontsize=8.0, labelcolor=theme.text
    )
