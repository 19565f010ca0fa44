"""Surveys in the forms people have them, appraised without editing; the truth that made each is in truth.json."""

import json
from pathlib import Path

import pytest

import vortexwidgets as vx

FOLDER = Path(__file__).parent / "strangers"
TRUTH = json.loads((FOLDER / "truth.json").read_text())


@pytest.mark.parametrize("name", TRUTH)
def test_circulation_and_core_radius_lie_within_their_limits(name):
    truth = TRUTH[name]
    appraisal = vx.appraise(vx.read_survey(FOLDER / name))
    fit = appraisal.ranking[truth["model"]].fit
    assert not appraisal.ranking[truth["model"]].rejected
    for quantity in ("circulation", "core_radius"):
        low, high = fit.interval(quantity, 0.95)
        assert low <= truth[quantity] <= high, f"{quantity}: {low} to {high}, truth {truth[quantity]}"
    centre = truth["centre"] if isinstance(truth["centre"], list) else [truth["centre"]]
    for axis, value in zip(("centre_x", "centre_y"), centre, strict=False):
        low, high = fit.interval(axis, 0.999)
        assert low <= value <= high


def test_a_survey_that_never_enters_the_core_gives_limits():
    appraisal = vx.appraise(vx.read_survey(FOLDER / "never_in_the_core.csv"))
    truth = TRUTH["never_in_the_core.csv"]
    best = appraisal.ranking["lamb-oseen"]
    assert best.fit.undetermined == ("core_radius",)
    assert best.fit.interval("core_radius")[1] > truth["core_radius"]
    vortex = vx.Vortex("lamb-oseen", circulation=truth["circulation"], core_radius=truth["core_radius"])
    drop = appraisal.core_pressure_drop
    assert drop.bound == "lower"
    assert drop.value < vortex.pressure_drop(0.0, density=appraisal.fluid.density.value)
    assert "at least" in appraisal.answer


def test_the_planar_field_finds_its_background():
    fit = vx.appraise(vx.read_survey(FOLDER / "plane.csv")).ranking["lamb-oseen"].fit
    for name, value in zip(("background_x", "background_y"), TRUTH["plane.csv"]["background"], strict=True):
        low, high = fit.interval(name, 0.99)
        assert low <= value <= high


def test_spikes_are_set_aside_and_listed():
    appraisal = vx.appraise(vx.read_survey(FOLDER / "spikes.csv"))
    assert appraisal.survey.set_aside
    reasons = " ".join(appraisal.survey.set_aside.values()).lower()
    assert "median" in reasons or "outlier" in reasons


def test_a_line_that_may_have_missed_the_axis_gives_a_lower_bound():
    appraisal = vx.appraise(vx.read_survey(FOLDER / "plain.csv"))
    assert appraisal.core_pressure_drop.bound == "lower"
    assert appraisal.centred_drop.is_determined
    assert any("missed the axis" in caution for caution in appraisal.cautions)
    assert any("fluid was not stated" in sentence for sentence in appraisal.assumptions)
