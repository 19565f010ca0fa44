"""The derivation reads from profile to momentum balance, in a notebook and in a terminal."""

import pytest
from latex2mathml.converter import convert

import vortexwidgets as vx
from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.derivation import derivation

TITLES = [
    "Profile",
    "Boundary and matching conditions",
    "Vorticity",
    "Enclosed circulation",
    "Radial equilibrium",
    "Pressure drop",
    "Drop on the axis",
    "Peak of the swirl",
    "Momentum balance",
    "Agreement",
]


@pytest.mark.parametrize("key", MODELS)
def test_the_steps_in_their_order(key):
    titles = [step.title for step in vx.derivation(key).steps]
    if key == "forced":
        assert titles == [*TITLES[:5], "Pressure from the axis", *TITLES[7:]]
    else:
        assert titles == TITLES


@pytest.mark.parametrize("key", MODELS)
def test_every_equation_is_typeset_by_a_plain_converter(key):
    for step in derivation(key).steps:
        assert convert(step.latex).startswith("<math")
        assert "matrix" not in step.latex
        assert "middle" not in step.latex
        assert step.equation == step.latex
        assert step.sentence.endswith(".")


def test_lamb_oseen_line_by_line():
    """Formulas by hand from Lamb's profile: ω = 2 exp(-x²), Γ(r) = Γ (1 - exp(-x²)), P(0) = ln 2."""
    steps = {step.title: step for step in derivation("lamb-oseen").steps}
    assert steps["Profile"].latex.endswith(r"F(x) = \frac{1 - e^{- x^{2}}}{x}")
    assert steps["Vorticity"].text.endswith("= 2·exp(-x²)")
    assert steps["Enclosed circulation"].text.endswith("= 1 - exp(-x²)")
    assert "P(0) = ln(2) ≈ 0.6931471806" in steps["Drop on the axis"].text
    assert "1.1209" in steps["Peak of the swirl"].text
    assert "R(x) = 0" in steps["Momentum balance"].latex
    assert r"r_c^2 = r_0^2 + 4 \nu t" in steps["Momentum balance"].latex
    assert "stated" in steps["Pressure drop"].sentence


def test_rankine_tells_of_its_edge():
    steps = {step.title: step for step in derivation("rankine").steps}
    assert r"F(1^-) = 1, \quad F(1^+) = 1" in steps["Boundary and matching conditions"].latex
    assert "drops from 2 to 0" in steps["Boundary and matching conditions"].sentence
    assert "smooth the edge" in steps["Momentum balance"].sentence
    assert r"\begin{cases}" in steps["Profile"].latex


def test_empirical_profiles_say_what_is_left_over():
    step = next(step for step in derivation("kaufmann").steps if step.title == "Momentum balance")
    assert step.text.endswith("R(x) = -8·x/(x² + 1)³")
    assert "empirical" in step.sentence


def test_burgers_tells_of_the_strain():
    steps = {step.title: step for step in derivation("burgers").steps}
    assert "-ρa²(r²/8 + z²/2)" in steps["Radial equilibrium"].sentence
    assert "u_r = -a r/2" in steps["Momentum balance"].text


def test_numbers_of_a_family_name_the_exponent_they_hold_for():
    steps = {step.title: step for step in derivation("vatistas").steps}
    assert "numbers for n = 2" in steps["Drop on the axis"].sentence
    assert "1.570796327" in steps["Peak of the swirl"].text  # π/2


def test_terminal_and_notebook():
    found = derivation("Taylor")
    text, page = str(found), found._repr_markdown_()
    assert text.startswith("Taylor vortex. G. I. Taylor")
    assert "\n1. Profile\n" in text
    assert "$" not in text
    assert "\\" not in text
    assert page.count("$$") == 2 * len(found.steps)
    assert "**10. Agreement.**" in page


def test_unknown_models_are_refused():
    with pytest.raises(ValueError, match="No model named 'x'"):
        derivation("x")
