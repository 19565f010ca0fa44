"""SymPy → NumPy, exact near the axis and far out; the only call to lambdify."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from functools import cache
from typing import Any

import numpy as np
import numpy.typing as npt
import sympy as sp
from sympy.codegen.rewriting import expm1_opt, log1p_opt, optimize
from sympy.printing.numpy import NumPyPrinter
from sympy.printing.precedence import PRECEDENCE

FloatArray = npt.NDArray[np.float64]
Kernel = Callable[..., FloatArray]

# Nearer to the axis and farther out than these the squares of x leave double precision; the limits hold there.
NEAREST, FARTHEST = 1e-100, 1e60

_SPECIAL = ("exp1", "expn", "beta", "hyp1f1", "hyp2f1", "gamma", "lambertw")


def prepare(expression: sp.Expr, x: sp.Symbol) -> sp.Expr:
    """Rewrite an expression of x > 0 so that double precision keeps its digits for small and large x.

    Branches are evaluated only where they hold, powers of 1 + x^p are scaled by the larger term, and exp and log become
    expm1 and log1p where one is taken away or added.

    Examples
    --------
    >>> x = sp.Symbol("x", positive=True)
    >>> prepare((1 - sp.exp(-(x**2))) / x, x)
    -expm1(-x**2)/x
    """
    return _optimized(_scaled(_clipped(sp.sympify(expression), x), x))


def together(expressions: Sequence[sp.Expr], x: sp.Symbol, shape: Sequence[sp.Symbol]) -> Callable[..., Any]:
    """Compile expressions into one function of (x, *shape) that returns a tuple of arrays.

    Nothing is checked: x is an array of floats, positive, and where exp(-x²) is involved not below 1e-150.
    """
    compiled = _compiled(tuple(expressions), (x, *shape))
    if all(expression.has(x) for expression in expressions):
        return compiled

    def filled(at: FloatArray, *numbers: float) -> tuple[FloatArray, ...]:
        return tuple(value + np.zeros_like(at) for value in compiled(at, *numbers))

    return filled


def derivative(expression: sp.Expr, x: sp.Symbol, parameter: sp.Symbol) -> sp.Expr:
    """Differentiate by a shape parameter, in the scaled form so that powers do not overflow."""
    return _optimized(sp.diff(_scaled(_clipped(expression, x), x), parameter))


def scalar(expression: sp.Expr, shape: Sequence[sp.Symbol]) -> Callable[..., float]:
    """Compile an expression of shape parameters alone into a function of floats."""
    if not expression.free_symbols:
        number = float(expression.evalf(25))
        return lambda *_: number
    compiled = _compiled((_optimized(expression),), tuple(shape))

    @cache
    def evaluate(*numbers: float) -> float:
        return float(np.real(compiled(*map(np.float64, numbers))[0]))

    return evaluate


def kernel(
    expression: sp.Expr,
    x: sp.Symbol,
    shape: Sequence[sp.Symbol],
    *,
    axis: Callable[..., float],
    far: Callable[..., float],
    power: int = 0,
) -> Kernel:
    """Compile an expression into a function of (x, *shape) that is right for every x >= 0.

    Parameters
    ----------
    expression : Expr
        Function of x and the shape symbols.
    x : Symbol
    shape : sequence of Symbol
    axis, far : callable
        Limits at x = 0 and for x → ∞, as functions of the shape parameters.
    power : int
        With which power of x the expression leaves the axis, where its limit there is zero.

    Returns
    -------
    callable
        (x, *shape) to an array of the shape of x; a number for a number.
    """
    inner = together((prepare(expression, x),), x, shape)

    def evaluate(at: npt.ArrayLike, *numbers: float) -> FloatArray:
        given = np.asarray(at, dtype=np.float64)
        flat = given.reshape(-1)
        if flat.size == 0:
            return np.empty(given.shape)
        if flat.min() >= NEAREST and flat.max() <= FARTHEST:
            result: FloatArray = inner(flat, *numbers)[0]
        else:
            result = np.full(flat.shape, math.nan)
            inside = (flat >= NEAREST) & (flat <= FARTHEST)
            result[inside] = inner(flat[inside], *numbers)[0]
            result[flat > FARTHEST] = far(*numbers)
            near = flat < NEAREST
            limit = axis(*numbers)
            if limit == 0.0 and power and near.any():
                result[near] = inner(np.array([NEAREST]), *numbers)[0] * (flat[near] / NEAREST) ** power
            else:
                result[near] = limit
        return result.reshape(given.shape)[()]

    return evaluate


class _Printer(NumPyPrinter):
    """NumPy code without the detours that SymPy's own printer takes."""

    def _print_Min(self, expression: sp.Expr) -> str:  # noqa: N802
        return self._nested("minimum", expression.args)

    def _print_Max(self, expression: sp.Expr) -> str:  # noqa: N802
        return self._nested("maximum", expression.args)

    def _print_Piecewise(self, expression: sp.Piecewise) -> str:  # noqa: N802
        (value, condition), *rest = expression.args
        if not rest:
            return str(self._print(value))
        # A constant branch must not make the result an array of integers.
        number = f"{float(value)!r}" if value.is_Number else self._print(value)
        return f"where({self._print(condition)}, {number}, {self._print(sp.Piecewise(*rest))})"

    def _print_Pow(self, expression: sp.Expr, rational: bool = False) -> str:  # noqa: N802
        if expression.exp == -1:
            return f"(1/{self.parenthesize(expression.base, PRECEDENCE['Pow'])})"
        return str(super()._print_Pow(expression, rational))

    def _print_Relational(self, expression: sp.Expr) -> str:  # noqa: N802
        return f"({self._print(expression.lhs)} {expression.rel_op} {self._print(expression.rhs)})"

    def _print_expint(self, expression: sp.Expr) -> str:
        order, at = expression.args
        return f"exp1({self._print(at)})" if order == 1 else f"expn({self._print(order)}, {self._print(at)})"

    def _print_beta(self, expression: sp.Expr) -> str:
        return f"beta({', '.join(map(self._print, expression.args))})"

    def _print_gamma(self, expression: sp.Expr) -> str:
        return f"gamma({self._print(expression.args[0])})"

    def _print_hyper(self, expression: sp.Expr) -> str:
        above, below, at = expression.args
        return f"hyp{len(above)}f{len(below)}({', '.join(map(self._print, (*above, *below, at)))})"

    def _nested(self, name: str, values: Sequence[sp.Expr]) -> str:
        first, *rest = map(self._print, values)
        for other in rest:
            first = f"{name}({first}, {other})"
        return str(first)


def _compiled(expressions: tuple[sp.Expr, ...], arguments: tuple[sp.Symbol, ...]) -> Callable[..., Any]:
    namespace: dict[str, Any] = {"minimum": np.minimum, "maximum": np.maximum, "where": np.where}
    if any(expression.has(sp.expint, sp.beta, sp.gamma, sp.hyper, sp.LambertW) for expression in expressions):
        import scipy.special

        namespace |= {name: getattr(scipy.special, name) for name in _SPECIAL}
    printer = _Printer({"fully_qualified_modules": False, "inline": True, "allow_unknown_functions": True})
    compiled: Callable[..., Any] = sp.lambdify(
        arguments, expressions, modules=[namespace, "numpy"], printer=printer, cse=True
    )
    return compiled


def _optimized(expression: sp.Expr) -> sp.Expr:
    return optimize(expression, (expm1_opt, log1p_opt)) if expression.has(sp.exp, sp.log) else expression


def _clipped(expression: sp.Expr, x: sp.Symbol) -> sp.Expr:
    """Evaluate the two branches of a profile with an edge each on its own side only.

    A branch for large x is written in 1/x, whose powers underflow quietly where those of x would overflow.
    """
    if not isinstance(expression, sp.Piecewise) or len(expression.args) != 2:
        return expression
    (inner, condition), (outer, _) = expression.args
    edge = condition.rhs
    near, inverse = sp.Symbol("near", positive=True), sp.Symbol("inverse", positive=True)
    inside = inner.subs(x, near)
    outside = sp.powsimp(outer.subs(x, 1 / inverse))
    clips = {near: sp.Min(x, edge), inverse: sp.Min(1 / x, 1 / edge)}
    at_edge = inner.subs(x, edge)
    if not expression.has(sp.hyper) and at_edge != 0 and sp.simplify(at_edge - outer.subs(x, edge)) == 0:
        # One factor is constant on either side, so the product needs no selection.
        return (_optimized(inside) * _optimized(outside) / at_edge).xreplace(clips)
    return sp.Piecewise((_optimized(inside).xreplace(clips), condition), (_optimized(outside).xreplace(clips), True))


def _scaled(expression: sp.Expr, x: sp.Symbol) -> sp.Expr:
    """Take the larger term out of powers of 1 + x^p where p is not a plain number."""
    small, large = sp.Min(x, 1 / x), sp.Max(1, x)

    def is_sum(e: Any) -> bool:
        return bool(
            isinstance(e, sp.Pow)
            and isinstance(e.base, sp.Add)
            and len(e.base.args) == 2
            and sp.S.One in e.base.args
            and (rest := e.base - 1).is_Pow
            and rest.base == x
            and not rest.exp.is_number
            and rest.exp.is_positive
        )

    def take_out(e: Any) -> Any:
        p = (e.base - 1).exp
        return large ** sp.expand(p * e.exp) * (1 + small**p) ** e.exp

    scaled = expression.replace(is_sum, take_out)
    if scaled is expression:
        return expression
    return scaled.replace(
        lambda e: isinstance(e, sp.Mul) and x in e.args and large**-2 in e.args,
        lambda e: small * sp.Mul(*(arg for arg in e.args if arg not in (x, large**-2))),
    )
