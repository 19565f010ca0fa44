"""Every entry keeps the contract; names are found however they are spelt."""

import subprocess
import sys

import pytest
import sympy as sp
from check_model import PARTS, check_model

from vortexwidgets.models.catalogue import MODELS, model_named
from vortexwidgets.models.model import VortexModel, X


@pytest.mark.parametrize("part", PARTS, ids=lambda part: part.__name__)
@pytest.mark.parametrize("key", MODELS)
def test_every_entry_keeps_the_contract(key, part):
    part(MODELS[key])


def test_the_contract_runs_on_a_model_of_ones_own():
    """By hand: P = exp(-x²)/2, so P(0) = 1/2; F' = 0 at x = 1, where F² = 1/e; K = e/2."""
    mine = VortexModel(
        key="mine",
        name="Mine",
        swirl=X * sp.exp(-(X**2) / 2),
        source="Bench note, 2024.",
        strength="swirl_scale",
        published_peak=(sp.S.One, sp.exp(-sp.Rational(1, 2))),
        published_pressure_constant=sp.E / 2,
        published_source="By hand.",
    )
    check_model(mine)


def test_the_contract_names_the_identity_that_broke():
    wrong = VortexModel(
        key="wrong",
        name="Wrong",
        swirl=(1 - sp.exp(-(X**2))) / X,
        source="Bench note, 2024.",
        stated={"pressure_drop": sp.exp(-(X**2)) / 2},
        published_peak=MODELS["lamb-oseen"].published_peak,
        published_pressure_constant=MODELS["lamb-oseen"].published_pressure_constant,
        published_source="By hand.",
        published_digits=4,
    )
    with pytest.raises(AssertionError, match="radial equilibrium"):
        check_model(wrong)


@pytest.mark.parametrize(
    ("name", "key"),
    [
        ("lamb-oseen", "lamb-oseen"),
        ("Lamb-Oseen", "lamb-oseen"),
        ("lamb oseen", "lamb-oseen"),
        ("LAMB_OSEEN", "lamb-oseen"),
        ("Rankine vortex", "rankine"),
        ("Scully", "kaufmann"),
        ("Burnham-Hallock", "kaufmann"),
        ("solid body rotation", "forced"),
    ],
)
def test_names_are_found_however_they_are_spelt(name, key):
    assert model_named(name) is MODELS[key]


def test_a_model_is_its_own_name():
    assert model_named(MODELS["taylor"]) is MODELS["taylor"]


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("Rankin", r"No model named 'Rankin'; did you mean 'rankine'\? Known models: free, forced, rankine"),
        ("wobble", r"No model named 'wobble'\. Known models: free"),
        ("", "No model named ''"),
        (3, "named by text, got 3"),
        (None, "named by text, got None"),
    ],
)
def test_unknown_names_are_refused_with_a_hint(name, message):
    with pytest.raises(ValueError, match=message):
        model_named(name)


def test_a_key_that_is_none_is_answered_with_the_closest():
    with pytest.raises(KeyError, match="No model named 'lamb_oseen'; did you mean 'lamb-oseen'"):
        MODELS["lamb_oseen"]
    assert MODELS.get("lamb_oseen") is None
    assert "lamb_oseen" not in MODELS
    assert "lamb-oseen" in MODELS
    assert "lamb-oseen" in repr(MODELS)


def test_every_number_of_the_catalogue_is_reached_by_its_key():
    assert list(MODELS) == ["free", "forced", "rankine", "kaufmann", "vatistas", "lamb-oseen", "taylor", "burgers"]
    assert all(model.key == key for key, model in MODELS.items())


def test_the_same_profile_is_said_to_be_the_same():
    for model in MODELS.values():
        twins = [other.key for other in MODELS.values() if other is not model and other.swirl == model.swirl]
        if model.same_profile_as:
            assert model.same_profile_as in twins
            assert MODELS[model.same_profile_as].same_profile_as is None
        elif twins:
            assert all(MODELS[key].same_profile_as == model.key for key in twins)


def test_the_vortex_does_not_load_sympy_before_it_is_made():
    code = "import sys, vortexwidgets as vx; vx.Vortex; sys.exit('sympy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_deriving_a_model_does_not_load_scipy_where_it_needs_no_special_function():
    code = (
        "import sys, vortexwidgets as vx; vortex = vx.Vortex('kaufmann', circulation=1.0, core_radius=1.0);"
        "vortex.pressure_drop(1.0, density=1.0); sys.exit('scipy' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
