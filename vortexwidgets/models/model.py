"""VortexModel: one declared profile, everything else derived and cached."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, fields
from functools import cache, cached_property
from typing import Any, Literal

import sympy as sp

from vortexwidgets.models import kernels

X = sp.Symbol("x", positive=True)
"""Distance from the axis in core radii."""

Strength = Literal["circulation", "swirl_scale", "rotation_rate"]
Motion = Literal["steady", "growing", "strained"]
KernelName = Literal["swirl", "vorticity", "enclosed_circulation", "pressure_drop"]

# With which power of x a smooth vortex leaves the axis; 0: it starts from its limit.
_POWER_AT_AXIS: dict[str, int] = {"swirl": 1, "vorticity": 0, "enclosed_circulation": 2, "pressure_drop": 0}


@dataclass(frozen=True, eq=False)
class ShapeParameter:
    """A plain number that changes the shape of a profile.

    Parameters
    ----------
    name : str
        Full word, the argument of `Vortex`.
    symbol : str
        One letter; SymPy's, LaTeX's and the label's.
    default : float
    valid, typical : tuple of float
        Open range outside which a value is refused; ends of a slider.
    description : str
        One sentence without its full stop.
    """

    name: str
    symbol: str
    default: float
    valid: tuple[float, float]
    typical: tuple[float, float]
    description: str

    @property
    def expression(self) -> sp.Symbol:
        """The SymPy symbol, positive."""
        return sp.Symbol(self.symbol, positive=True)


@dataclass(frozen=True, eq=False)
class Balance:
    """What the azimuthal momentum equation leaves over.

    Attributes
    ----------
    unsteady, inflow, viscous : Expr
        -∂v/∂t, -u_r ω and ν ∂ω/∂r, in units of νV/r_c².
    left_over : Expr
        Their sum; zero where the profile is an exact solution.
    law : str
        LaTeX of the growth law or strain under which this is the sum; empty for a steady vortex without inflow.
    sentence : str
        The same in words.
    """

    unsteady: sp.Expr
    inflow: sp.Expr
    viscous: sp.Expr
    left_over: sp.Expr
    law: str
    sentence: str

    @property
    def is_exact(self) -> bool:
        """Whether nothing is left over: an exact solution of the Navier-Stokes equations."""
        return bool(self.left_over == 0)


@dataclass(frozen=True, eq=False)
class VortexModel:
    r"""A published vortex: one non-dimensional profile of swirl, from which everything else is derived.

    Swirl velocity v = V F(x), positive counter-clockwise, with x = r/r_c and the swirl scale V = Γ/(2π r_c).

    Parameters
    ----------
    key, name : str
        As typed, and as written.
    swirl : Expr
        F(x), in the symbol `X` and the symbols of the shape parameters.
    source : str
        Where it was published.
    shape : tuple of ShapeParameter
    stated : mapping
        "pressure_drop": P(x), only where SymPy finds no form that can be evaluated, and "centre": P(0), where its limit
        takes SymPy long; the tests prove both.
    strength : {"circulation", "swirl_scale", "rotation_rate"}
        The number that a vortex of this model is given.
    published_peak : tuple of Expr, optional
        (x, F) where the swirl is largest, as the literature gives it.
    published_pressure_constant : Expr, optional
        K = (p∞ - p(0)) / (ρ v_peak²), as the literature gives it.
    published_source : str
        Where peak and K are from, with provenance.
    published_digits : int
        How many digits of them are printed.
    same_profile_as : str, optional
        Key of the entry with the same F(x).
    ranked : bool
        Whether it can be fitted: it has a core and a finite pressure on the axis.
    has_core : bool
        Whether it has a core radius.
    motion : {"steady", "growing", "strained"}
        What holds against diffusion: nothing, a core that grows as r_c² = r_0² + 4νt, or an inflow u_r = -a r/2 with
        r_c² = 4ν/a.
    decay : int
        V ∝ r_c^-decay while the core grows.
    limits : str
        For what it holds, one or two sentences.

    Notes
    -----
    ω = (V/r_c) W(x), Γ(r) = 2π r_c V C(x), p∞ - p = ρ V² P(x). Nothing is derived before it is asked for.
    """

    key: str
    name: str
    swirl: sp.Expr
    source: str
    shape: tuple[ShapeParameter, ...] = ()
    stated: Mapping[str, sp.Expr] = field(default_factory=dict)
    strength: Strength = "circulation"
    published_peak: tuple[sp.Expr, sp.Expr] | None = None
    published_pressure_constant: sp.Expr | None = None
    published_source: str = ""
    published_digits: int = 12
    same_profile_as: str | None = None
    ranked: bool = True
    has_core: bool = True
    motion: Motion = "steady"
    decay: int = 1
    limits: str = ""

    # Symbolic -------------------------------------------------------------------------------------------------------

    @property
    def symbols(self) -> tuple[sp.Symbol, ...]:
        """SymPy symbols of the shape parameters."""
        return tuple(parameter.expression for parameter in self.shape)

    @property
    def edges(self) -> tuple[sp.Expr, ...]:
        """Values of x at which the profile changes its formula."""
        if not isinstance(self.swirl, sp.Piecewise):
            return ()
        return tuple(condition.rhs for _, condition in self.swirl.args if condition.is_Relational)

    @cached_property
    def vorticity(self) -> sp.Expr:
        """W(x) = (x F)'/x."""
        return self._by_branch(lambda swirl: _tidy(sp.diff(X * swirl, X) / X))

    @cached_property
    def enclosed_circulation(self) -> sp.Expr:
        """C(x) = x F."""
        return self._by_branch(lambda swirl: sp.powsimp(X * swirl))

    @cached_property
    def pressure_drop(self) -> sp.Expr:
        """P(x) = ∫ₓ^∞ F²/t dt; infinite for a vortex without end."""
        return self.stated["pressure_drop"] if "pressure_drop" in self.stated else self.integrated_pressure_drop()

    def integrated_pressure_drop(self) -> sp.Expr:
        """P(x) by SymPy's integration, which takes seconds or fails where a closed form is stated."""
        outer, end = sp.S.Zero, sp.oo
        pieces: list[tuple[sp.Expr, Any]] = []
        for swirl, condition in reversed(_branches(self.swirl)):
            begin = X
            found = _tidy(sp.integrate(swirl**2 / X, (X, begin, end)) + outer)
            pieces.insert(0, (min(found, sp.expand(found), key=sp.count_ops), condition))
            if pieces[0][0].has(sp.oo, sp.nan):
                return sp.oo
            edge = self.edges[len(self.edges) - len(pieces)] if len(pieces) <= len(self.edges) else None
            if edge is not None:
                outer, end = pieces[0][0].subs(X, edge), edge
        return sp.Piecewise(*pieces) if len(pieces) > 1 else pieces[0][0]

    @cached_property
    def centre(self) -> sp.Expr:
        """P(0)."""
        return self.stated["centre"] if "centre" in self.stated else self.at_axis("pressure_drop")

    @cached_property
    def peak(self) -> tuple[sp.Expr, sp.Expr] | None:
        """(x, F) where the swirl is largest; None where it has no largest value at a finite distance."""
        return _peak(self.swirl, tuple((p.expression, p.default) for p in self.shape))

    @cached_property
    def pressure_constant_expression(self) -> sp.Expr | None:
        """K = P(0)/F_peak²."""
        return None if self.peak is None or self.centre == sp.oo else sp.simplify(self.centre / self.peak[1] ** 2)

    @cached_property
    def balance(self) -> Balance:
        """The azimuthal momentum equation, -∂v/∂t - u_r ω + ν ∂ω/∂r."""
        viscous = self._by_branch(lambda swirl: _tidy(sp.diff(_tidy(sp.diff(X * swirl, X) / X), X)))
        unsteady = inflow = sp.S.Zero
        law = ""
        if self.motion == "growing":
            # ∂v/∂t at fixed r, with r_c' = 2ν/r_c
            unsteady = self._by_branch(lambda swirl: _tidy(2 * (self.decay * swirl + X * sp.diff(swirl, X))))
            law = r"r_c^2 = r_0^2 + 4 \nu t"
            if self.decay != 1:
                law += rf", \quad V \propto r_c^{{-{self.decay}}}"
        elif self.motion == "strained":
            inflow = self._by_branch(lambda swirl: _tidy(2 * sp.diff(X * swirl, X)))
            law = r"u_r = -\frac{a r}{2}, \quad r_c^2 = \frac{4 \nu}{a}"
        left_over = sp.simplify(unsteady + inflow + viscous)
        if isinstance(left_over, sp.Piecewise) and all(value == 0 for value, _ in left_over.args):
            left_over = sp.S.Zero
        return Balance(unsteady, inflow, viscous, left_over, law, self._balance_sentence(left_over))

    @property
    def growth(self) -> str:
        """LaTeX of the law by which the core grows; empty where it does not."""
        return r"r_c^2 = r_0^2 + 4 \nu t" if self.motion == "growing" else ""

    def at_axis(self, quantity: KernelName) -> sp.Expr:
        """Limit on the axis of one of the four functions of x."""
        if quantity == "pressure_drop" and "centre" in self.stated:
            return self.stated["centre"]
        expression = _branches(self._expression(quantity))[0][0]
        value = expression.subs(X, 0)
        return value if value.is_finite else sp.limit(expression, X, 0, "+")

    def far_away(self, quantity: KernelName) -> sp.Expr:
        """Limit for x → ∞ of one of the four functions of x."""
        if quantity == "pressure_drop":
            return sp.oo if self.pressure_drop == sp.oo else sp.S.Zero
        return sp.limit(_branches(self._expression(quantity))[-1][0], X, sp.oo)

    # Numeric --------------------------------------------------------------------------------------------------------

    def kernel(self, quantity: KernelName) -> kernels.Kernel:
        """One of the four functions of x, compiled.

        Parameters
        ----------
        quantity : {"swirl", "vorticity", "enclosed_circulation", "pressure_drop"}
            F, W, C or P.

        Returns
        -------
        callable
            (x, *shape) to an array of the shape of x, for x >= 0; the limit at x = 0.

        Raises
        ------
        ValueError
            If there is no such quantity.
        """
        if quantity not in _POWER_AT_AXIS:
            raise ValueError(f"No kernel for {quantity!r}; choose one of {', '.join(_POWER_AT_AXIS)}.")
        store: dict[str, kernels.Kernel] = self.__dict__.setdefault("_kernels", {})
        if quantity not in store:
            store[quantity] = kernels.kernel(
                self._expression(quantity),
                X,
                self.symbols,
                axis=kernels.scalar(self.at_axis(quantity), self.symbols),
                far=kernels.scalar(self.far_away(quantity), self.symbols),
                power=_POWER_AT_AXIS[quantity],
            )
        return store[quantity]

    def fit_kernel(self) -> Callable[..., tuple[kernels.FloatArray, ...]]:
        """(F, W, ∂F/∂shape...) of (x, *shape) in one compiled call, without any check: x > 0, an array."""
        return self._fit_kernel

    @cached_property
    def _fit_kernel(self) -> Callable[..., tuple[kernels.FloatArray, ...]]:
        values = [kernels.prepare(expression, X) for expression in (self.swirl, self.vorticity)]
        slopes = [kernels.derivative(self.swirl, X, symbol) for symbol in self.symbols]
        return kernels.together((*values, *slopes), X, self.symbols)

    def centre_pressure(self, *shape: float) -> float:
        """P(0) = (p∞ - p(0)) / (ρ V²); infinite where there is none."""
        return self._numeric["centre"](*shape)

    def peak_of(self, *shape: float) -> tuple[float, float]:
        """(x, F) where the swirl is largest; (0, ∞) or (∞, ∞) where it grows without end, inwards or outwards."""
        if self.peak is None:
            return (0.0, math.inf) if self.at_axis("swirl") == sp.oo else (math.inf, math.inf)
        return self._numeric["peak_radius"](*shape), self._numeric["peak_swirl"](*shape)

    def pressure_constant(self, *shape: float) -> float:
        """K = (p∞ - p(0)) / (ρ v_peak²) = P(0)/F_peak²; NaN where the model has none."""
        if self.peak is None or self.centre == sp.oo:
            return math.nan
        return self.centre_pressure(*shape) / self.peak_of(*shape)[1] ** 2

    @cached_property
    def circulation_far_away(self) -> float:
        """C for x → ∞: 1, 0 or infinite."""
        return float(self.far_away("enclosed_circulation"))

    @cached_property
    def _numeric(self) -> dict[str, Callable[..., float]]:
        found = {"centre": kernels.scalar(self.centre, self.symbols)}
        if self.peak is not None:
            found["peak_radius"], found["peak_swirl"] = (kernels.scalar(part, self.symbols) for part in self.peak)
        return found

    # The value itself -----------------------------------------------------------------------------------------------

    def __repr__(self) -> str:
        return f"<VortexModel {self.key}: F(x) = {self.swirl}>"

    def __reduce__(self) -> tuple[Any, ...]:
        # Compiled functions do not travel, and need not: they are derived again.
        return _rebuild, ({item.name: getattr(self, item.name) for item in fields(self)},)

    def __copy__(self) -> VortexModel:
        return self

    def __deepcopy__(self, _: Any) -> VortexModel:
        return self

    def _expression(self, quantity: KernelName) -> sp.Expr:
        expression: sp.Expr = getattr(self, quantity)
        return expression

    def _by_branch(self, function: Callable[[sp.Expr], sp.Expr]) -> sp.Expr:
        pieces = [(function(value), condition) for value, condition in _branches(self.swirl)]
        return sp.Piecewise(*pieces) if len(pieces) > 1 else pieces[0][0]

    def _balance_sentence(self, left_over: sp.Expr) -> str:
        if left_over != 0:
            return (
                "With constant viscosity the azimuthal momentum equation is not satisfied: the profile is empirical, "
                "and viscosity would change it at the rate left over."
            )
        if self.edges:
            return (
                "Zero on either side of the core edge, but the vorticity jumps there, so viscosity would smooth the "
                "edge at once."
            )
        return {
            "steady": "Viscosity does nothing here: an exact steady solution of the Navier-Stokes equations.",
            "growing": "An exact solution of the Navier-Stokes equations while the core grows by diffusion.",
            "strained": "An exact steady Navier-Stokes solution: the inflow carries in what diffuses out.",
        }[self.motion]


def _rebuild(values: dict[str, Any]) -> VortexModel:
    return VortexModel(**values)


def _branches(expression: sp.Expr) -> list[tuple[sp.Expr, Any]]:
    """Value and condition of each branch, from the axis outwards."""
    if isinstance(expression, sp.Piecewise):
        return [(value, condition) for value, condition in expression.args]
    return [(expression, True)]


def _holds(profile: sp.Expr, swirl: sp.Expr, at: float) -> bool:
    """Whether a branch is the one that holds at a place, edges belonging to both of their sides."""
    if not isinstance(profile, sp.Piecewise):
        return True
    edges = [float(condition.rhs) for _, condition in profile.args if condition != True]  # noqa: E712 (a SymPy truth)
    bounds = [0.0, *edges, math.inf]
    number = [value for value, _ in profile.args].index(swirl)
    return bounds[number] <= at <= bounds[number + 1]


@cache
def _peak(profile: sp.Expr, defaults: tuple[tuple[sp.Symbol, float], ...]) -> tuple[sp.Expr, sp.Expr] | None:
    """Place and size of the largest value; among several, that which is largest for the default shape."""
    numbers = dict(defaults)
    edges = [condition.rhs for _, condition in _branches(profile) if condition is not True and condition.is_Relational]
    found: list[tuple[float, sp.Expr, sp.Expr]] = []
    for swirl, _ in _branches(profile):
        slope = sp.numer(sp.together(_tidy(sp.diff(swirl, X))))
        stationary = sp.solve(slope, X, check=False, simplify=False) if slope.has(X) else []
        for at in [*stationary, *edges]:
            number = complex(at.subs(numbers).evalf(20))
            is_real = number.real > 0.0 and abs(number.imag) < 1e-15 * number.real
            if is_real and _holds(profile, swirl, number.real):
                value = sp.simplify(swirl.subs(X, at))
                found.append((float(sp.re(value.subs(numbers).evalf(20))), at, value))
    if not found:
        return None
    size, at, value = max(found, key=lambda item: item[0])
    # At an edge both branches hold; the swirl must fall on either side for this to be a peak.
    place, curve = float(at.subs(numbers)), profile.subs(numbers)
    beside = [float(curve.subs(X, place * factor).evalf(20)) for factor in (0.9, 1.1)]
    return (at, value) if max(beside) < size else None


def _tidy(expression: sp.Expr) -> sp.Expr:
    """One quotient of products, in which nothing large is taken from something large."""
    return sp.factor(sp.powsimp(sp.together(expression)))
