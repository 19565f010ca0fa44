"""Fluid, site and instrument of a survey, as its own facts state them."""

from __future__ import annotations

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


def fluid_of(survey: Survey, assumptions: list[str]) -> Fluid:
    """Fluid of a survey; what it does not state is assumed and said in `assumptions`."""
    facts = survey.facts
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
    pressure = facts.get("ambient_pressure", facts.get("surface_pressure"))
    if pressure is not None:
        options["pressure"] = pressure
    for option in ("salinity", "humidity"):
        if option in facts:
            options[option] = facts[option]
    return fluid_named(str(name), **options)


def site_of(survey: Survey) -> Site:
    """Site of a survey, as far as its facts say."""
    facts = survey.facts
    known: dict[str, Any] = {name: facts[name] for name in _OF_THE_SITE if name in facts}
    if "free_stream" in facts:
        known["speed"] = facts["free_stream"]
    if "free_stream_name" in facts:
        known["speed_name"] = facts["free_stream_name"]
    if facts.get("confirm_absolute") == "yes":
        known["confirm_absolute"] = True
    for name in ("reference_radius", "gravity", "gas_saturation"):
        if isinstance(known.get(name), Estimate):
            known[name] = known[name].value
    return Site(**known)


def instrument_of(survey: Survey) -> Instrument | None:
    """Instrument of a survey, or None where its facts name none."""
    facts = survey.facts
    known: dict[str, Any] = {}
    for name in ("wander", "probe_width"):
        value = facts.get(name)
        if value is not None:
            known[name] = value.value if isinstance(value, Estimate) else float(value)
    if "averaging" in facts:
        known["averaging"] = str(facts["averaging"])
    return Instrument(**known) if known else None
