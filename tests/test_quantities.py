import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from vortexwidgets.quantities import QUANTITIES, check, quantity_named

CONTRACT = (
    "radius", "position", "core_radius", "peak_radius", "swirl", "peak_swirl", "velocity", "circulation",
    "swirl_scale", "rotation_rate", "vorticity", "enclosed_circulation", "pressure", "pressure_drop",
    "core_pressure", "core_pressure_drop", "ambient_pressure", "surface_pressure", "density", "kinematic_viscosity",
    "vapour_pressure", "surface_tension", "temperature", "salinity", "depth", "dip_depth", "gravity", "speed",
    "free_stream", "exponent", "miss_distance", "background_velocity", "velocity_gradient", "wander", "probe_width",
    "velocity_gain", "position_scale", "cavitation_number", "pressure_rate", "reference_radius",
    "translation_speed", "tensile_strength", "time", "length_scale", "elevation", "pressure_constant", "centre_x",
    "centre_y", "probability",
)  # fmt: skip


@pytest.mark.parametrize("key", CONTRACT)
def test_every_quantity_of_the_house_is_there(key):
    assert quantity_named(key).key == key


@pytest.mark.parametrize("quantity", QUANTITIES.values(), ids=str)
def test_an_entry_is_complete_and_its_typical_range_is_valid(quantity):
    assert quantity.symbol
    assert quantity.text_symbol
    assert quantity.description[0].isupper() or quantity.key == "cavitation_number"  # described by its formula
    assert not quantity.description.endswith(".")
    low, high = quantity.typical
    assert low < high
    assert check(quantity.key, high) == high
    if low != 0.0 or quantity.zero_allowed:
        assert check(quantity.key, low) == low


def test_entries_cannot_be_changed():
    with pytest.raises(TypeError):
        QUANTITIES["speed"] = QUANTITIES["density"]
    with pytest.raises(AttributeError):
        QUANTITIES["speed"].unit = "kn"
    assert hash(QUANTITIES["speed"]) == hash(QUANTITIES["speed"])


@given(st.sampled_from(sorted(QUANTITIES)), st.floats(allow_nan=True, allow_infinity=True))
def test_check_returns_the_number_or_a_sentence_with_its_name(key, value):
    low, high = QUANTITIES[key].valid
    if math.isfinite(value) and low < value < high:
        assert check(key, value) == value
    elif value not in (low, high):
        with pytest.raises(ValueError, match=rf"^{key} must .*\.$"):
            check(key, value)


@pytest.mark.parametrize("value", [3, np.float32(3.0), np.int64(3), np.array(3.0)])
def test_check_takes_any_number_and_returns_a_float(value):
    assert type(check("speed", value)) is float


@pytest.mark.parametrize(
    ("key", "value", "sentence"),
    [
        ("core_radius", -0.1, r"core_radius must be positive, got -0\.1 m; give the model's own core radius in m\."),
        ("core_radius", 0.0, "core_radius must be positive, got 0 m"),
        ("core_radius", math.nan, "core_radius must be a finite number in m, got nan"),
        ("circulation", math.inf, "circulation must be a finite number in m²/s, got inf"),
        ("core_radius", "0.1", "core_radius must be a number in m, got '0.1'"),
        ("core_radius", True, "core_radius must be a number in m, got True"),
        ("core_radius", None, "core_radius must be a number in m, got None"),
        ("core_radius", 1j, "core_radius must be a number in m"),
        ("core_radius", np.array([1.0, 2.0]), "core_radius must be one number in m"),
        ("wander", -1e-3, r"wander must not be negative, got -0\.001 m; give a standard deviation in m\."),
        ("humidity", 45.0, "humidity must lie between 0 and 1, got 45; give a fraction between 0 and 1"),
        ("exponent", -2.0, "exponent must be positive, got -2; give a positive number"),
        ("core_radios", 1.0, "No quantity named 'core_radios'; did you mean 'core_radius'?"),
        ("zzz", 1.0, "No quantity named 'zzz'; known are radius"),
    ],
)
def test_a_refusal_says_what_with_unit_and_what_to_do(key, value, sentence):
    with pytest.raises(ValueError, match=sentence):
        check(key, value)


def test_zero_is_valid_only_where_it_means_something():
    assert check("wander", 0.0) == 0.0
    assert check("probability", 1.0) == 1.0
    with pytest.raises(ValueError, match="density must be positive, got 0 kg/m³"):
        check("density", 0.0)
