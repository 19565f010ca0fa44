"""The steps from profile to vorticity, pressure and momentum balance, as equations to read."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import sympy as sp

from vortexwidgets.models.agreement import check_agreement
from vortexwidgets.models.catalogue import model_named
from vortexwidgets.models.model import VortexModel, X
from vortexwidgets.models.notation import latex_of, text_of


@dataclass(frozen=True)
class Step:
    """One step of a derivation.

    Attributes
    ----------
    title, sentence : str
        What is done, and one plain sentence about it.
    latex, text : str
        The equation for typesetting, and for a terminal.
    """

    title: str
    sentence: str
    latex: str
    text: str

    @property
    def equation(self) -> str:
        """The same as `latex`."""
        return self.latex


@dataclass(frozen=True)
class Derivation:
    """How everything that is known of a model follows from its profile, in numbered steps.

    Attributes
    ----------
    model : str
        Name.
    source : str
        Where the profile was published.
    limits : str
        For what it holds.
    steps : tuple of Step
    """

    model: str
    source: str
    limits: str
    steps: tuple[Step, ...]

    def __str__(self) -> str:
        lines = [f"{self.model} vortex. {self.source}", self.limits]
        for number, step in enumerate(self.steps, start=1):
            lines += ["", f"{number}. {step.title}", f"   {step.sentence}"]
            lines += [f"      {part}" for part in step.text.splitlines()]
        return "\n".join(lines)

    def _repr_markdown_(self) -> str:
        parts = [f"### {self.model} vortex\n\n{self.source} {self.limits}"]
        parts += [
            f"**{number}. {step.title}.** {step.sentence}\n\n$${step.latex}$$"
            for number, step in enumerate(self.steps, start=1)
        ]
        return "\n\n".join(parts)


def derivation(model: str | VortexModel) -> Derivation:
    """Derive vorticity, circulation, pressure and momentum balance of a model, step by step.

    Parameters
    ----------
    model : str or VortexModel

    Returns
    -------
    Derivation
        Typeset in a notebook, text in a terminal.

    Raises
    ------
    ValueError
        If there is no such model.

    Examples
    --------
    >>> print(derivation("taylor").steps[2].text)
    ω = (1/r) d(r v)/dr = (V/r_c) W(x)
    W(x) = (1/x) d(xF)/dx = -2·(x - 1)·(x + 1)·exp(-x²)
    """
    return _derived(model_named(model))


@lru_cache(maxsize=64)
def _derived(model: VortexModel) -> Derivation:
    steps = [_profile(model), _conditions(model), _vorticity(model), _circulation(model), _equilibrium(model)]
    if model.pressure_drop != sp.oo:
        steps.append(_pressure(model))
    steps += [_centre(model), _peak(model), _balance(model), _agreement(model)]
    return Derivation(model.name, model.source, model.limits, tuple(steps))


# Steps ----------------------------------------------------------------------------------------------------------------


def _profile(model: VortexModel) -> Step:
    scale, scale_text = {
        "circulation": (r"\frac{\Gamma}{2 \pi %s}", "Γ/(2π %s)"),
        "swirl_scale": ("V", "V"),
        "rotation_rate": (r"\Omega %s", "Ω %s"),
    }[model.strength]
    length = _length(model)
    scale, scale_text = (part % length if "%s" in part else part for part in (scale, scale_text))
    where = "" if model.has_core else " L is any length: the flow has none of its own."
    if model.shape:
        where += " Here " + "; ".join(f"{p.symbol} is the {p.name}, positive" for p in model.shape) + "."
    head = rf"v_\theta = V F(x), \quad V = {scale}" if scale != "V" else r"v_\theta = V F(x)"
    return Step(
        "Profile",
        f"The swirl velocity is declared as a scale times one function of x; positive is counter-clockwise.{where}",
        rf"{head}, \quad x = \frac{{r}}{{{length}}}, \quad F(x) = {latex_of(model.swirl)}",
        f"v = V F(x){'' if scale == 'V' else f', V = {scale_text}'}, x = r/{length}\nF(x) = {text_of(model.swirl)}",
    )


def _conditions(model: VortexModel) -> Step:
    axis, far = model.at_axis("swirl"), model.far_away("enclosed_circulation")
    latex = [rf"F(0) = {latex_of(axis)}", rf"x F(x) \to {latex_of(far)} \quad \left(x \to \infty\right)"]
    text = [f"F(0) = {text_of(axis)}", f"x F(x) → {text_of(far)} for x → ∞"]
    sentence = {
        sp.S.Zero: "The circulation vanishes far away: the vortex is shielded.",
        sp.S.One: "All circulation is found far away, so V is the circulation over the length.",
    }.get(far, "The circulation grows without end, so the flow needs a wall.")
    sentence = f"{'The fluid on the axis is at rest.' if axis == 0 else 'The axis is singular.'} {sentence}"
    if model.edges:
        (inner, _), (outer, _) = model.swirl.args
        (spin_in, _), (spin_out, _) = model.vorticity.args
        edge = model.edges[0]
        values = [sp.simplify(part.subs(X, edge)) for part in (inner, outer, spin_in, spin_out)]
        latex.append(
            rf"F({latex_of(edge)}^-) = {latex_of(values[0])}, \quad F({latex_of(edge)}^+) = {latex_of(values[1])}"
        )
        text.append(f"F({edge}⁻) = {text_of(values[0])}, F({edge}⁺) = {text_of(values[1])}")
        sentence += (
            f" The swirl is continuous at the core edge; its slope is not, and the vorticity drops from {values[2]} to "
            f"{values[3]}, in units of V/r_c."
        )
    return Step("Boundary and matching conditions", sentence, r", \quad ".join(latex), ", ".join(text))


def _vorticity(model: VortexModel) -> Step:
    length = _length(model)
    return Step(
        "Vorticity",
        "The curl of a flow that only turns has one component, along the axis.",
        rf"\omega = \frac{{1}}{{r}} \frac{{d (r v_\theta)}}{{d r}} = \frac{{V}}{{{length}}} W(x), \quad "
        rf"W(x) = \frac{{1}}{{x}} \frac{{d (x F)}}{{d x}} = {latex_of(model.vorticity)}",
        f"ω = (1/r) d(r v)/dr = (V/{length}) W(x)\nW(x) = (1/x) d(xF)/dx = {text_of(model.vorticity)}",
    )


def _circulation(model: VortexModel) -> Step:
    length = _length(model)
    full, full_text = (r"\Gamma", "Γ") if model.strength == "circulation" else (rf"2 \pi {length} V", f"2π {length} V")
    return Step(
        "Enclosed circulation",
        "The circulation along a circle is its length times the swirl.",
        rf"\Gamma(r) = 2 \pi r v_\theta = {full} \, C(x), \quad C(x) = x F = {latex_of(model.enclosed_circulation)}",
        f"Γ(r) = 2π r v = {full_text} C(x), C(x) = x F = {text_of(model.enclosed_circulation)}",
    )


def _equilibrium(model: VortexModel) -> Step:
    sentence = "The pressure gradient holds the fluid on its circle."
    if model.motion == "strained":
        sentence += " This is the swirl's part; the strain adds -ρa²(r²/8 + z²/2) relative to the origin."
    return Step(
        "Radial equilibrium",
        sentence,
        r"\frac{d p}{d r} = \frac{\rho v_\theta^2}{r}",
        "dp/dr = ρ v²/r",
    )


def _pressure(model: VortexModel) -> Step:
    if "pressure_drop" in model.stated:
        sentence = (
            "The closed form is stated, not found by SymPy; its slope is -F²/x and its limit far away is zero, which "
            "proves it."
        )
    else:
        sentence = "The integral inwards from far away, found by SymPy."
    return Step(
        "Pressure drop",
        sentence,
        r"p_\infty - p = \rho V^2 P(x), \quad P(x) = \int_x^{\infty} \frac{F(t)^2}{t} dt = "
        + latex_of(model.pressure_drop),
        f"p∞ - p = ρ V² P(x)\nP(x) = ∫ₓ^∞ F(t)²/t dt = {text_of(model.pressure_drop)}",
    )


def _centre(model: VortexModel) -> Step:
    if model.pressure_drop == sp.oo:
        return Step(
            "Pressure from the axis",
            "The drop from far away is infinite; the rise from the axis to a radius is not.",
            r"p(r) - p(0) = \rho V^2 \int_0^x \frac{F(t)^2}{t} dt = \rho V^2 \, "
            + latex_of(sp.integrate(model.swirl**2 / X, (X, 0, X))),
            f"p(r) - p(0) = ρ V² ∫₀ˣ F(t)²/t dt = ρ V² · {text_of(sp.integrate(model.swirl**2 / X, (X, 0, X)))}",
        )
    value = model.centre
    if value == sp.oo:
        sentence = "The drop has no limit on the axis: the formula holds outside a core only."
        return Step("Drop on the axis", sentence, r"P(0) = \infty", "P(0) = ∞")
    number = model.centre_pressure(*_defaults(model))
    return Step(
        "Drop on the axis",
        f"The deepest drop, p∞ - p(0) = ρ V² P(0){_at_default(model)}.",
        rf"P(0) = {latex_of(value)}{_approximately(value, number, 'latex')}",
        f"P(0) = {text_of(value)}{_approximately(value, number, 'text')}",
    )


def _peak(model: VortexModel) -> Step:
    if model.peak is None:
        sentence = "The swirl has no largest value at a finite distance, so it has no peak radius."
        return Step("Peak of the swirl", sentence, r"F'(x) \neq 0", "F'(x) ≠ 0")
    shape = _defaults(model)
    (place, size), constant = model.peak, model.pressure_constant_expression
    numbers = (*model.peak_of(*shape), model.pressure_constant(*shape))
    found = [("x_p", place, numbers[0]), ("F_p", size, numbers[1]), (r"K = \frac{P(0)}{F_p^2}", constant, numbers[2])]
    # The long forms are of no use to a reader: K is the ratio of two numbers already given.
    short = [(name, value if sp.count_ops(value) < 25 else None, number) for name, value, number in found]
    condition = "" if model.edges else r"F'(x_p) = 0, \quad "
    names = ("x_p", "F_p", "K = P(0)/F_p²")
    return Step(
        "Peak of the swirl",
        "The peak radius is where swirl is largest, which is not the core radius in general; K ties the drop to the "
        f"peak swirl, p∞ - p(0) = K ρ v_p²{_at_default(model)}.",
        condition + r", \quad ".join(_given(name, value, number, "latex") for name, value, number in short),
        ", ".join(_given(name, value, number, "text") for name, (_, value, number) in zip(names, short, strict=True)),
    )


def _balance(model: VortexModel) -> Step:
    balance, length = model.balance, _length(model)
    law = rf", \quad {balance.law}" if balance.law else ""
    law_text = {"growing": " with r_c² = r_0² + 4νt", "strained": " with u_r = -a r/2, r_c² = 4ν/a"}.get(
        model.motion, ""
    )
    if model.motion == "growing" and model.decay != 1:
        law_text += f", V ∝ r_c^-{model.decay}"
    return Step(
        "Momentum balance",
        balance.sentence,
        r"-\frac{\partial v_\theta}{\partial t} - u_r \omega + \nu \frac{\partial \omega}{\partial r} = "
        rf"\frac{{\nu V}}{{{length}^2}} R(x), \quad R(x) = {latex_of(balance.left_over)}{law}",
        f"-∂v/∂t - u_r ω + ν ∂ω/∂r = (ν V/{length}²) R(x){law_text}\nR(x) = {text_of(balance.left_over)}",
    )


def _agreement(model: VortexModel) -> Step:
    found = check_agreement(model)
    power = math.floor(math.log10(found.worst)) if found.worst > 0.0 else 0
    number = f"{found.worst / 10.0**power:.1f}"
    return Step(
        "Agreement",
        "Every formula was compared with quadrature and differentiation of the profile for x from 1e-9 to 1e6"
        f"{_at_default(model)}; the worst relative difference is in the {found.what} at x = {found.where:.3g}.",
        rf"\delta = {number} \times 10^{{{power}}}",
        f"δ = {found.worst:.1e}",
    )


def _given(name: str, value: sp.Expr | None, number: float, kind: str) -> str:
    if value is None:
        return f"{name} = {_digits(number)}"
    return f"{name} = {latex_of(value) if kind == 'latex' else text_of(value)}{_approximately(value, number, kind)}"


def _approximately(value: sp.Expr, number: float, kind: str) -> str:
    if value.is_Rational:
        return ""
    return rf" \approx {_digits(number)}" if kind == "latex" else f" ≈ {_digits(number)}"


def _digits(number: float) -> str:
    return f"{number:.10g}"


def _defaults(model: VortexModel) -> tuple[float, ...]:
    return tuple(parameter.default for parameter in model.shape)


def _at_default(model: VortexModel) -> str:
    return f" (numbers for {', '.join(f'{p.symbol} = {p.default:g}' for p in model.shape)})" if model.shape else ""


def _length(model: VortexModel) -> str:
    return "r_c" if model.has_core else "L"
