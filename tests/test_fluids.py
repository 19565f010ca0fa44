import math
import pickle
import re
import subprocess
import sys
from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import vortexwidgets as vx
from vortexwidgets.fluids import FLUIDS, LAMBDA_POINT, STANDARD_GRAVITY, Fluid, Site, fluid_named
from vortexwidgets.uncertainty import Estimate

PROPERTIES = ("temperature", "pressure", "density", "kinematic_viscosity", "vapour_pressure", "surface_tension")


@pytest.fixture(scope="module")
def water():
    return vx.water(15.0)


# The fluids ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", FLUIDS)
def test_a_fluid_is_a_value_with_units_source_and_uncertainty(name):
    fluid = FLUIDS[name]()
    assert fluid.name == name
    for key in PROPERTIES:
        estimate = getattr(fluid, key)
        if estimate is not None:
            assert estimate.quantity == {"pressure": "pressure"}.get(key, key)
    assert fluid.density.uncertainty > 0.0
    assert fluid.kinematic_viscosity.uncertainty > 0.0
    assert "%" in fluid.source
    assert fluid == FLUIDS[name]()
    assert hash(fluid) == hash(FLUIDS[name]())
    assert pickle.loads(pickle.dumps(fluid)) == fluid
    for word in (name, "density", "kinematic viscosity", fluid.source):
        assert word in str(fluid)


def test_a_liquid_boils_and_a_gas_expands(water):
    assert not water.is_gas
    assert water.heat_capacity_ratio is None
    air = vx.air(15.0)
    assert air.is_gas
    assert air.vapour_pressure is None
    assert air.surface_tension is None
    assert 1.39 < air.heat_capacity_ratio < 1.41
    liquid, gas = vx.helium(-269.15), vx.helium(20.0)
    assert not liquid.is_gas
    assert liquid.heat_capacity_ratio is None
    assert gas.is_gas
    assert gas.heat_capacity_ratio == pytest.approx(5.0 / 3.0, abs=1e-3)  # a monatomic gas, derived
    assert vx.helium(
        -268.15
    ).is_gas  # 5 K, near the critical point: the ratio of heat capacities describes no expansion
    assert vx.helium(-268.15).heat_capacity_ratio is None


def test_the_temperature_is_in_celsius_at_the_border_and_kelvin_as_an_estimate(water):
    assert water.temperature == Estimate(288.15, 0.0, "temperature")
    assert vx.water((15.0, 0.2)) == vx.water(Estimate(288.15, 0.2, "temperature"))


def test_the_state_s_uncertainty_reaches_every_property(water):
    doubtful = vx.water((15.0, 0.2), pressure=(101325.0, 500.0))
    for key in ("density", "kinematic_viscosity", "vapour_pressure", "surface_tension"):
        now, before = getattr(doubtful, key), getattr(water, key)
        assert now.value == before.value
        assert now.uncertainty > before.uncertainty
        assert {"temperature", "equation"} <= {part.name for part in now.budget}
    # dp_v/dT at 15 °C is 109.6 Pa/K (Clausius-Clapeyron with 2465.4 kJ/kg and 77.9 m³/kg, from memory): 21.9 Pa for
    # 0.2 K
    share = next(part for part in doubtful.vapour_pressure.budget if part.name == "temperature")
    assert share.uncertainty == pytest.approx(0.2 * 109.6, rel=0.01)


def test_at_the_edges_of_the_range_the_slopes_are_those_of_the_liquid():
    for celsius in (0.0, 99.95):
        inside = vx.water((min(max(celsius, 1.0), 99.0), 5.0))
        edge = vx.water((celsius, 5.0))
        assert edge.density.uncertainty == pytest.approx(inside.density.uncertainty, rel=0.4)
        assert edge.kinematic_viscosity.uncertainty == pytest.approx(inside.kinematic_viscosity.uncertainty, rel=0.1)


def test_zero_celsius_continues_the_liquid():
    zero, above = vx.water(0.0), vx.water(0.02)
    assert zero.density.value == pytest.approx(above.density.value, rel=2e-6)
    assert zero.kinematic_viscosity.value == pytest.approx(above.kinematic_viscosity.value, rel=1e-3)
    assert zero.vapour_pressure.value == pytest.approx(above.vapour_pressure.value, rel=2e-3)


def test_sea_water_of_no_salt_is_water(water):
    fresh = vx.sea_water(15.0, salinity=0.0)
    assert fresh.density.value == pytest.approx(water.density.value, abs=0.01)
    assert fresh.kinematic_viscosity.value == pytest.approx(water.kinematic_viscosity.value, rel=1e-4)
    assert fresh.vapour_pressure.value == pytest.approx(water.vapour_pressure.value, rel=1e-9)
    assert fresh.surface_tension.value == pytest.approx(water.surface_tension.value, rel=1e-9)


def test_salinity_and_humidity_have_their_place_in_the_budget():
    sea = vx.sea_water(15.0, salinity=(35.0, 0.5))
    assert "salinity" in {part.name for part in sea.density.budget}
    assert "Salinity 35.0 ± 0.5 g/kg" in sea.source
    air = vx.air(20.0, humidity=(0.5, 0.1))
    assert "humidity" in {part.name for part in air.density.budget}
    assert "Relative humidity 50 %" in air.source
    assert vx.air(20.0).density.value > air.density.value


@settings(max_examples=15, deadline=None)
@given(st.floats(1.0, 60.0), st.floats(0.0, 0.5))
def test_density_falls_and_vapour_pressure_rises_with_temperature(celsius, spread):
    cold, warm = vx.water((celsius + 5.0, spread)), vx.water((celsius + 15.0, spread))
    assert warm.density.value < cold.density.value
    assert warm.vapour_pressure.value > cold.vapour_pressure.value
    assert warm.kinematic_viscosity.value < cold.kinematic_viscosity.value


@pytest.mark.parametrize(
    ("call", "sentence"),
    [
        (lambda: vx.water(400.0), "equation of water holds from 0 to 360 °C, got 400 °C; .* 400 K would be 126.85 °C"),
        (lambda: vx.water(-5.0), "equation of water holds from 0 to 360 °C, got -5 °C"),
        (
            lambda: vx.water(Estimate(15.0, 0.0, "temperature")),
            "got -258.15 °C; .* If 15 °C was meant, it was given in K",
        ),
        (lambda: vx.water(-300.0), r"water at -300 °C is below absolute zero \(-273.15 °C\)"),
        (lambda: vx.water(math.nan), "temperature must be a finite number in °C, got nan"),
        (lambda: vx.water("15"), "temperature must be a number or .value, standard uncertainty., got '15'"),
        (
            lambda: vx.water((15.0, -0.1)),
            "standard uncertainty of temperature must be finite and not negative, got -0.1",
        ),
        (lambda: vx.water(120.0), "At 120 °C and 101.3 kPa water is steam .it boils below 198.7 kPa"),
        (lambda: vx.water(15.0, pressure=100.0), "At 15 °C and 100.0 Pa water is steam .it boils below 1.706 kPa"),
        (lambda: vx.water(15.0, pressure=-5.0), "ambient_pressure must be positive, got -5 Pa; give the absolute"),
        (lambda: vx.water(15.0, pressure=2e9), "holds from 100.0 Pa to 1000 MPa, got 2000 MPa; give the absolute"),
        (lambda: vx.sea_water(45.0), "equation of sea water holds from 0 to 40 °C, got 45 °C"),
        (
            lambda: vx.sea_water(15.0, salinity=350.0),
            "sea water hold to 42 g/kg, got salinity 350 g/kg; give g of salt",
        ),
        (lambda: vx.sea_water(15.0, salinity=-1.0), "salinity must not be negative, got -1 g/kg"),
        (lambda: vx.sea_water(15.0, pressure=1000.0), "At 15 °C and 1.000 kPa sea water boils"),
        (lambda: vx.air(700.0), "equation of air holds from -70 to 600 °C, got 700 °C"),
        (lambda: vx.air(95.0, humidity=0.5), "equation of moist air holds from -40 to 90 °C, got 95 °C"),
        (lambda: vx.air(15.0, humidity=45.0), "humidity must lie between 0 and 1, got 45"),
        (lambda: vx.helium(-271.15), "helium at 2 K is below the lambda point 2.1768 K: it is a superfluid"),
        (lambda: vx.helium(900.0), "equation of helium holds from -273.15 to 726.85 °C, got 900 °C"),
        (
            lambda: vx.helium(-270.0, pressure=5e7),
            "There are no properties of helium at 3.15 K and 50.00 MPa: .* Give a",
        ),
        (lambda: vx.air(-60.0, pressure=9e6), None),
    ],
)
def test_a_state_outside_the_equation_is_refused(call, sentence):
    if sentence is None:
        assert call().density.value > 100.0
        return
    with pytest.raises(ValueError, match=sentence) as refused:
        call()
    assert "\n" not in str(refused.value)


def test_just_above_the_lambda_point_is_helium_one():
    assert vx.helium(LAMBDA_POINT + 1e-3 - 273.15).density.value > 140.0


def test_a_fluid_of_one_s_own():
    mine = Fluid("glycerine 40 %", 293.15, 101325.0, (1099.0, 1.0), 3.4e-6, vapour_pressure=2000.0)
    assert mine.density == Estimate(1099.0, 1.0, "density")
    assert mine.source == "stated by the user"
    assert replace(mine, density=1100.0).density.value == 1100.0
    with pytest.raises(ValueError, match="density must be positive, got -1 kg/m³"):
        replace(mine, density=-1.0)
    with pytest.raises(ValueError, match="A fluid needs a name"):
        replace(mine, name="")
    with pytest.raises(ValueError, match="heat_capacity_ratio must lie between 1 and 2, got 14"):
        replace(mine, heat_capacity_ratio=14.0)


@pytest.mark.parametrize(
    ("written", "name"),
    [("Water", "water"), ("fresh water", "water"), ("sea-water", "sea water"), ("SEAWATER", "sea water"),
     ("salt_water", "sea water"), ("Air", "air"), ("He", "helium"), ("liquid helium", "helium")],
)  # fmt: skip
def test_fluids_by_the_name_that_people_write(written, name):
    assert fluid_named(written).name == name


def test_options_of_a_named_fluid():
    assert fluid_named("seawater", 10.0, salinity=(30.0, 1.0)) == vx.sea_water(10.0, salinity=(30.0, 1.0))
    assert fluid_named("air", 10.0, pressure=9e4, humidity=0.4) == vx.air(10.0, pressure=9e4, humidity=0.4)


@pytest.mark.parametrize(
    ("arguments", "options", "sentence"),
    [
        (
            ("watr",),
            {},
            "No fluid named 'watr'. Did you mean 'water'? Known fluids: water, sea water, air, helium; for",
        ),
        (("mercury",), {}, "No fluid named 'mercury'. Known fluids: water"),
        (("water", 15.0), {"salinity": 35.0}, "water takes no salinity; name the fluid 'sea water' or leave it out"),
        (("helium",), {"humidity": 0.5}, "helium takes no humidity; name the fluid 'air' or leave it out"),
        (("air",), {"colour": 0.5}, "air takes no colour; leave it out"),
    ],
)
def test_a_fluid_that_nobody_knows_is_refused(arguments, options, sentence):
    with pytest.raises(ValueError, match=re.escape(sentence)):
        fluid_named(*arguments, **options)


# The site -----------------------------------------------------------------------------------------------------------


def test_a_site_keeps_what_was_given_as_estimates():
    site = Site(ambient_pressure=(101325.0, 50.0), speed=8, depth=1.2, gas_saturation=0.8, orientation="submerged")
    assert site.ambient_pressure == Estimate(101325.0, 50.0, "ambient_pressure")
    assert site.speed == Estimate(8.0, 0.0, "speed")
    assert site.tensile_strength == Estimate(0.0, 0.0, "tensile_strength")
    assert site.gravity == STANDARD_GRAVITY
    assert site == replace(site)
    assert hash(site) == hash(replace(site))
    assert Site(speed=Estimate(8.0, 0.1, "free_stream")).speed.quantity == "speed"
    assert pickle.loads(pickle.dumps(site)) == site


def test_the_pressure_at_the_axis_carries_its_budget(water):
    # 0.2 m of elevation is 2.0 kPa (derived: 999.1 · 9.80665 · 0.2 = 1960 Pa)
    deep = Site(surface_pressure=101325.0, depth=1.2).axis_pressure(water)
    deeper = Site(surface_pressure=101325.0, depth=1.4).axis_pressure(water)
    assert deeper.value - deep.value == pytest.approx(1959.5, abs=0.5)
    doubtful = Site(surface_pressure=(101325.0, 50.0), depth=(1.2, 0.01)).axis_pressure(vx.water((15.0, 1.0)))
    names = [part.name for part in doubtful.budget]
    assert names == ["surface pressure", "density: temperature", "density: equation", "depth"]
    assert doubtful.budget[0].uncertainty == pytest.approx(50.0)
    assert doubtful.budget[3].uncertainty == pytest.approx(999.1 * 9.80665 * 0.01, rel=1e-4)
    assert doubtful.uncertainty == pytest.approx(math.sqrt(sum(part.uncertainty**2 for part in doubtful.budget)))
    assert doubtful.quantity == "ambient_pressure"


def test_gravity_is_used(water):
    low = Site(surface_pressure=101325.0, depth=1.0, gravity=9.78).axis_pressure(water)
    assert low.value == pytest.approx(101325.0 + 999.103 * 9.78, abs=0.1)


def test_what_is_not_known_stays_unknown(water):
    assert Site().axis_pressure(water) is None
    assert Site(depth=1.0).axis_pressure(water) is None
    assert Site(surface_pressure=101325.0).axis_pressure(water) is None
    stated = Site(ambient_pressure=(101325.0, 50.0))
    assert stated.axis_pressure(water) is stated.ambient_pressure


def test_in_a_gas_the_barometer_is_the_pressure_at_the_axis():
    found = Site(surface_pressure=(99000.0, 30.0)).axis_pressure(vx.air(15.0))
    assert found == Estimate(99000.0, 30.0, "ambient_pressure")


def test_two_pressures_that_agree_are_taken_and_two_that_do_not_are_asked_about(water):
    right = Site(ambient_pressure=111100.0, surface_pressure=101325.0, depth=1.0)
    assert right.axis_pressure(water).value == 111100.0
    wrong = Site(ambient_pressure=101325.0, surface_pressure=101325.0, depth=1.0)
    with pytest.raises(
        ValueError, match=r"ambient_pressure 101\.325 kPa contradicts .* = 111\.12\d* .*leave one of them"
    ):
        wrong.axis_pressure(water)


@pytest.mark.parametrize("name", ["ambient_pressure", "surface_pressure"])
def test_a_gauge_pressure_is_asked_about_and_not_used(name):
    with pytest.raises(ValueError, match=rf"{name} is 12 kPa: is that a gauge reading\? Give the absolute pressure"):
        Site(**{name: 12e3})
    assert getattr(Site(**{name: 12e3}, confirm_absolute=True), name).value == 12e3
    assert getattr(Site(**{name: 12e3}, orientation="air"), name).value == 12e3
    assert getattr(Site(**{name: 50e3}), name).value == 50e3


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        ({"ambient_pressure": -5.0}, "ambient_pressure must be positive, got -5 Pa"),
        ({"depth": -1.0}, "depth must not be negative, got -1 m; give the depth in m, positive downwards"),
        (
            {"speed": 0.0},
            "speed must be positive, got 0 m/s; give the speed in m/s, or leave it out when there is none",
        ),
        ({"speed_name": ""}, "speed_name is empty; say what the speed is"),
        ({"orientation": "up"}, "orientation must be one of surface, submerged, air, got 'up'"),
        ({"inception": "sudden"}, "inception must be one of incipient, desinent, got 'sudden'"),
        ({"gravity": 0.0}, "gravity must be positive, got 0 m/s²"),
        ({"reference_radius": -0.1}, r"reference_radius must be positive, got -0\.1 m; give the radius of the wall"),
        ({"tensile_strength": -1e5}, r"tensile_strength must not be negative, got -100000 Pa"),
        ({"translation_speed": -3.0}, "translation_speed must not be negative, got -3 m/s"),
        ({"gas_saturation": -0.1}, "gas_saturation must not be negative"),
        ({"elevation": math.inf}, "elevation must be a finite number in m"),
        ({"submergence": -1.0}, "submergence must not be negative, got -1 m"),
    ],
)
def test_a_site_that_cannot_be_is_refused(arguments, sentence):
    with pytest.raises(ValueError, match=sentence):
        Site(**arguments)


def test_the_property_library_is_loaded_on_first_use_only():
    code = (
        "import sys, vortexwidgets.fluids; heavy = {'CoolProp', 'scipy', 'pint', 'sympy'} & set(sys.modules);"
        "sys.exit(str(heavy) if heavy else 0)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
