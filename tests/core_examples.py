"""Cores made by hand, as the consequences are given them."""

import math

from vortexwidgets.core_pressure import Core, core_pressure_of
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.uncertainty import Estimate

NO_MODEL = Estimate(math.nan, math.nan, "core_pressure_drop")


def rankine(peak_swirl, core_radius):
    return Vortex("rankine", circulation=2.0 * math.pi * core_radius * peak_swirl, core_radius=core_radius)


def core_of(
    vortex,
    fluid,
    *,
    ambient=None,
    drop=None,
    relative=0.0,
    bound=None,
    missed_axis=False,
    supported=None,
):
    """A core whose drop is the vortex's own, or the one given, with a relative standard uncertainty."""
    density = fluid.density
    if drop is None:
        depth = float(vortex.pressure_drop(0.0, density=density.value))
        drop = Estimate(depth, math.nan if bound else relative * depth, "core_pressure_drop", bound=bound)
    pressure = None
    if ambient is not None and not math.isnan(drop.value):
        pressure = core_pressure_of(drop, ambient, heat_capacity_ratio=fluid.heat_capacity_ratio)
    return Core(
        vortex=vortex,
        supported=supported if supported is not None else (vortex,),
        drop=drop,
        tap_drop=drop,
        ambient=ambient,
        pressure=pressure,
        envelope=(drop.value, drop.value),
        circulation=Estimate(vortex.circulation, 0.0, "circulation"),
        core_radius=Estimate(vortex.core_radius, 0.01 * vortex.core_radius, "core_radius"),
        peak_swirl=Estimate(vortex.peak_swirl, 0.01 * abs(vortex.peak_swirl), "peak_swirl"),
        peak_radius=Estimate(vortex.peak_radius, 0.01 * vortex.peak_radius, "peak_radius"),
        density=density,
        missed_axis=missed_axis,
    )
