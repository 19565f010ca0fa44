"""Printed examples of the GUM and of its first supplement, through `propagate`.

Sources: JCGM 100:2008, Guide to the expression of uncertainty in measurement, annexes H.2 and H.3; JCGM 101:2008,
Propagation of distributions using a Monte Carlo method, 9.4. Each row says its provenance: "quoted second-hand" was
read where somebody else quotes the source, "from memory" was not read again.

Left out: GUM-H2-rRX, -rRZ, -rXZ (correlation of two results: `propagate` has one result; the same information is
checked here by propagating R and X on to Z). GUM-H3-y1, s_y1, y2, s_y2, r and RSS are outputs of a straight-line fit,
which no public function serves; they are the inputs of the row for 30 °C.
"""

import math

import numpy as np
import pytest

from vortexwidgets.uncertainty import Estimate, propagate

# JCGM 100:2008 H.2, five simultaneous readings (input data, quoted second-hand)
VOLTAGE = np.array([5.007, 4.994, 5.005, 4.990, 4.999])
CURRENT = np.array([19.663, 19.639, 19.640, 19.685, 19.678]) * 1e-3
PHASE = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])


@pytest.fixture(scope="module")
def readings():
    columns = {"voltage": VOLTAGE, "current": CURRENT, "phase": PHASE}
    return {
        name: Estimate(column.mean(), column.std(ddof=1) / math.sqrt(5), degrees_of_freedom=4)
        for name, column in columns.items()
    }


FORMULAS = {
    "R": lambda voltage, current, phase: voltage * np.cos(phase) / current,
    "X": lambda voltage, current, phase: voltage * np.sin(phase) / current,
    "Z": lambda voltage, current, phase: voltage / current + 0.0 * phase,
}


@pytest.mark.parametrize("method", ["linear", "monte carlo"])
@pytest.mark.parametrize(
    ("name", "value", "tolerance", "uncertainty", "tolerance_u"),
    [
        ("R", 127.732, 0.0005, 0.071, 0.0005),  # value quoted second-hand, uncertainty from memory
        ("X", 219.847, 0.0005, 0.295, 0.0006),  # value quoted second-hand, uncertainty from memory
        ("Z", 254.260, 0.0005, 0.236, 0.0005),  # value quoted second-hand, uncertainty from memory
    ],
)
def test_gum_h2_impedance(readings, method, name, value, tolerance, uncertainty, tolerance_u):
    correlation = np.corrcoef([VOLTAGE, CURRENT, PHASE])
    found = propagate(FORMULAS[name], readings, correlation=correlation, method=method)
    if method == "linear":
        assert found.value == pytest.approx(value, abs=tolerance)
        assert found.uncertainty == pytest.approx(uncertainty, abs=tolerance_u)
        assert found.degrees_of_freedom == 4.0
    else:
        # Draws of Student's t with 4 degrees of freedom have √(4/2) of the standard uncertainty (JCGM 101, 6.4.9.4).
        assert found.value == pytest.approx(value, abs=0.005)
        assert found.uncertainty == pytest.approx(uncertainty * math.sqrt(2.0), rel=0.03)


def test_gum_h2_the_correlation_of_results_carries_on(readings):
    # Z from R and X with r(R, X) = -0.588 (from memory): the same 0.236 ohm (from memory).
    r, x = Estimate(127.732, 0.071), Estimate(219.847, 0.295)
    z = propagate(lambda r, x: np.hypot(r, x), {"r": r, "x": x}, correlation={("r", "x"): -0.588})
    assert z.value == pytest.approx(254.260, abs=0.001)
    assert z.uncertainty == pytest.approx(0.236, abs=0.001)


def test_gum_h3_predicted_correction():
    # y1 = -0.1712 (29) °C, y2 = 0.00218 (67), r = -0.930; b(30 °C) = -0.1494 °C, u = 0.0041 °C (all quoted second-hand)
    found = propagate(
        lambda y1, y2: y1 + y2 * (30.0 - 20.0),
        {"y1": Estimate(-0.1712, 0.0029, degrees_of_freedom=9), "y2": Estimate(0.00218, 0.00067, degrees_of_freedom=9)},
        correlation={("y1", "y2"): -0.930},
    )
    assert found.value == pytest.approx(-0.1494, abs=5e-5)
    assert found.uncertainty == pytest.approx(0.0041, abs=5e-5)
    assert found.degrees_of_freedom == 9.0


DRAWS = 2_000_000


# JCGM 101:2008 9.4, comparison loss: Y = X1² + X2², u = 0.005 each, x2 = 0, uncorrelated; shortest 95 % intervals.
# All from memory; values in 1e-6, tolerances as the printed digits and their own Monte Carlo scatter leave them.
@pytest.mark.parametrize(
    ("x1", "mean", "uncertainty", "low", "high", "tolerance"),
    [
        (0.000, 50.0, 50.0, 0.0, 150.0, 1.0),
        (0.010, 150.0, 112.0, 0.0, 367.0, 1.0),
        (0.050, 2551.0, 502.0, 1590.0, 3543.0, 8.0),
    ],
)
def test_jcgm_101_comparison_loss(x1, mean, uncertainty, low, high, tolerance):
    found = propagate(
        lambda x1, x2: x1**2 + x2**2,
        {"x1": (x1, 0.005), "x2": (0.0, 0.005)},
        method="monte carlo",
        draws=DRAWS,
    )
    assert 1e6 * found.value == pytest.approx(mean, abs=1.1)
    own_scatter = 3.0 * uncertainty / math.sqrt(2.0 * DRAWS)
    assert 1e6 * found.uncertainty == pytest.approx(uncertainty, abs=0.6 + own_scatter)
    shortest = found.interval(0.95, "shortest")
    assert 1e6 * shortest[0] == pytest.approx(low, abs=tolerance)
    assert 1e6 * shortest[1] == pytest.approx(high, abs=tolerance)
    symmetric = found.interval(0.95)
    assert symmetric[1] - symmetric[0] > shortest[1] - shortest[0] - 1e-9


def test_jcgm_101_first_order_propagation_says_nothing_there():
    # 9.4.2.2: at x1 = 0 the sensitivity coefficients vanish, and so does the first-order uncertainty (from memory).
    found = propagate(lambda x1, x2: x1**2 + x2**2, {"x1": (0.0, 0.005), "x2": (0.0, 0.005)})
    assert found.value == 0.0
    assert found.uncertainty == pytest.approx(0.0, abs=1e-15)
