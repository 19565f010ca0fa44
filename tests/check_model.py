"""The contract of a vortex model, for entries of the catalogue and for a model of one's own: `check_model(model)`.

Each part raises AssertionError with a sentence that says which identity broke. Formulas are evaluated with mpmath at 50
digits and more; double precision enters only where kernels are the thing compared.
"""

import itertools
import math
import re

import mpmath as mp
import numpy as np
import sympy as sp

from vortexwidgets.models.derivation import derivation
from vortexwidgets.models.model import X

QUANTITIES = ("swirl", "vorticity", "enclosed_circulation", "pressure_drop")
NEAR = [1e-12, 1e-9, 1e-6, 1e-3]
MIDDLE = [0.1, 0.35, 0.7, 0.93, 1.13, 1.6, 2.7]
FAR = [5.0, 12.0, 30.0]


def check_model(model):
    """Run every part; the first identity that is broken raises."""
    for part in PARTS:
        part(model)


def shapes(model):
    """Values of the shape parameters at which a model is checked."""
    if not model.shape:
        return [()]
    defaults = [p.default for p in model.shape]
    corners = [defaults]
    for index, parameter in enumerate(model.shape):
        for end in parameter.typical:
            corners.append([*defaults[:index], end, *defaults[index + 1 :]])
    return [tuple(map(float, corner)) for corner in corners]


def precise(expression, model, shape):
    """A function of x at mpmath's working precision."""
    fixed = sp.sympify(expression).subs(dict(zip(model.symbols, map(sp.Rational, shape), strict=True)))
    return sp.lambdify(X, sp.nsimplify(fixed, rational=True), "mpmath")


def require(holds, model, sentence):
    if not holds:
        raise AssertionError(f"{model.key}: {sentence}")


def close(value, reference, relative=1e-25):
    return abs(value - reference) <= relative * (abs(value) + abs(reference)) + mp.mpf(10) ** -300


def source_is_given(model):
    require(re.search(r"\b1[89]\d\d|\b20\d\d", model.source), model, "the source names no year")
    require(model.name and model.key == model.key.lower(), model, "a model needs a name and a key in small letters")
    stated = model.published_peak is not None and model.published_pressure_constant is not None
    require(stated or not model.ranked, model, "a model that is ranked states its published peak and K")
    require(model.published_source or not stated, model, "a published peak or K needs its source")


def axis_is_regular(model):
    if not model.has_core:
        return
    require(model.at_axis("swirl") == 0, model, "the swirl is not zero on the axis")
    require(model.at_axis("vorticity").is_finite, model, "the vorticity on the axis is not finite")
    require(model.at_axis("enclosed_circulation") == 0, model, "a circle of no radius encloses circulation")


def circulation_far_away_is_that_of_the_strength(model):
    far = model.far_away("enclosed_circulation")
    if model.strength == "circulation":
        require(far == 1, model, f"x F tends to {far}, not to 1, far away")
    else:
        require(far in (0, sp.oo), model, f"x F tends to {far}: the strength should be a circulation")


def profile_is_continuous_at_its_edges(model):
    for edge in model.edges:
        for quantity in ("swirl", "enclosed_circulation", "pressure_drop"):
            branches = [value.subs(X, edge) for value, _ in getattr(model, quantity).args]
            steps = [sp.N(a - b, 30) for a, b in itertools.pairwise(branches)]
            require(all(abs(step) < 1e-25 for step in steps), model, f"{quantity} jumps at x = {edge}")


def published_peak_is_one_of_the_declared_profile(model):
    """Before anything is derived: the declared F has the published size there, and is flat or has its edge there."""
    if model.published_peak is None:
        return
    tolerance = 0.5 * 10.0 ** (1 - model.published_digits)
    for shape in shapes(model):
        numbers = dict(zip(model.symbols, map(sp.Rational, shape), strict=True))
        place, size = (mp.mpf(sp.N(sp.sympify(part).subs(numbers), 40)) for part in model.published_peak)
        swirl = precise(model.swirl, model, shape)
        with mp.workdps(40):
            off = abs(swirl(place) - size) / size
            require(off <= tolerance, model, f"F is {swirl(place)} at the published peak, not {size}, {shape}")
            if not model.edges:
                # A place that is off by a share e leaves a slope of about e F''.
                slope = abs(mp.diff(swirl, place)) * place / size
                require(slope <= 5 * tolerance, model, f"F still has the slope {slope} at the published peak, {shape}")


def vorticity_is_the_curl_of_the_swirl(model):
    for shape in shapes(model):
        swirl, vorticity = precise(model.swirl, model, shape), precise(model.vorticity, model, shape)
        circulation = precise(model.enclosed_circulation, model, shape)
        for x in MIDDLE:
            with mp.workdps(60):
                curl = mp.diff(lambda t, f=swirl: t * f(t), mp.mpf(x)) / x
                size = abs(curl) + abs(swirl(mp.mpf(x)))
                require(
                    abs(vorticity(mp.mpf(x)) - curl) < 1e-20 * size,
                    model,
                    f"vorticity is not (x F)'/x at x = {x}, {shape}",
                )
                require(
                    close(circulation(mp.mpf(x)), x * swirl(mp.mpf(x))), model, f"circulation is not x F at x = {x}"
                )


def pressure_holds_the_swirl(model):
    """Radial equilibrium and nothing left over far away: together they are the integral."""
    if model.pressure_drop == sp.oo:
        return
    for shape in shapes(model):
        swirl, drop = precise(model.swirl, model, shape), precise(model.pressure_drop, model, shape)
        for x in MIDDLE:
            with mp.workdps(60):
                slope, pull = mp.diff(drop, mp.mpf(x)), swirl(mp.mpf(x)) ** 2 / x
                require(
                    abs(slope + pull) < 1e-20 * pull,
                    model,
                    f"radial equilibrium dP/dx + F²/x = 0 is broken at x = {x}, {shape}",
                )
        with mp.workdps(60):
            # Any tail of F falls off as a power or faster: P x² must not grow as a constant left over would.
            left = [drop(mp.mpf(10) ** 8), drop(mp.mpf(10) ** 12)]
            require(
                abs(left[1]) <= 1e-3 * abs(left[0]) + mp.mpf(10) ** -50,
                model,
                "the pressure drop does not vanish far away",
            )


def drop_on_the_axis_is_the_limit(model):
    if not model.has_core or not model.ranked:
        return
    for shape in shapes(model):
        with mp.workdps(60):
            limit = precise(model.pressure_drop, model, shape)(mp.mpf(10) ** -25)
            value = model.centre.subs(dict(zip(model.symbols, map(sp.Rational, shape), strict=True)))
            require(close(limit, mp.mpf(sp.N(value, 40)), 1e-15), model, "P(0) is not the limit of P on the axis")


def peak_and_constant_are_the_published_ones(model):
    if model.published_peak is None:
        require(model.peak is None, model, "a peak was found where none is published")
        return
    require(model.peak is not None, model, "no peak of the swirl was found")
    tolerance = 0.5 * 10.0 ** (1 - model.published_digits)
    for shape in shapes(model):
        numbers = dict(zip(model.symbols, map(sp.Rational, shape), strict=True))
        published = [*model.published_peak, model.published_pressure_constant]
        found = [*model.peak_of(*shape), model.pressure_constant(*shape)]
        for name, ours, theirs in zip(("peak radius", "peak swirl", "K"), found, published, strict=True):
            theirs = float(sp.sympify(theirs).subs(numbers))
            require(
                abs(ours - theirs) <= tolerance * abs(theirs),
                model,
                f"{name} {ours} is not the published {theirs} at {shape}",
            )
        if not model.edges:
            with mp.workdps(50):
                place = mp.mpf(found[0])
                slope = mp.diff(precise(model.swirl, model, shape), place)
                require(abs(slope) < 1e-13, model, f"the swirl still rises by {slope} at its peak")


def momentum_balance_is_what_is_left_over(model):
    balance = model.balance
    for shape in shapes(model)[:1]:
        swirl, left = precise(model.swirl, model, shape), precise(balance.left_over, model, shape)
        for x in (0.35, 0.93, 1.6):
            with mp.workdps(60):
                at = mp.mpf(x)

                def vorticity(t, f=swirl):
                    return mp.diff(lambda s: s * f(s), t) / t

                total = mp.diff(vorticity, at, h=mp.mpf(10) ** -12)
                if model.motion == "growing":  # -∂v/∂t with V ∝ r_c^-decay and r_c r_c' = 2ν
                    total += 2 * (model.decay * swirl(at) + at * mp.diff(swirl, at))
                elif model.motion == "strained":  # -u_r ω with u_r = -2ν x/r_c
                    total += 2 * at * vorticity(at)
                require(abs(left(at) - total) < 1e-9, model, f"the momentum balance leaves {total} over at x = {x}")
    require(balance.is_exact == (balance.left_over == 0), model, "is_exact contradicts what is left over")


def writing_is_legible(model):
    for step in derivation(model).steps:
        for text in (step.title, step.sentence, step.latex, step.text):
            require(text.strip(), model, "a step of the derivation is empty")
        require(step.latex.count("{") == step.latex.count("}"), model, f"LaTeX with unbalanced braces: {step.latex}")
        require("operatorname{hyper" not in step.latex, model, "LaTeX spells out a function")


def kernels_keep_their_digits(model):
    for shape in shapes(model):
        for quantity in QUANTITIES:
            expression = getattr(model, quantity)
            if expression == sp.oo:
                continue
            exact, kernel = precise(expression, model, shape), model.kernel(quantity)
            for x in (*NEAR, *MIDDLE, *FAR):
                with mp.workdps(80):
                    reference = exact(mp.mpf(x))
                value = float(kernel(x, *shape))
                allowed = 1e-12 * abs(reference) * (1 + x * x * 1e-3) + mp.mpf(10) ** -300
                require(
                    abs(value - reference) <= allowed,
                    model,
                    f"kernel of {quantity} gives {value}, not {reference}, at x = {x}",
                )
            limit = float(model.at_axis(quantity).subs(dict(zip(model.symbols, shape, strict=True))))
            at_axis = float(kernel(0.0, *shape))
            same = at_axis == limit or abs(at_axis - limit) < 1e-14 * limit
            require(same, model, f"kernel of {quantity} at x = 0 is {at_axis}, not the limit {limit}")


def fit_kernel_is_the_profile_and_its_derivatives(model):
    if not model.ranked:
        return
    at = np.array([*NEAR, *MIDDLE, *FAR])
    for shape in shapes(model):
        swirl, vorticity, *slopes = model.fit_kernel()(at, *shape)
        require(len(slopes) == len(model.shape), model, "one derivative per shape parameter is missing")
        for name, values in (("swirl", swirl), ("vorticity", vorticity)):
            ordinary = model.kernel(name)(at, *shape)
            require(np.allclose(values, ordinary, rtol=1e-13, atol=1e-300), model, f"fit_kernel gives another {name}")
        for index, slope in enumerate(slopes):
            for x, value in zip(at, slope, strict=True):
                with mp.workdps(60):
                    function = sp.lambdify((X, *model.symbols), model.swirl, "mpmath")

                    def of(number, x=x, index=index, function=function, shape=shape):
                        return function(mp.mpf(x), *(number if i == index else mp.mpf(s) for i, s in enumerate(shape)))

                    reference = mp.diff(of, mp.mpf(shape[index]))
                size = abs(reference) + mp.mpf(10) ** -14 * float(abs(swirl[at == x][0]))
                require(
                    abs(value - reference) <= 1e-9 * size,
                    model,
                    f"∂F/∂{model.shape[index].name} is {value}, not {reference}, at x = {x}, {shape}",
                )


def nothing_is_infinite_that_should_not_be(model):
    if not model.ranked:
        return
    for shape in shapes(model):
        for quantity in QUANTITIES:
            values = model.kernel(quantity)(np.array([0.0, 1e-300, 1e-9, 1.0, 1e6, 1e60]), *shape)
            require(np.all(np.isfinite(values)), model, f"{quantity} is not finite everywhere: {values}")
        require(math.isfinite(model.centre_pressure(*shape)), model, "the drop on the axis is infinite")


PARTS = [
    source_is_given,
    published_peak_is_one_of_the_declared_profile,
    axis_is_regular,
    circulation_far_away_is_that_of_the_strength,
    profile_is_continuous_at_its_edges,
    vorticity_is_the_curl_of_the_swirl,
    pressure_holds_the_swirl,
    drop_on_the_axis_is_the_limit,
    peak_and_constant_are_the_published_ones,
    momentum_balance_is_what_is_left_over,
    writing_is_legible,
    kernels_keep_their_digits,
    fit_kernel_is_the_profile_and_its_derivatives,
    nothing_is_infinite_that_should_not_be,
]
