"""Fluid, site and instrument of a survey, as its own facts state them."""

from __future__ import annotations

import dataclasses
from typing import Any

from vortexwidgets.fluids import Fluid, Site, fluid_named
from vortexwidgets.survey.instrument import Instrument
from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Estimate

_ASSUMED_TEMPERATURE = (15.0, 5.0)  # °C, where a fluid is named without one; its doubt is carried
_OF_THE_SITE = (
    "ambient_pressure", "surface_pressure", "depth", "gravity", "orientation", "reference_radius", "translation_speed",
    "tensile_strength", "gas_saturation", "inception", "elevation", "submergence",
)  # fmt: skip
_PLAIN = ("reference_radius", "gravity", "gas_saturation")  # fields of a site that have no uncertainty
_OF_THE_FLUID = ("density", "kinematic_viscosity", "vapour_pressure", "surface_tension")
_NAMING = ("fluid", "temperature", "salinity", "humidity", *_OF_THE_FLUID)


def fluid_of(survey: Survey, assumptions: list[str], *, site: Site | None = None, given: Fluid | None = None) -> Fluid:
    """Fluid of a survey; what it does not state is assumed and said in `assumptions`.

    Parameters
    ----------
    survey : Survey
        A property that its facts state replaces that of the fluid's equations.
    assumptions : list of str
        Sentences are added to it.
    site : Site, optional
        Its pressure is the fluid's; that of the survey's facts by default.
    given : Fluid, optional
        A whole fluid, which then counts in place of all facts.

    Returns
    -------
    Fluid
    """
    facts = survey.facts
    if given is not None:
        unused = [name for name in _NAMING if name in facts and not _agrees(given, name, facts[name])]
        if unused:
            said = ", ".join(f"{name.replace('_', ' ')} {facts[name]}" for name in unused)
            assumptions.append(f"The fluid that was given is used, and not what the survey states: {said}.")
        return given
    name = facts.get("fluid")
    temperature = facts.get("temperature")  # an Estimate in kelvin
    options: dict[str, Any] = {"temperature": _ASSUMED_TEMPERATURE if temperature is None else temperature}
    if name is None:
        name = "water"
        assumptions.append("The fluid was not stated: water is taken. Pressures scale with density; give the fluid.")
    if temperature is None:
        assumptions.append(
            f"The temperature was not stated: 15 ± 5 °C is taken for the {name}, with its doubt carried."
        )
    pressure: Any = facts.get("ambient_pressure", facts.get("surface_pressure"))
    if site is not None:
        pressure = site.ambient_pressure if site.ambient_pressure is not None else site.surface_pressure
    if pressure is not None:
        options["pressure"] = pressure
    for option in ("salinity", "humidity"):
        if option in facts:
            options[option] = facts[option]
    return _with_stated_properties(fluid_named(str(name), **options), survey, assumptions)


def site_of(survey: Survey, given: Site | None = None, assumptions: list[str] | None = None) -> Site:
    """Site of a survey: what was given, and for the rest what its facts say.

    Parameters
    ----------
    survey : Survey
    given : Site, optional
        A field at its default is not stated. A reference pressure replaces the one of the facts, however they state it.
    assumptions : list of str, optional
        Facts that what was given contradicts are added to it.

    Returns
    -------
    Site
    """
    facts = survey.facts
    known: dict[str, Any] = {name: facts[name] for name in _OF_THE_SITE if name in facts}
    if "free_stream" in facts:
        known["speed"] = facts["free_stream"]
    if "free_stream_name" in facts:
        known["speed_name"] = facts["free_stream_name"]
    if facts.get("confirm_absolute") == "yes":
        known["confirm_absolute"] = True
    for name in _PLAIN:
        if name in known:
            known[name] = _number(known[name])
    if given is None:
        return Site(**known)
    stated = _stated(given, Site())
    if "speed" in stated:
        stated["speed_name"] = given.speed_name
    replaced = {name for name in stated if name in known and not _same(stated[name], known[name])}
    if "ambient_pressure" in stated and "surface_pressure" not in stated:
        replaced |= {"surface_pressure"} & set(known)
    if "surface_pressure" in stated and "ambient_pressure" not in stated:
        replaced |= {"ambient_pressure"} & set(known)
    for name in sorted(replaced - {"confirm_absolute", "speed_name"}):
        value = _shown(name, known.pop(name))
        _say(assumptions, f"The site that was given is used, and not the survey's {name.replace('_', ' ')}, {value}.")
    return Site(**{**known, **stated})


def instrument_of(
    survey: Survey, given: Instrument | None = None, assumptions: list[str] | None = None
) -> Instrument | None:
    """Instrument of a survey: what was given, and for the rest what its facts say; None where neither names one.

    Parameters
    ----------
    survey : Survey
    given : Instrument, optional
        A length of 0 is not stated.
    assumptions : list of str, optional
        Facts that what was given contradicts are added to it.

    Returns
    -------
    Instrument or None
    """
    facts = survey.facts
    known: dict[str, Any] = {name: _number(facts[name]) for name in ("wander", "probe_width") if name in facts}
    if "averaging" in facts:
        known["averaging"] = str(facts["averaging"])
    if given is None:
        return Instrument(**known) if known else None
    stated = _stated(given, Instrument())
    if "probe_width" in stated:
        stated["averaging"] = given.averaging
    for name in sorted(name for name in stated if name in known and not _same(stated[name], known[name])):
        value = _shown(name, facts[name])
        _say(
            assumptions,
            f"The instrument that was given is used, and not the survey's {name.replace('_', ' ')}, {value}.",
        )
    return dataclasses.replace(given, **{name: value for name, value in known.items() if name not in stated})


def _with_stated_properties(fluid: Fluid, survey: Survey, assumptions: list[str]) -> Fluid:
    """Replace properties of a fluid by those that the survey states, and say so."""
    stated: dict[str, Estimate] = {}
    for name in _OF_THE_FLUID:
        value, own = survey.facts.get(name), getattr(fluid, name)
        if not isinstance(value, Estimate):
            continue
        words = name.replace("_", " ")
        if own is None:
            assumptions.append(f"The survey states a {words}, {value}, which {fluid.name} does not have: not used.")
            continue
        stated[name] = value
        assumptions.append(
            f"The {words} is {value}, as stated in the survey; the equations of {fluid.name} give {own}."
        )
    if not stated:
        return fluid
    names = " and ".join(name.replace("_", " ") for name in stated)
    changes: dict[str, Any] = {**stated, "source": f"{fluid.source} Stated in the survey: {names}."}
    return dataclasses.replace(fluid, **changes)


def _stated(given: Any, default: Any) -> dict[str, Any]:
    """Fields that differ from their default."""
    fields = {item.name: getattr(given, item.name) for item in dataclasses.fields(given) if item.init}
    return {name: value for name, value in fields.items() if value != getattr(default, name)}


def _agrees(fluid: Fluid, name: str, fact: str | float | Estimate) -> bool:
    """Whether a fact says what a given fluid is; salinity and humidity of a fluid are not kept, so they pass."""
    if name == "fluid":
        return str(fact).strip().lower() == fluid.name.lower()
    own = getattr(fluid, name, None)
    return name in ("salinity", "humidity") or (own is not None and _same(own, fact))


def _same(one: Any, other: Any) -> bool:
    if isinstance(one, str) or isinstance(other, str):
        return bool(one == other)
    return _number(one) == _number(other)


def _number(value: Any) -> float:
    return value.value if isinstance(value, Estimate) else float(value)


def _shown(name: str, value: Any) -> str:
    """Write a fact with its unit."""
    return str(Estimate(value, 0.0, name)) if isinstance(value, float) else str(value)


def _say(sentences: list[str] | None, sentence: str) -> None:
    if sentences is not None:
        sentences.append(sentence)
