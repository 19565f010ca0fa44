"""Formulas as they are written for people."""

import pytest
import sympy as sp
from latex2mathml.converter import convert

from vortexwidgets.models.model import X
from vortexwidgets.models.notation import latex_of, text_of

N = sp.Symbol("n", positive=True)
SERIES = sp.hyper([1, 2 / N], [1 + 1 / N], X)


@pytest.mark.parametrize(
    ("expression", "latex", "text"),
    [
        (sp.log(2), r"\ln{\left(2 \right)}", "ln(2)"),
        (sp.E / 2, r"\frac{e}{2}", "e/2"),
        (sp.oo, r"\infty", "∞"),
        (X ** (2 * N), "x^{2 n}", "x^(2·n)"),
        (sp.beta(N, N), r"B\left(n, n\right)", "B(n, n)"),
        (sp.beta(N, 2) ** 2, r"B\left(n, 2\right)^{2}", "B(n, 2)²"),
        (sp.expint(1, X), r"\operatorname{E}_{1}\left(x\right)", "E₁(x)"),
        (sp.expint(2, X), r"\operatorname{E}_{2}\left(x\right)", "E2(x)"),
        (sp.LambertW(-X, -1), r"W_{-1}\left(- x\right)", "W₋₁(-x)"),
        (SERIES, r"{}_{2}F_{1}\left(1, \frac{2}{n}; 1 + \frac{1}{n}; x\right)", "₂F₁(1, 2/n; 1 + 1/n; x)"),
        (
            sp.Piecewise((X, X <= 1), (0, True)),
            r"\begin{cases} x & x \leq 1 \\ 0 & \text{otherwise} \end{cases}",
            "x for x ≤ 1; 0 otherwise",
        ),
    ],
)
def test_writing(expression, latex, text):
    assert latex_of(expression) == latex
    assert text_of(expression) == text
    assert convert(latex).startswith("<math")


def test_a_power_of_a_series_is_bracketed():
    assert latex_of(SERIES**2).startswith(r"\left({}_{2}F_{1}")
