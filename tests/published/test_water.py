"""Water against the tables of the IAPWS releases.

Provenance beside each row: "quoted second-hand" was read where somebody else quotes the release, "from memory" was
not read again, "independent program" is the `iapws` package, written elsewhere from the same releases.

Left out, because no public function serves them: IF97-T36-Tsat (saturation temperature as a function of pressure is
not needed; the rows are checked the other way round, as the pressure at the printed temperature) and
R12-08-T4-mu-1-433.15 (1 kg/m³ at 160 °C is steam; `water` is the liquid). R7-97's own specific volume (IF97-T5-v,
region 1) is a fit to IAPWS-95, which is what is used here, and is compared within the 0.002 % by which the two
releases differ.
"""

import pytest
from scipy.optimize import brentq

import vortexwidgets as vx
from vortexwidgets.fluid_equations import water_surface_tension
from vortexwidgets.fluids import LAMBDA_POINT

ZERO = 273.15


# IAPWS R7-97(2012), Table 35: quoted second-hand. Tolerance: the nine digits printed.
@pytest.mark.parametrize(
    ("kelvin", "megapascal", "digits"),
    [(300.0, 0.00353658941, 5.05e-12), (500.0, 2.63889776, 5.05e-9), (600.0, 12.3443146, 5.05e-8)],
)
def test_saturation_pressure_of_if97(kelvin, megapascal, digits):
    fluid = vx.water(kelvin - ZERO, pressure=50e6)
    assert 1e-6 * fluid.vapour_pressure.value == pytest.approx(megapascal, abs=digits)


# IAPWS R7-97(2012), Table 36, read backwards: 0.1 and 1 MPa quoted second-hand, 10 MPa from memory. A microkelvin in
# the printed temperature is 4e-8 to 2e-8 of the pressure.
@pytest.mark.parametrize(("megapascal", "kelvin"), [(0.1, 372.755919), (1.0, 453.035632), (10.0, 584.149488)])
def test_saturation_temperature_of_if97(megapascal, kelvin):
    fluid = vx.water(kelvin - ZERO, pressure=50e6)
    assert 1e-6 * fluid.vapour_pressure.value == pytest.approx(megapascal, rel=4e-8)


# IAPWS SR1-86(1992), Table 1: from memory. That release and R7-97, which is used here, agree to the printed digits.
@pytest.mark.parametrize(("kelvin", "pascal", "digits"), [(273.16, 611.657, 6.01e-4), (373.1243, 101325.0, 0.6)])
def test_vapour_pressure_of_the_supplementary_release(kelvin, pascal, digits):
    assert vx.water(kelvin - ZERO, pressure=1e6).vapour_pressure.value == pytest.approx(pascal, abs=digits)


# IAPWS R12-08, Table 4: quoted second-hand. The table is in density and temperature; the pressure that gives the
# density is found first.
@pytest.mark.parametrize(
    ("density", "kelvin", "micropascal_seconds"),
    [(998.0, 298.15, 889.735100), (1000.0, 373.15, 307.883622), (1000.0, 433.15, 217.685358)],
)
def test_viscosity_of_r12_08(density, kelvin, micropascal_seconds):
    celsius = kelvin - ZERO

    def excess(pressure):
        return vx.water(celsius, pressure=pressure).density.value - density

    fluid = vx.water(celsius, pressure=brentq(excess, 1e6, 5e8, xtol=1e-3, rtol=1e-14))
    dynamic = fluid.kinematic_viscosity.value * fluid.density.value
    assert 1e6 * dynamic == pytest.approx(micropascal_seconds, abs=1e-6)


# IAPWS R1-76(2014), Table 1: from memory. Tolerance: half of the last printed digit and the rounding of 0.01 °C.
@pytest.mark.parametrize(
    ("celsius", "millinewton"),
    [(0.01, 75.65), (5.0, 74.94), (10.0, 74.22), (15.0, 73.49), (20.0, 72.74), (25.0, 71.97), (30.0, 71.19),
     (40.0, 69.60), (50.0, 67.94)],
)  # fmt: skip
def test_surface_tension_table(celsius, millinewton):
    assert 1e3 * vx.water(celsius).surface_tension.value == pytest.approx(millinewton, abs=0.006)


def test_surface_tension_at_300_kelvin():
    # IAPWS R1-76(2014): 71.6859625 mN/m, quoted second-hand
    assert 1e3 * vx.water(300.0 - ZERO).surface_tension.value == pytest.approx(71.6859625, abs=1e-6)


def test_density_of_air_free_water_at_25_celsius():
    # CIPM, M. Tanaka et al., Metrologia 38 (2001) 301-309: 997.047 kg/m³ (from memory)
    assert vx.water(25.0).density.value == pytest.approx(997.047, abs=1e-3)


def test_specific_volume_of_if97_region_1():
    # IAPWS R7-97(2012), Table 5: 0.00100215168 m³/kg at 300 K and 3 MPa (from memory); IAPWS-95 differs by 2e-6
    assert 1.0 / vx.water(300.0 - ZERO, pressure=3e6).density.value == pytest.approx(0.00100215168, rel=2e-5)


@pytest.mark.parametrize("celsius", [1.0, 15.0, 40.0, 90.0])
def test_density_and_viscosity_against_an_independent_program(celsius):
    iapws = pytest.importorskip("iapws")
    other = iapws.IAPWS95(T=celsius + ZERO, P=0.101325)
    fluid = vx.water(celsius)
    assert fluid.density.value == pytest.approx(other.rho, rel=1e-7)
    assert fluid.kinematic_viscosity.value == pytest.approx(other.nu, rel=1e-5)
    assert fluid.vapour_pressure.value == pytest.approx(1e6 * iapws.iapws97._PSat_T(celsius + ZERO), rel=1e-8)
    assert water_surface_tension(celsius + ZERO) == pytest.approx(iapws._iapws._Tension(celsius + ZERO), rel=1e-12)


# Air and helium have no rows in the list of printed values; a few handbook numbers, all from memory, with their
# tolerance.


def test_air_of_the_standard_atmosphere():
    # U.S. Standard Atmosphere 1976: 1.2250 kg/m³ and 1.4607e-5 m²/s at 15 °C, from the perfect gas and Sutherland's
    # formula
    fluid = vx.air(15.0)
    assert fluid.density.value == pytest.approx(1.2250, rel=6e-4)
    assert fluid.kinematic_viscosity.value == pytest.approx(1.4607e-5, rel=5e-3)
    assert fluid.heat_capacity_ratio == pytest.approx(1.40, abs=0.003)


def test_moist_air_against_the_perfect_gas_mixture():
    # derived: ρ = (p - p_w)/(287.05 T) + p_w/(461.5 T) with p_w half of the 2339 Pa that saturate at 20 °C
    expected = (101325.0 - 1169.5) / (287.05 * 293.15) + 1169.5 / (461.5 * 293.15)
    assert vx.air(20.0, humidity=0.5).density.value == pytest.approx(expected, rel=6e-4)


def test_liquid_helium_at_4_2_kelvin():
    # R. J. Donnelly and C. F. Barenghi, J. Phys. Chem. Ref. Data 27 (1998) 1217-1274: 125.4 kg/m³ and 3.26 µPa s at
    # 4.2 K
    fluid = vx.helium(4.2 - ZERO)
    assert fluid.density.value == pytest.approx(125.4, rel=1e-2)
    assert fluid.kinematic_viscosity.value * fluid.density.value == pytest.approx(3.26e-6, rel=0.1)
    assert fluid.vapour_pressure.value == pytest.approx(99.2e3, rel=5e-3)  # ITS-90 vapour-pressure scale
    assert LAMBDA_POINT == 2.1768
