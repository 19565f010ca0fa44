"""JCGM 101:2008, 9.4, as the dip of a weak vortex: a sum of two squares near zero.

A line that misses the axis measures the peak swirl by two components, each with its own noise: v² = a² + b². The dip
of a Rankine core is v²/g, so with g taken as 1 it is the guide's Y = X1² + X2². All rows are from memory; values in
1e-6, uncorrelated, X2 = 0, u = 0.005, shortest 95 % interval.
"""

import numpy as np
import pytest

from vortexwidgets import propagate
from vortexwidgets.consequences.free_surface import dip_depth, dip_of_swirl
from vortexwidgets.models.vortex import Vortex

DRAWS = 1_000_000
ROWS = [
    # first component, mean, its tolerance, u, lower and upper end, their tolerance with the noise of the draws
    (0.0, 50.0, 1.1, 50.0, 0.0, 150.0, 1.0),
    (0.01, 150.0, 1.1, 112.0, 0.0, 367.0, 1.5),
    (0.05, 2551.0, 1.1, 502.0, 1590.0, 3543.0, 8.0),
]
rows = pytest.mark.parametrize("row", ROWS, ids=[f"x1={row[0]}" for row in ROWS])


def dip(along, across):
    return dip_of_swirl(np.hypot(along, across), pressure_constant=1.0, gravity=1.0)


@rows
def test_dip_of_a_weak_vortex(row):
    along, mean, mean_tolerance, uncertainty, low, high, end_tolerance = row
    found = propagate(
        dip,
        {"along": (along, 0.005), "across": (0.0, 0.005)},
        method="monte carlo",
        quantity="dip_depth",
        draws=DRAWS,
    )
    sampling = 2.0 * uncertainty / DRAWS**0.5  # two standard deviations of the draws' own noise, as the guide's has too
    assert 1e6 * found.value == pytest.approx(mean, abs=mean_tolerance + sampling)
    assert 1e6 * found.uncertainty == pytest.approx(uncertainty, abs=0.6 + sampling / 2.0**0.5)
    ends = found.interval(0.95, kind="shortest")
    assert [1e6 * end for end in ends] == pytest.approx([low, high], abs=end_tolerance)


def test_first_order_propagation_says_nothing_there():
    """JCGM 101, 9.4.2.1.1: at X1 = X2 = 0 the first-order uncertainty is zero."""
    found = propagate(dip, {"along": (0.0, 0.005), "across": (0.0, 0.005)}, quantity="dip_depth")
    assert (found.value, found.uncertainty) == (0.0, pytest.approx(0.0, abs=1e-9))


def test_the_formula_is_that_of_the_vortex():
    vortex = Vortex("rankine", circulation=2.0 * np.pi * 0.1 * 0.05, core_radius=0.1)
    assert float(dip_depth(vortex, 0.0, gravity=1.0)) == pytest.approx(float(dip(0.05, 0.0)), rel=1e-12)
