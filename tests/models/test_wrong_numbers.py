"""A wrong number anywhere in the catalogue is caught by the contract: each is changed by one per cent in turn."""

import dataclasses

import pytest
import sympy as sp
from check_model import PARTS

from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.model import X

FIELDS = ("swirl", "published_peak[0]", "published_peak[1]", "published_pressure_constant", "pressure_drop", "centre")
# Both branches of this form are one analytic function, so it does not matter where one takes over from the other.
HARMLESS = {("vatistas", "pressure_drop", (0, 1, 1))}

# Compiling and writing do not find a wrong formula; the identities do, and are quicker.
IDENTITIES = [part for part in PARTS if part.__name__ not in ("writing_is_legible", "kernels_keep_their_digits")]


def places(expression, path=()):
    """Paths to every number of an expression, exponents and the -1 of a quotient among them."""
    if expression.is_Number or expression.is_NumberSymbol:
        if expression.is_finite and expression != 0:
            yield path
        return
    for index, part in enumerate(expression.args):
        if isinstance(part, sp.Basic):
            yield from places(part, (*path, index))


def changed(expression, path):
    """The same expression with one number one per cent larger; an edge that moves takes its branches along or jumps."""
    if not path:
        return expression * sp.Rational(101, 100)
    parts = list(expression.args)
    parts[path[0]] = changed(parts[path[0]], path[1:])
    return expression.func(*parts)


def get(model, field):
    if field in ("pressure_drop", "centre"):
        return model.stated.get(field)
    if field.startswith("published_peak"):
        return model.published_peak and sp.sympify(model.published_peak[int(field[-2])])
    value = getattr(model, field)
    return None if value is None else sp.sympify(value)


def put(model, field, value):
    if field in ("pressure_drop", "centre"):
        return dataclasses.replace(model, stated={**model.stated, field: value})
    if field.startswith("published_peak"):
        peak = list(model.published_peak)
        peak[int(field[-2])] = value
        return dataclasses.replace(model, published_peak=tuple(peak))
    return dataclasses.replace(model, **{field: value})


def check_all(model):
    for part in IDENTITIES:
        part(model)


def cases():
    for key, model in MODELS.items():
        if model.same_profile_as:
            continue
        for field in FIELDS:
            expression = get(model, field)
            if expression is not None:
                for path in places(expression):
                    if (key, field, path) not in HARMLESS:
                        yield pytest.param(key, field, path, id=f"{key} {field} {'.'.join(map(str, path))}")


@pytest.mark.parametrize(("key", "field", "path"), list(cases()))
def test_one_per_cent_is_caught(key, field, path):
    model = MODELS[key]
    wrong = put(model, field, changed(get(model, field), path))
    with pytest.raises(AssertionError, match=f"^{key}: "):
        check_all(wrong)


def test_the_branches_of_vatistas_are_one_function():
    """Which is why the place of the change does not matter: 50 digits on the wrong side of the edge."""
    (inner, _), (outer, _) = MODELS["vatistas"].pressure_drop.args
    for x in ("0.6", "1.7"):
        numbers = {X: sp.Rational(x), MODELS["vatistas"].symbols[0]: sp.Rational(5, 2)}
        assert abs(sp.N((inner - outer).subs(numbers), 50)) < sp.Float("1e-45")


def test_burgers_is_held_to_the_profile_of_lamb_oseen():
    assert MODELS["burgers"].swirl == MODELS["lamb-oseen"].swirl
    assert MODELS["burgers"].stated is MODELS["lamb-oseen"].stated
