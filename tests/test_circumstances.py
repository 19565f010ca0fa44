"""Fluid, site and instrument: what was given wins, what was not is filled from the facts, and conflicts are said."""

import numpy as np
import pytest

import vortexwidgets as vx
from vortexwidgets.circumstances import fluid_of, instrument_of, site_of
from vortexwidgets.survey.facts import read_facts


def survey_with(*comments):
    facts = read_facts(list(enumerate(comments, start=1)), "bench.csv").values
    return vx.Survey.radial(radius=[0.01, 0.02, 0.03], swirl=[1.0, 1.2, 0.9], uncertainty=0.1, **facts)


BENCH = survey_with(
    "fluid: water", "temperature: 15 degC", "surface pressure: 101.3 ± 0.2 kPa", "depth: 1.2 m", "free stream: 10 m/s",
    "free stream name: carriage", "orientation: submerged", "wander: 0.8 ± 0.2 mm", "probe width: 2 mm",
    "averaging: across",
)  # fmt: skip


def test_a_site_is_completed_by_the_facts_field_by_field():
    said = []
    site = site_of(BENCH, vx.Site(gas_saturation=0.6, elevation=300.0), said)
    assert site.gas_saturation == 0.6
    assert site.elevation.value == 300.0
    assert site.surface_pressure.value == pytest.approx(101_300.0)
    assert site.surface_pressure.uncertainty == pytest.approx(200.0)
    assert site.depth.value == 1.2
    assert (site.speed.value, site.speed_name) == (10.0, "carriage")
    assert site.orientation == "submerged"
    assert said == []


def test_a_fact_that_contradicts_what_was_given_is_said():
    said = []
    site = site_of(BENCH, vx.Site(depth=2.0, orientation="submerged", speed=(9.0, 0.1)), said)
    assert site.depth.value == 2.0
    assert (site.speed.value, site.speed_name) == (9.0, "free stream")
    assert said == [
        "The site that was given is used, and not the survey's depth, 1.2 m.",
        "The site that was given is used, and not the survey's speed, 10 m/s.",
    ]


def test_a_given_reference_pressure_replaces_that_of_the_facts_however_stated():
    said = []
    site = site_of(BENCH, vx.Site(ambient_pressure=95e3), said)
    assert site.surface_pressure is None
    assert site.axis_pressure(vx.water(15.0)).value == 95e3
    assert len(said) == 1
    assert "surface pressure, 101.30 ± 0.20 kPa" in said[0]
    stated = survey_with("ambient pressure: 120 kPa", "depth: 1 m")
    site = site_of(stated, vx.Site(surface_pressure=100e3), said)
    assert site.ambient_pressure is None
    assert site.depth.value == 1.0


def test_an_instrument_is_completed_by_the_facts():
    said = []
    instrument = instrument_of(BENCH, vx.Instrument(probe_width=0.003), said)
    assert (instrument.wander, instrument.probe_width, instrument.averaging) == (0.0008, 0.003, "along")
    assert [sentence.rpartition(" survey's ")[2] for sentence in said] == ["averaging, across.", "probe width, 2 mm."]
    instrument = instrument_of(BENCH, vx.Instrument(wander=0.001))
    assert (instrument.wander, instrument.probe_width, instrument.averaging) == (0.001, 0.002, "across")
    assert instrument_of(survey_with("fluid: water")) is None
    assert BENCH.facts["wander"].uncertainty == pytest.approx(0.0002)


def test_the_fluid_has_the_pressure_of_the_site():
    """An ideal gas at 80 kPa has 80/101.325 of the density at one atmosphere, here within its compressibility."""
    survey = survey_with("fluid: air", "temperature: 15 degC")
    thin = fluid_of(survey, [], site=site_of(survey, vx.Site(ambient_pressure=80e3, orientation="air")))
    assert thin.density.value == pytest.approx(vx.air(15.0).density.value * 80.0 / 101.325, rel=1e-3)


def test_a_given_fluid_counts_as_a_whole_and_what_it_contradicts_is_said():
    said = []
    fluid = fluid_of(BENCH, said, given=vx.air(20.0))
    assert fluid == vx.air(20.0)
    assert len(said) == 1
    assert "not what the survey states: fluid water, temperature 15" in said[0]
    said = []
    fluid_of(BENCH, said, given=vx.water(15.0))
    assert said == []


def test_properties_that_the_survey_states_replace_those_of_the_equations():
    said = []
    survey = survey_with(
        "fluid: water", "temperature: 15 degC", "density: 850 ± 2 kg/m3", "viscosity: 2e-6 m2/s",
        "vapour pressure: 3.1 kPa", "surface tension: 0.05 N/m",
    )  # fmt: skip
    fluid = fluid_of(survey, said)
    assert (fluid.density.value, fluid.density.uncertainty) == (850.0, 2.0)
    assert fluid.kinematic_viscosity.value == pytest.approx(2e-6)
    assert fluid.vapour_pressure.value == pytest.approx(3100.0)
    assert fluid.surface_tension.value == 0.05
    assert fluid.source.endswith(
        "Stated in the survey: density and kinematic viscosity and vapour pressure and surface tension."
    )
    assert said[0].startswith(
        "The density is 850.0 ± 2.0 kg/m³, as stated in the survey; the equations of water give 999"
    )
    assert len(said) == 4


def test_a_property_that_the_fluid_does_not_have_is_said():
    said = []
    fluid = fluid_of(survey_with("fluid: air", "temperature: 15 degC", "vapour pressure: 2 kPa"), said)
    assert fluid.is_gas
    assert "which air does not have: not used" in said[0]


def test_the_appraisal_uses_site_and_facts_together():
    line = np.linspace(-0.06, 0.06, 41)
    vortex = vx.Vortex("lamb-oseen", circulation=0.3, core_radius=0.01)
    survey = vx.Survey.traverse(
        position=line, velocity=vortex.velocity(line, 0.0 * line)[1], uncertainty=0.02, miss_distance=0.0,
        fluid="water", temperature=288.15, ambient_pressure=150e3, density=850.0,
    )  # fmt: skip
    found = vx.appraise(survey, site=vx.Site(gas_saturation=1.0), models="lamb-oseen")
    assert found.site.gas_saturation == 1.0
    drop = np.log(2.0) * 850.0 * (0.3 / (2.0 * np.pi * 0.01)) ** 2  # centre of Lamb-Oseen, ρ V² ln 2 (derived)
    assert found.core_pressure_drop.value == pytest.approx(drop, rel=0.01)
    assert found.core_pressure.value == pytest.approx(150e3 - found.core_pressure_drop.value, abs=1.0)
    assert any("The density is 850" in sentence for sentence in found.assumptions)
