"""What the instrument did: wander of the vortex and width of the probe, as displacements to average over."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
import numpy.typing as npt

from vortexwidgets.quantities import check

FloatArray = npt.NDArray[np.float64]
Averaging = Literal["along", "across", "square"]

# Nodes per direction, Gauss-Hermite for the wander and Gauss-Legendre for the probe. For the smooth profiles they are
# good to 1e-6 of the peak up to a wander of 0.6 core radii and a probe of one (tests/survey/test_instrument.py).
_WANDER_NODES = 16
_PROBE_NODES = 8


@dataclass(frozen=True)
class Instrument:
    """What stood between the flow and the reading.

    Parameters
    ----------
    wander : float
        Standard deviation of the vortex centre along one axis while the survey was averaged, equal in x and y. [m]
    probe_width : float
        Width over which the probe averages. [m]
    averaging : {"along", "across", "square"}
        Whether the width lies along x (the traverse), across it, or is a square in the plane.

    Raises
    ------
    ValueError
        If a length is negative or not finite, or `averaging` is none of the three.

    Notes
    -----
    The mean of what was read at a point is the mean of the velocity over the displacements of the vortex relative to
    the probe. Both effects are linear in the velocity, so one rule of nodes and weights serves every model.
    """

    wander: float = 0.0
    probe_width: float = 0.0
    averaging: Averaging = "along"

    def __post_init__(self) -> None:
        check("wander", self.wander)
        check("probe_width", self.probe_width)
        if self.averaging not in ("along", "across", "square"):
            raise ValueError(f"averaging must be 'along', 'across' or 'square', got {self.averaging!r}.")

    @property
    def is_ideal(self) -> bool:
        """Whether nothing is to be corrected."""
        return self.wander == 0.0 and self.probe_width == 0.0

    @cached_property
    def rule(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Displacements in x and y [m] and their weights, which sum to one."""
        x, y, weight = np.zeros(1), np.zeros(1), np.ones(1)
        if self.wander > 0.0:
            node, mass = np.polynomial.hermite_e.hermegauss(_WANDER_NODES)
            mass = mass / mass.sum()
            x = np.repeat(node, _WANDER_NODES) * self.wander
            y = np.tile(node, _WANDER_NODES) * self.wander
            weight = np.outer(mass, mass).ravel()
            kept = weight > 1e-9  # the far corners of the grid weigh nothing
            x, y, weight = x[kept], y[kept], weight[kept] / weight[kept].sum()
        if self.probe_width > 0.0:
            node, mass = np.polynomial.legendre.leggauss(_PROBE_NODES)
            node, mass = 0.5 * self.probe_width * node, 0.5 * mass
            if self.averaging in ("along", "square"):
                x, y, weight = _combined(x, y, weight, node, np.zeros_like(node), mass)
            if self.averaging in ("across", "square"):
                x, y, weight = _combined(x, y, weight, np.zeros_like(node), node, mass)
        return x, y, weight


def _combined(
    x: FloatArray, y: FloatArray, weight: FloatArray, step_x: FloatArray, step_y: FloatArray, mass: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    return (
        np.add.outer(x, step_x).ravel(),
        np.add.outer(y, step_y).ravel(),
        np.multiply.outer(weight, mass).ravel(),
    )
