import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from vortexwidgets.formatting import format_estimate, format_number, scale_for, table
from vortexwidgets.uncertainty import Estimate


# Particle Data Group, Review of Particle Physics, Introduction, "Rounding": three printed examples (from memory).
@pytest.mark.parametrize(
    ("value", "uncertainty", "printed"),
    [
        (0.827, 0.119, "0.83 ± 0.12"),
        (0.827, 0.367, "0.8 ± 0.4"),
        (14.674, 0.964, "14.7 ± 1.0"),
    ],
)
def test_rounding_of_the_particle_data_group(value, uncertainty, printed):
    assert format_estimate(Estimate(value, uncertainty)) == printed


# The rule itself: 100-354 two digits, 355-949 one, 950-999 up to 1000 and two.
@pytest.mark.parametrize(
    ("uncertainty", "printed"),
    [
        (0.00100, "1.0000 ± 0.0010"),
        (0.00354, "1.0000 ± 0.0035"),
        (0.00355, "1.000 ± 0.004"),
        (0.00949, "1.000 ± 0.009"),
        (0.00950, "1.000 ± 0.010"),
        (0.009996, "1.000 ± 0.010"),
    ],
)
def test_rounding_at_the_edges_of_the_rule(uncertainty, printed):
    assert format_estimate(Estimate(1.0, uncertainty)) == printed


@pytest.mark.parametrize(
    ("estimate", "printed"),
    [
        (Estimate(0.83, 0.012, "circulation"), "0.830 ± 0.012 m²/s"),
        (Estimate(12340.0, 250.0, "core_pressure_drop"), "12.34 ± 0.25 kPa"),
        (Estimate(812.0, 12.0, "core_pressure_drop"), "812 ± 12 Pa"),
        (Estimate(0.0123, 0.0004, "core_radius"), "12.3 ± 0.4 mm"),
        (Estimate(1.23, 0.04, "core_radius"), "1.23 ± 0.04 m"),
        (Estimate(0.0, 5e-4, "centre_x"), "0.0 ± 0.5 mm"),
        (Estimate(288.15, 0.2, "temperature"), "15.00 ± 0.20 °C"),
        (Estimate(0.0735, 2e-4, "surface_tension"), "73.50 ± 0.20 mN/m"),
        (Estimate(1.139e-6, 1e-8, "kinematic_viscosity"), "(1.139 ± 0.010) × 10⁻⁶ m²/s"),
        (Estimate(123456.0, 7800.0), "123000 ± 8000"),
        (Estimate(1.5, 0.0), "1.5"),
        (Estimate(101325.0, 0.0, "ambient_pressure"), "101.325 kPa"),
        (Estimate(-0.001, 0.5), "0.0 ± 0.5"),
        (Estimate(0.0123, math.nan, "core_radius", bound="lower"), "at least 12.3 mm"),
        (Estimate(0.0123, math.nan, "core_radius", bound="upper"), "at most 12.3 mm"),
        (Estimate(math.nan, math.nan, "core_radius"), "undetermined"),
        (Estimate(0.0123, math.nan, "core_radius"), "12.30 mm (uncertainty unknown)"),
    ],
)
def test_estimates_for_people(estimate, printed):
    assert str(estimate) == printed


def test_a_level_adds_the_interval_and_a_unit_is_obeyed():
    drop = Estimate(1234.0, 56.0, "core_pressure_drop")
    # 1.96 standard uncertainties on either side
    assert format_estimate(drop, level=0.95) == "1.23 ± 0.06 kPa (95 %: 1.12 to 1.34 kPa)"
    assert format_estimate(drop, "Pa") == "1230 ± 60 Pa"
    assert f"{Estimate(6894.757, 0.0, 'pressure'):psi}" == "1 psi"
    assert f"{Estimate(288.15, 0.5, 'temperature'):degF}" == "59.0 ± 0.9 °F"
    assert format_estimate(Estimate(1.5, 0.0), level=0.9) == "1.5 (exact)"
    assert format_estimate(Estimate(1e-9, 1e-10), level=0.5).startswith("(1.00 ± 0.10) × 10⁻⁹ (50 %: 9.33 × 10⁻¹⁰ to")


@pytest.mark.parametrize("unit", ["kg", "", "furlong"])
def test_a_unit_that_does_not_fit_is_refused(unit):
    with pytest.raises(ValueError, match=r"A value in Pa cannot be shown in '.*'; known are MPa, kPa"):
        scale_for("Pa", 1.0, unit)


def test_a_plain_number_has_no_unit_to_be_shown_in():
    with pytest.raises(ValueError, match=r"A value in plain numbers cannot be shown in 'mm'; known are none\."):
        format_estimate(Estimate(1.0), "mm")


@pytest.mark.parametrize(
    ("value", "unit", "printed"),
    [
        (0.0125, "m", "12.50 mm"),
        (0.99999999, "m", "1000 mm"),
        (1.0, "m", "1.000 m"),
        (2.5e-5, "m", "25.00 µm"),
        (101325.0, "Pa", "101.3 kPa"),
        (101325.0, "ambient_pressure", "101.3 kPa"),
        (-101325.0, "Pa", "-101.3 kPa"),
        (1.139e-6, "m²/s", "1.139 × 10⁻⁶ m²/s"),
        (1234567.0, "", "1.235 × 10⁶"),
        (999.96, "", "1000"),
        (99999.6, "", "100000"),
        (0.0, "Pa", "0 Pa"),
        (math.nan, "Pa", "undetermined"),
        (math.inf, "m", "∞ m"),
        (-math.inf, "", "-∞"),
        (math.pi, "", "3.142"),
    ],
)
def test_numbers_for_people(value, unit, printed):
    assert format_number(value, unit) == printed


@given(
    st.floats(min_value=-1e12, max_value=1e12),
    st.floats(min_value=1e-12, max_value=1e12),
)
def test_what_is_printed_is_what_was_given_within_the_printed_digits(value, uncertainty):
    text = format_estimate(Estimate(value, uncertainty))
    found = re.fullmatch(r"\(?(-?[\d.]+) ± ([\d.]+)\)?(?: × 10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+))?", text)
    assert found, text
    power = int((found.group(3) or "0").translate(str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")))
    shown, spread = float(found.group(1)) * 10.0**power, float(found.group(2)) * 10.0**power
    assert abs(spread - uncertainty) <= 0.15 * uncertainty
    assert abs(shown - value) <= 0.51 * uncertainty + 1e-15 * abs(value)


def test_a_table_is_aligned_and_short_rows_are_filled():
    text = table([["lamb-oseen", 1.7, "Γ"], ["ranke\nline", 10]], ["model", "K", "symbol"])
    assert text.splitlines() == [
        "model         K  symbol",
        "----------  ---  ------",
        "lamb-oseen  1.7  Γ",
        "ranke line   10",
    ]
    assert table([["a", "b"]]) == "a  b"
    assert table([]) == ""
    assert table([], ["a", "b"]) == "a  b\n-  -"
