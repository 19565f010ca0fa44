"""Sea water against TEOS-10 and EOS-80.

The rows are the documentation examples of gsw_rho (www.teos-10.org/pubs/gsw/html/gsw_rho.html), quoted second-hand.
They are in absolute salinity, conservative temperature and sea pressure; `sea_water` takes the in-situ temperature,
which the `iapws` package (IAPWS R13-08, written elsewhere) gives here. `sea_water` is EOS-80, an older standard than
TEOS-10, so the printed 1e-9 kg/m³ cannot be met: the two differ by up to 0.003 kg/m³ in these rows, and the test
allows the 0.01 kg/m³ that `sea_water` states as its standard uncertainty. The property library's own sea water
ignores pressure; its difference is stated below.
"""

import math

import pytest
from scipy.optimize import brentq

import vortexwidgets as vx
from vortexwidgets.fluid_equations import (
    sea_water_density,
    sea_water_surface_tension,
    sea_water_vapour_pressure_ratio,
    sea_water_viscosity_ratio,
)

iapws = pytest.importorskip("iapws")

ZERO, ATMOSPHERE = 273.15, 101325.0
TEOS_10_HEAT_CAPACITY = (
    3.99186795711963  # [kJ/(kg K)] defines conservative temperature; TEOS-10 manual (2010), eq. 3.3.3
)
UNIT = 35.16504 / 35.0  # g/kg in one unit of practical salinity

ROWS = [
    (34.7118, 28.8099, 10.0, 1021.839936),
    (34.8915, 28.4392, 50.0, 1022.262458),
    (35.0256, 22.7862, 125.0, 1024.427195),
    (34.8472, 10.2262, 250.0, 1027.790153),
    (34.7366, 6.8272, 600.0, 1029.837779),
    (34.7324, 4.3236, 1000.0, 1032.002453),
]


def in_situ_temperature(salinity, conservative, pressure):
    """[K] By way of the potential temperature, at which the entropy is the same at sea level."""
    fraction, at_surface, there = 1e-3 * salinity, 1e-6 * ATMOSPHERE, 1e-6 * pressure
    potential = brentq(
        lambda t: iapws.SeaWater(T=t, P=at_surface, S=fraction).h - TEOS_10_HEAT_CAPACITY * conservative, 273.15, 313.0
    )
    entropy = iapws.SeaWater(T=potential, P=at_surface, S=fraction).s
    return brentq(lambda t: iapws.SeaWater(T=t, P=there, S=fraction).s - entropy, 273.15, 313.0)


@pytest.mark.parametrize(("salinity", "conservative", "decibar", "density"), ROWS)
def test_density_against_teos_10(salinity, conservative, decibar, density):
    pressure = ATMOSPHERE + 1e4 * decibar
    kelvin = in_situ_temperature(salinity, conservative, pressure)
    fluid = vx.sea_water(kelvin - ZERO, salinity=salinity, pressure=pressure)
    assert fluid.density.value == pytest.approx(density, abs=0.01)
    assert abs(fluid.density.value - density) < fluid.density.uncertainty


def test_why_the_property_library_is_not_used():
    # Its sea water has no pressure dependence: 4.5 kg/m³, 400 times the uncertainty stated here, at 1000 dbar.
    from CoolProp.CoolProp import PropsSI

    salinity, conservative, decibar, density = ROWS[-1]
    kelvin = in_situ_temperature(salinity, conservative, ATMOSPHERE + 1e4 * decibar)
    library = PropsSI("D", "T", kelvin, "P", ATMOSPHERE + 1e4 * decibar, f"INCOMP::MITSW[{1e-3 * salinity}]")
    assert 3.0 < density - library < 6.0


# Unesco Technical Papers in Marine Science 44 (1983), p. 19, check values of EOS-80: practical salinity, t68, pressure.
# From memory; tolerance: the five decimals printed.
@pytest.mark.parametrize(
    ("salinity", "t68", "bar", "density"),
    [
        (0.0, 5.0, 0.0, 999.96675),
        (0.0, 5.0, 1000.0, 1044.12802),
        (0.0, 25.0, 0.0, 997.04796),
        (0.0, 25.0, 1000.0, 1037.90204),
        (35.0, 5.0, 0.0, 1027.67547),
        (35.0, 5.0, 1000.0, 1069.48914),
        (35.0, 25.0, 0.0, 1023.34306),
        (35.0, 25.0, 1000.0, 1062.53817),
    ],
)
def test_check_values_of_eos_80(salinity, t68, bar, density):
    found = sea_water_density(ZERO + t68 / 1.00024, UNIT * salinity, ATMOSPHERE + 1e5 * bar)
    assert found == pytest.approx(density, abs=5.1e-6)


@pytest.mark.parametrize("celsius", [2.0, 15.0, 30.0])
@pytest.mark.parametrize("salinity", [10.0, 35.0])
def test_vapour_pressure_against_the_water_activity_of_iapws_08(celsius, salinity):
    # independent program: activity of water exp(-φ m M), φ osmotic coefficient, m molality; the package's m is in mol/g
    other = iapws.SeaWater(T=celsius + ZERO, P=0.101325, S=1e-3 * salinity)
    activity = math.exp(-other.osm * 1e3 * other.m * 0.018015268)
    assert sea_water_vapour_pressure_ratio(salinity) == pytest.approx(activity, abs=5e-4)
    ratio = vx.sea_water(celsius, salinity=salinity).vapour_pressure.value / vx.water(celsius).vapour_pressure.value
    assert ratio == pytest.approx(activity, abs=5e-4)


@pytest.mark.parametrize("celsius", [2.0, 15.0, 30.0])
def test_surface_tension_against_an_independent_program(celsius):
    other = iapws.iapws08._Tension_SeaWater(celsius + ZERO, 0.035)
    assert sea_water_surface_tension(celsius + ZERO, 35.0) == pytest.approx(other, rel=1e-12)
    assert vx.sea_water(celsius).surface_tension.value == pytest.approx(other, rel=1e-12)


def test_viscosity_of_sea_water_at_20_celsius():
    # ITTC recommended procedure 7.5-02-01-03 (2011): 1.0542e-6 m²/s for 35 g/kg at 20 °C (from memory); the equation
    # used here states 1.5 %
    assert vx.sea_water(20.0).kinematic_viscosity.value == pytest.approx(1.0542e-6, rel=1e-2)
    assert sea_water_viscosity_ratio(293.15, 0.0) == 1.0
