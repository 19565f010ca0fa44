"""Formulas of x written for typesetting and for a terminal."""

from __future__ import annotations

import re
from typing import Any

import sympy as sp
from sympy.printing.latex import LatexPrinter
from sympy.printing.str import StrPrinter


def latex_of(expression: sp.Expr) -> str:
    r"""Write an expression in LaTeX that simple converters read as well, without matrices or \middle.

    Examples
    --------
    >>> x = sp.Symbol("x", positive=True)
    >>> print(latex_of(sp.log(2) / x))
    \frac{\ln{\left(2 \right)}}{x}
    """
    return str(_Latex({"ln_notation": True}).doprint(expression))


def text_of(expression: sp.Expr) -> str:
    """Write an expression on one line of Unicode.

    Examples
    --------
    >>> x = sp.Symbol("x", positive=True)
    >>> text_of(2 / (x**2 + 1) ** 2)
    '2/(x² + 1)²'
    """
    plain = str(_Text().doprint(expression)).replace("**", "^").replace("*", "·").replace("<=", "≤")
    high = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")
    return re.sub(r"\^(\d+)", lambda found: found.group(1).translate(high), plain)


class _Latex(LatexPrinter):
    """LaTeX that simple converters read as well, without matrices."""

    def _print_hyper(self, expr: sp.Expr, exp: Any = None) -> str:
        above, below, at = (self._row(expr.args[0]), self._row(expr.args[1]), self._print(expr.args[2]))
        written = rf"{{}}_{{{len(expr.args[0])}}}F_{{{len(expr.args[1])}}}\left({above}; {below}; {at}\right)"
        return written if exp is None else rf"\left({written}\right)^{{{exp}}}"

    def _print_Piecewise(self, expr: sp.Piecewise) -> str:  # noqa: N802
        rows = [
            rf"{self._print(value)} & {'otherwise' if condition == True else self._print(condition)}"  # noqa: E712
            for value, condition in expr.args
        ]
        return (
            r"\begin{cases} "
            + r" \\ ".join(row.replace("otherwise", r"\text{otherwise}") for row in rows)
            + r" \end{cases}"
        )

    def _print_beta(self, expr: sp.Expr, exp: Any = None) -> str:
        written = rf"B\left({self._row(expr.args)}\right)"
        return written if exp is None else rf"{written}^{{{exp}}}"

    def _row(self, values: Any) -> str:
        return ", ".join(self._print(value) for value in values)


class _Text(StrPrinter):
    """One line of Unicode."""

    def _print_hyper(self, expr: sp.Expr) -> str:
        above, below, at = expr.args
        low = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
        name = f"{str(len(above)).translate(low)}F{str(len(below)).translate(low)}"
        return f"{name}({self.stringify(above, ', ')}; {self.stringify(below, ', ')}; {self._print(at)})"

    def _print_expint(self, expr: sp.Expr) -> str:
        return f"E{'₁' if expr.args[0] == 1 else expr.args[0]}({self._print(expr.args[1])})"

    def _print_beta(self, expr: sp.Expr) -> str:
        return f"B({self.stringify(expr.args, ', ')})"

    def _print_LambertW(self, expr: sp.Expr) -> str:  # noqa: N802
        branch = "₋₁" if len(expr.args) > 1 else "₀"
        return f"W{branch}({self._print(expr.args[0])})"

    def _print_Piecewise(self, expr: sp.Piecewise) -> str:  # noqa: N802
        rows = [
            f"{self._print(value)} {'otherwise' if condition == True else f'for {self._print(condition)}'}"  # noqa: E712
            for value, condition in expr.args
        ]
        return "; ".join(rows)

    def _print_log(self, expr: sp.Expr) -> str:
        return f"ln({self._print(expr.args[0])})"

    def _print_Exp1(self, expr: sp.Expr) -> str:  # noqa: N802
        return "e"

    def _print_Infinity(self, expr: sp.Expr) -> str:  # noqa: N802
        return "∞"
