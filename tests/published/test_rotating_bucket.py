"""Rotating-bucket problems printed elsewhere: a forced vortex with a free surface.

The intake table's rows on required submergence and on the swirl meter (ANSI/HI 9.8, Gordon) are left for later: no
public function gives a submergence yet. Every row of the forced-vortex table is served. Where a problem asks for the
rate of rotation, the printed rate is put in and the level that the problem states has to come out within the rate's
rounding.
"""

import math

import pytest

from vortexwidgets.consequences.free_surface import dip_volume, surface_rise
from vortexwidgets.models.vortex import Vortex

GRAVITY = 9.81  # m/s², as in all of these problems
RPM = math.pi / 30.0


def bucket(rotation_rate):
    return Vortex("forced", rotation_rate=rotation_rate)


def rise(rotation_rate, radius):
    """Rim above the lowest point of the surface. [m]"""
    return float(surface_rise(bucket(rotation_rate), radius, gravity=GRAVITY))


def volume(rotation_rate, radius):
    """Between the surface and the level of the rim. [m³]"""
    return dip_volume(bucket(rotation_rate), radius, gravity=GRAVITY)


def below_rim(rotation_rate, radius):
    """Mean level below the rim. [m]"""
    return volume(rotation_rate, radius) / (math.pi * radius**2)


# Worked problem, open civil-engineering page, 2025 (quoted second-hand): a tank of diameter 1 m.


def test_open_tank_at_45_rpm():
    """Second-hand: z = 0.283 m, and 0.111 m³ spill from the full tank."""
    assert rise(45.0 * RPM, 0.5) == pytest.approx(0.283, abs=0.0005)
    assert volume(45.0 * RPM, 0.5) == pytest.approx(0.111, abs=0.0006)


@pytest.mark.parametrize(
    ("rate", "rounding"), [(12.53, 0.006), (120.0 * RPM, 0.5 * RPM)], ids=["12.53 rad/s", "120 rpm"]
)
def test_rate_at_which_the_bottom_2_m_deep_is_bared(rate, rounding):
    """Second-hand."""
    assert rise(rate, 0.5) == pytest.approx(2.0, rel=2.0 * rounding / rate)


def test_rate_at_which_a_tank_filled_to_1_5_of_2_m_begins_to_spill():
    """Second-hand: 8.858 rad/s; the mean level lies 0.5 m below the rim."""
    assert below_rim(8.858, 0.5) == pytest.approx(0.5, rel=2.0 * 0.002 / 8.858)


def test_surface_at_6_rad_per_s():
    """Second-hand: z = 0.46 m."""
    assert rise(6.0, 0.5) == pytest.approx(0.46, abs=0.005)


# Worked problem, civil-engineering review page (quoted second-hand): diameter 1.3 m, height 2.1 m, filled to two
# thirds, 90 rpm.


def test_two_thirds_full_at_90_rpm():
    """Second-hand: h = 1.91 m, 341 L spill, and 2.36 m of height would hold it."""
    radius, height = 0.65, 2.1
    filled = height * 2.0 / 3.0
    area = math.pi * radius**2
    assert rise(90.0 * RPM, radius) == pytest.approx(1.91, abs=0.006)
    spilled = volume(90.0 * RPM, radius) - (height - filled) * area
    assert 1000.0 * spilled == pytest.approx(341.0, abs=1.0)
    assert filled + below_rim(90.0 * RPM, radius) == pytest.approx(2.36, abs=0.005)


# Textbooks, from memory.


@pytest.mark.parametrize(("rate", "rounding"), [(19.8, 0.05), (189.0 * RPM, 0.5 * RPM)], ids=["19.8 rad/s", "189 rpm"])
def test_overflow_from_a_water_tank_during_rotation(rate, rounding):
    """Y. A. Cengel and J. M. Cimbala, Fluid Mechanics, example 3-13 (from memory): 20 cm wide, 60 cm high, filled to
    50 cm."""
    assert below_rim(rate, 0.1) == pytest.approx(0.1, rel=2.0 * rounding / rate)


def test_coffee_cup():
    """F. M. White, Fluid Mechanics, example 2.14 (from memory): 6 cm wide, 10 cm deep, filled to 7 cm; 36.2 rad/s
    brings it to the rim, and 990 Pa gauge stand in the bottom corner with 1010 kg/m³."""
    assert below_rim(36.2, 0.03) == pytest.approx(0.03, rel=2.0 * 0.05 / 36.2)
    above_corner = 0.07 + below_rim(36.2, 0.03)
    assert 1010.0 * GRAVITY * above_corner == pytest.approx(990.0, abs=5.0)


@pytest.mark.parametrize(("rpm", "fraction"), [(224.0, 2.0 / 3.0), (275.0, 1.0)])
def test_full_cylinder(rpm, fraction):
    """F. M. White, Fluid Mechanics, a problem (from memory): 16 cm wide, 27 cm high and full; the paraboloid reaches
    two thirds of the way down (one third spilled), and the bottom."""
    radius, height = 0.08, 0.27
    allowed = 2.0 * 0.6 / rpm
    assert rise(rpm * RPM, radius) == pytest.approx(fraction * height, rel=allowed)
    assert volume(rpm * RPM, radius) == pytest.approx(0.5 * fraction * math.pi * radius**2 * height, rel=allowed)
