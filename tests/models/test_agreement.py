"""The check that people see: it agrees where the formulas are right and says where they are not."""

import pytest
import sympy as sp

import vortexwidgets as vx
from vortexwidgets.models.agreement import check_agreement
from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.model import VortexModel, X


@pytest.mark.parametrize("key", MODELS)
def test_formulas_agree_with_quadrature_and_differentiation(key):
    """Eighth-order differences and Gauss rules leave about 1e-12 in double precision."""
    found = vx.check_agreement(key)
    assert found.worst < 5e-11, str(found)
    assert 1e-9 * (1 - 1e-12) <= found.where <= 1e6 * (1 + 1e-12)
    assert found.what in [row.quantity for row in found.rows]


@pytest.mark.parametrize("exponent", [0.5, 1.0, 1.5, 3.0, 10.0, 100.0])
def test_the_family_agrees_at_every_exponent(exponent):
    assert check_agreement("vatistas", exponent=exponent).worst < 5e-11


@pytest.mark.parametrize(
    ("stated", "what"),
    [
        (1.01 / (2 * (1 + X**2)), "pressure drop"),
        (1 / (2 * (1 + X**2)) + sp.Rational(1, 1000), "drop on the axis"),
    ],
)
def test_a_wrong_formula_is_found(stated, what):
    wrong = VortexModel(
        key="wrong", name="Wrong", swirl=MODELS["kaufmann"].swirl, source="", stated={"pressure_drop": stated}
    )
    rows = {row.quantity: row.worst for row in check_agreement(wrong).rows}
    assert rows[what] > 1e-4
    assert rows["vorticity"] < 1e-10


def test_what_is_compared():
    rows = [(row.quantity, row.compared_with) for row in check_agreement("lamb-oseen").rows]
    assert rows == [
        ("vorticity", "differentiation of x·swirl"),
        ("enclosed circulation", "quadrature of the vorticity"),
        ("momentum left over", "differentiation of the vorticity"),
        ("pressure drop", "quadrature of swirl²/x"),
        ("pressure drop", "differentiation, radial equilibrium"),
        ("drop on the axis", "quadrature from axis to infinity"),
        ("peak radius", "search for the largest swirl"),
    ]


def test_it_reads_as_a_table():
    found = check_agreement("vatistas", exponent=3.0)
    text, page = str(found), found._repr_html_()
    assert text.splitlines()[0] == "Vatistas (exponent = 3)"
    assert "worst relative difference" in text
    assert text.splitlines()[-1].startswith("Worst relative difference ")
    assert page.count("<tr>") == 1 + len(found.rows)
    assert "Vatistas (exponent = 3)" in page


def test_text_of_a_model_is_escaped_in_html():
    model = VortexModel(key="x", name="<b>x</b>", swirl=MODELS["kaufmann"].swirl, source="")
    assert "<b>" not in check_agreement(model)._repr_html_()


def test_equal_by_value():
    assert check_agreement("taylor") == check_agreement("Taylor")


def test_unknown_shape_parameters_are_refused():
    with pytest.raises(ValueError, match="Rankine has no shape parameter 'exponent'"):
        check_agreement("rankine", exponent=2.0)
    with pytest.raises(ValueError, match="No model named"):
        check_agreement("nobody")
