import math
import re
import subprocess
import sys

import pytest
from hypothesis import given
from hypothesis import strategies as st

from vortexwidgets.quantities import QUANTITIES
from vortexwidgets.uncertainty import Estimate
from vortexwidgets.units import factor, parse_number, read_quantity, show


@pytest.mark.parametrize(
    ("text", "number"),
    [
        ("1.5", 1.5),
        ("1,5", 1.5),
        (" -1,5e-3 ", -1.5e-3),
        ("+2", 2.0),
        (".5", 0.5),
        ("5.", 5.0),
        ("1e-6", 1e-6),
        ("1E6", 1e6),
        ("2.5 × 10⁻³", 2.5e-3),
        ("2.5x10^-3", 2.5e-3),
        ("2,5·10³", 2.5e3),
        ("−4", -4.0),
    ],
)
def test_numbers_as_people_write_them(text, number):
    assert parse_number(text) == number


@pytest.mark.parametrize(
    "text",
    ["", "abc", "1,5,0", "1.5.0", "1,013.25", "101 325", "nan", "inf", "1_000", "0x10", "=1+2", "1+2", "1/2", "2*3",
     "__import__('os')", "１５", "1e", "--1", "١٢", "1j", "\x00"],
)  # fmt: skip
def test_what_is_no_number_is_refused(text):
    with pytest.raises(ValueError, match=r"is not a number; write for example 1\.5|belong to no number"):
        parse_number(text)


def test_a_number_too_large_and_one_that_is_no_text():
    with pytest.raises(ValueError, match="'1e999' is too large for a number"):
        parse_number("1e999")
    with pytest.raises(ValueError, match=r"A quantity is read from text, got 1\.5"):
        parse_number(1.5)


# Sizes of units: NIST Special Publication 811 (2008), appendix B.8, exact by definition or to the digits printed there
# (from memory); knots, °F and inches are exact.
@pytest.mark.parametrize(
    ("text", "quantity", "si", "digits"),
    [
        ("15.2 mm", "core_radius", 0.0152, 1e-15),
        ("1,5 cm", "core_radius", 0.015, 1e-15),
        ("1 in", "core_radius", 0.0254, 1e-15),
        ("1 ft", "depth", 0.3048, 1e-15),
        ("5 μm", "core_radius", 5e-6, 1e-15),
        ("59 degF", "temperature", 288.15, 1e-12),
        ("59 °F", "temperature", 288.15, 1e-12),
        ("15 C", "temperature", 288.15, 1e-15),
        ("15 °C", "temperature", 288.15, 1e-15),
        ("4.2 K", "temperature", 4.2, 1e-15),
        ("101.325 kPa", "ambient_pressure", 101325.0, 1e-12),
        ("1013,25 hPa", "ambient_pressure", 101325.0, 1e-12),
        ("1013.25 mb", "ambient_pressure", 101325.0, 1e-12),
        ("1 atm", "ambient_pressure", 101325.0, 1e-12),
        ("14.7 psia", "ambient_pressure", 14.7 * 6894.757, 1e-6),
        ("29.92 inHg", "ambient_pressure", 29.92 * 3386.389, 1e-6),
        ("29.92 in Hg", "ambient_pressure", 29.92 * 3386.389, 1e-6),
        ("760 mmHg", "ambient_pressure", 101325.0, 1e-6),
        ("10 mH2O", "pressure", 98066.5, 1e-9),
        ("12 kn", "speed", 12 * 1852 / 3600, 1e-12),
        ("12 knots", "speed", 12 * 1852 / 3600, 1e-12),
        ("5 mph", "speed", 5 * 0.44704, 1e-12),
        ("36 km/h", "speed", 10.0, 1e-12),
        ("5 m s-1", "speed", 5.0, 1e-15),
        ("5 m·s⁻¹", "speed", 5.0, 1e-15),
        ("10 ft^2/s", "circulation", 10 * 0.3048**2, 1e-12),
        ("1 m2/s", "circulation", 1.0, 1e-15),
        ("1.1 cSt", "kinematic_viscosity", 1.1e-6, 1e-12),
        ("1.1 × 10⁻⁶ m²/s", "kinematic_viscosity", 1.1e-6, 1e-15),
        ("30 rpm", "rotation_rate", math.pi, 1e-12),
        ("1000 kg/m³", "density", 1000.0, 1e-15),
        ("1 lb/ft³", "density", 16.01846, 1e-6),
        ("73 dyn/cm", "surface_tension", 0.073, 1e-12),
        ("35 g/kg", "salinity", 35.0, 1e-15),
        ("35 psu", "salinity", 35.16504, 1e-15),
        ("3.5 %", "salinity", 35.0, 1e-15),
        ("50 %", "humidity", 0.5, 1e-15),
        ("0.5", "humidity", 0.5, 1e-15),
        ("1 psi/s", "pressure_rate", 6894.757, 1e-6),
    ],
)
def test_units_as_people_write_them(text, quantity, si, digits):
    assert read_quantity(text, quantity) == pytest.approx(si, rel=digits)


@pytest.mark.parametrize(
    ("text", "quantity", "value", "uncertainty"),
    [
        ("101.3 ± 0.2 kPa", "ambient_pressure", 101300.0, 200.0),
        ("101.3 kPa ± 200 Pa", "ambient_pressure", 101300.0, 200.0),
        ("101,3 +/- 0,2 kPa", "ambient_pressure", 101300.0, 200.0),
        ("(15.0 ± 0.2) °C", "temperature", 288.15, 0.2),
        ("59 ± 0.9 degF", "temperature", 288.15, 0.5),
        ("12 m/s ± 1 %", "speed", 12.0, 0.12),
        ("50 % ± 5 %", "humidity", 0.5, 0.05),
        ("0.5 ± 10 %", "humidity", 0.5, 0.05),
        ("12 mm ± 0", "core_radius", 0.012, 0.0),
    ],
)
def test_a_value_with_its_uncertainty(text, quantity, value, uncertainty):
    found = read_quantity(text, quantity)
    assert isinstance(found, Estimate)
    assert found.quantity == quantity
    assert found.value == pytest.approx(value, rel=1e-12)
    assert found.uncertainty == pytest.approx(uncertainty, rel=1e-9)


def test_a_bare_number_takes_the_default_unit_and_only_that():
    assert read_quantity("15", "core_radius", default_unit="mm") == 0.015
    assert read_quantity("1e-6", "kinematic_viscosity", default_unit="m²/s") == 1e-6
    assert read_quantity("1 in", "core_radius", default_unit="mm") == 0.0254
    assert read_quantity("35", "salinity") == 35.0


@pytest.mark.parametrize(
    ("text", "quantity", "sentence"),
    [
        ("", "core_radius", "core_radius is empty; write for example '32 mm'"),
        ("15", "core_radius", "'15' has no unit; write core radius as a length, for example '32 mm'"),
        ("15", "temperature", "'15' has no unit; write temperature as a temperature, for example"),
        ("abc", "core_radius", "'abc' is not a number with a unit"),
        ("12 ± 1 % m/s", "speed", "'% m/s' is not a unit of speed"),
        ("15 kg", "core_radius", "'kg' is not a unit of core radius, which is a length; write for example '32 mm'"),
        ("15 mm/s^2", "core_radius", "'mm/s^2' is not a unit of core radius"),
        ("15 furlongz", "core_radius", "'furlongz' is not a known unit of core radius"),
        ("15 m/", "core_radius", "'m/' is not a unit of core radius"),
        ("15 lambda", "core_radius", "is not a unit of core radius"),
        ("15 m**99999999", "core_radius", "is not a unit of core radius"),
        ("__import__('os').system('ls')", "core_radius", "is not a number with a unit"),
        ("=1+2", "core_radius", "is not a number with a unit"),
        ("2*3 mm", "core_radius", "'*3 mm' is not a unit"),
        ("5 m; import os", "core_radius", "is not a unit"),
        ("5 __class__", "core_radius", "is not a unit"),
        ("<b>5</b> m", "core_radius", "is not a number with a unit"),
        ("1,5,0 mm", "core_radius", "without thousands separators"),
        ("1,013.25 hPa", "ambient_pressure", "without thousands separators"),
        ("101 325 Pa", "ambient_pressure", "without thousands separators"),
        ("nan mm", "core_radius", "is not a number with a unit"),
        ("1e999 mm", "core_radius", "is too large for a number"),
        ("-1 mm", "core_radius", "core_radius must be positive, got -0.001 m"),
        ("-1 ± 1 mm", "core_radius", "core_radius must be positive, got -0.001 m"),
        ("1 ± -2 mm", "core_radius", "is negative; write it without a sign"),
        ("1 ± 2 ± 3 mm", "core_radius", "has more than one ±"),
        ("1 ± mm", "core_radius", "is not a number with a unit"),
        ("20 psig", "ambient_pressure", "'psig' is a gauge pressure and ambient pressure is absolute"),
        ("3 bar(g)", "ambient_pressure", "is a gauge pressure"),
        ("3 Hz", "rotation_rate", "leaves open whether turns or radians are counted; write rpm or rad/s"),
        ("15 mm", "exponent", "'mm' is not a unit of exponent, which is a plain number or %"),
        ("500 %", "humidity", "humidity must lie between 0 and 1, got 5"),
        ("x" * 200, "core_radius", "has 200 characters; a number with its unit has at most 80"),
        ("15 𝟙", "core_radius", "holds signs that belong to no number or unit"),
        ("-300 °C", "temperature", "temperature must be positive, got -26.85 K"),
        ("15 mm", "core_radios", "did you mean 'core_radius'"),
    ],
)
def test_what_cannot_be_read_is_answered_in_a_sentence(text, quantity, sentence):
    with pytest.raises(ValueError, match=re.escape(sentence)) as refused:
        read_quantity(text, quantity)
    assert "\n" not in str(refused.value)


def test_a_missing_unit_of_a_column_is_a_sentence():
    with pytest.raises(ValueError, match="velocity has no unit; it is a speed"):
        factor("", "velocity")


def number_or_sentence(*arguments, **options):
    try:
        return read_quantity(*arguments, **options)
    except ValueError as error:
        return str(error)


@given(st.text(max_size=30))
def test_any_text_ends_in_a_number_or_a_sentence(text):
    for quantity in ("core_radius", "humidity", "temperature", "salinity"):
        answer = number_or_sentence(text, quantity, default_unit="")
        assert isinstance(answer, float | Estimate) or "\n" not in answer


@given(st.text(alphabet="0123456789.,eE+-*/^ mskgPaHzKC°%±()²³⁻¹", max_size=20))
def test_any_text_of_the_right_letters_too(text):
    for quantity in ("pressure", "kinematic_viscosity", "temperature"):
        answer = number_or_sentence(text, quantity)
        assert isinstance(answer, float | Estimate) or "\n" not in answer


@pytest.mark.parametrize("system", ["SI", "US"])
@pytest.mark.parametrize("key", sorted(QUANTITIES))
def test_what_is_shown_is_read_back(key, system):
    low, high = QUANTITIES[key].typical
    value = low + 0.637 * (high - low)
    assert read_quantity(show(value, key, system), key) == pytest.approx(value, rel=1e-10)
    found = read_quantity(show((value, 0.01 * abs(value)), key, system), key)
    assert found.uncertainty == pytest.approx(0.01 * abs(value), rel=1e-10)
    assert show(Estimate(value, 0.01 * abs(value), key), key, system) == show((value, 0.01 * abs(value)), key, system)


def test_show_refuses_a_third_system():
    with pytest.raises(ValueError, match="The system of units must be 'SI' or 'US', got 'CGS'"):
        show(1.0, "speed", "CGS")


def test_the_unit_library_is_loaded_on_first_use_only():
    code = (
        "import sys; from vortexwidgets.units import read_quantity; before = 'pint' in sys.modules;"
        "read_quantity('50 %', 'humidity'); read_quantity('15 degC', 'temperature'); still = 'pint' in sys.modules;"
        "read_quantity('1 ft', 'depth'); sys.exit(before or still or 'pint' not in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
