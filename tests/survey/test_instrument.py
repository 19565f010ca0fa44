"""The instrument's displacements against closed forms and quadrature."""

import math

import numpy as np
import pytest

import vortexwidgets as vx

POINTS = np.array([0.0, 0.2, 0.7, 1.3, 2.5, 6.0])


def averaged(vortex, instrument):
    shift_x, shift_y, weight = instrument.rule
    _, v = vortex.velocity(np.add.outer(POINTS, shift_x), np.broadcast_to(shift_y, (POINTS.size, shift_y.size)))
    return v @ weight


@pytest.mark.parametrize("wander", [0.1, 0.3, 0.6])
def test_lamb_oseen_under_wander_is_a_wider_lamb_oseen(wander):
    """core_radius² + 2σ²: Devenport et al., J. Fluid Mech. 312 (1996) 67-106, closed form."""
    vortex = vx.Vortex("lamb-oseen", circulation=2 * math.pi, core_radius=1.0)
    wide = vx.Vortex("lamb-oseen", circulation=2 * math.pi, core_radius=math.sqrt(1 + 2 * wander**2))
    np.testing.assert_allclose(averaged(vortex, vx.Instrument(wander=wander)), wide.swirl(POINTS), atol=1e-6)


@pytest.mark.parametrize("averaging", ["along", "across", "square"])
def test_probe_against_quadrature(averaging):
    from scipy.integrate import quad

    vortex = vx.Vortex("kaufmann", circulation=2 * math.pi, core_radius=1.0)
    width = 0.8
    got = averaged(vortex, vx.Instrument(probe_width=width, averaging=averaging))

    def line(x, y, along):
        def component(t):
            return vortex.velocity(x + t, y)[1] if along else vortex.velocity(x, y + t)[1]

        return quad(component, -width / 2, width / 2, epsabs=1e-12)[0] / width

    for x, value in zip(POINTS, got, strict=True):
        if averaging == "square":
            expected = quad(lambda t, x=x: line(x, t, True), -width / 2, width / 2, epsabs=1e-10)[0] / width
        else:
            expected = line(x, 0.0, averaging == "along")
        assert value == pytest.approx(expected, abs=1e-9)


def test_weights_sum_to_one_and_an_ideal_instrument_moves_nothing():
    assert vx.Instrument().is_ideal
    both = vx.Instrument(wander=0.2, probe_width=0.3, averaging="square")
    assert sum(both.rule[2]) == pytest.approx(1.0, abs=1e-12)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"wander": -1.0}, "wander"),
        ({"probe_width": math.nan}, "probe_width"),
        ({"averaging": "round"}, "averaging must be"),
    ],
)
def test_refusals(options, message):
    with pytest.raises(ValueError, match=message):
        vx.Instrument(**options)
