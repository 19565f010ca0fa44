"""A section through the axis, as the pictures of the consequences show it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vortexwidgets.models.vortex import Vortex

FloatArray = npt.NDArray[np.float64]

_REACH = 6.0  # peak radii to either side: wide enough to see the far level, narrow enough to see the core


def section_radii(peak_radius: float, *, reach: float = _REACH, points: int = 121) -> FloatArray:
    """Radii from the axis outwards, closer together in the core. [m]

    Parameters
    ----------
    peak_radius : float
        [m]
    reach : float
        Last radius, in peak radii.
    points : int
    """
    return np.asarray(reach * peak_radius * np.linspace(0.0, 1.0, points) ** 1.5)


def share_of_drop(vortex: Vortex, radius: FloatArray, *, reference_radius: float | None = None) -> FloatArray:
    """Pressure drop at a radius as a share of that on the axis, both relative to the same reference.

    Parameters
    ----------
    vortex : Vortex
    radius : ndarray, shape (N,)
        [m]
    reference_radius : float, optional
        Where the reference pressure holds; the far field by default. [m]

    Returns
    -------
    ndarray, shape (N,)
        1 on the axis, 0 at the reference.
    """
    deepest = float(vortex.pressure_drop(0.0, density=1.0))
    reference = 0.0 if reference_radius is None else float(vortex.pressure_drop(reference_radius, density=1.0))
    drop = np.asarray(vortex.pressure_drop(radius, density=1.0), dtype=float)
    return (drop - reference) / (deepest - reference)


def mirrored(values: FloatArray, *, odd: bool = False) -> FloatArray:
    """Continue a curve that starts on the axis to the other side of it."""
    return np.concatenate([(-1.0 if odd else 1.0) * values[:0:-1], values])


def label_distance(axes: Axes) -> None:
    """Label the distance from the axis of the vortex."""
    from vortexwidgets.plots.style import label_axis

    label_axis(axes, "x", "distance from the axis", "m")
