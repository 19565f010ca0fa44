"""The three core drops, what lies beyond the survey, and the drop straight from the data."""

import math

import numpy as np
import pytest

import vortexwidgets as vx
from vortexwidgets.core_pressure import combined_drop, core_pressure_of, mean_swirl
from vortexwidgets.data_drop import data_drop
from vortexwidgets.uncertainty import Estimate

UNIT = vx.Vortex("lamb-oseen", circulation=2 * math.pi, core_radius=1.0)


@pytest.mark.parametrize(("wander", "tap", "naive"), [(0.3, 0.890, 0.847), (0.6, 0.689, 0.581), (1.0, 0.475, 0.333)])
def test_fractions_of_a_wandering_lamb_oseen_vortex(wander, tap, naive):
    """Closed forms: the mean profile is Lamb-Oseen with core_radius² + 2σ² (Devenport et al. 1996), so its share is
    1/(1 + 2σ²); the tap's is the Gaussian mean of the pressure (derived, to the three digits quoted)."""
    drops = vx.core_drops(UNIT, density=1.0, wander=wander)
    deepest = drops["instantaneous vortex"]
    assert deepest == pytest.approx(math.log(2), rel=1e-12)
    assert drops["mean pressure at a fixed point"] / deepest == pytest.approx(tap, abs=5e-4)
    assert drops["mean profile"] / deepest == pytest.approx(naive, abs=5e-4)
    assert drops["mean profile"] / deepest == pytest.approx(1 / (1 + 2 * wander**2), rel=1e-6)


def test_the_tap_reads_the_mean_of_the_fluctuating_balance():
    """At σ = 0.3 the terms of the fluctuating radial balance, 0.5874 + 0.0654 - 0.0362 = 0.6166, are the Gaussian mean.

    Derived, recomputed independently.
    """
    drops = vx.core_drops(UNIT, density=1.0, wander=0.3)
    assert drops["mean pressure at a fixed point"] == pytest.approx(0.6166, abs=5e-5)
    assert drops["mean profile"] == pytest.approx(0.5874, abs=5e-5)


@pytest.mark.parametrize(("beyond", "share"), [(2, 14.3), (3, 6.4), (5, 2.3), (10, 0.6)])
def test_share_beyond_the_survey_of_lamb_oseen(beyond, share):
    """Derived from the closed form, in peak radii and per cent."""
    assert 100 * vx.share_beyond(UNIT, beyond * UNIT.peak_radius) == pytest.approx(share, abs=0.05)


def test_mean_swirl_is_the_closed_form():
    radius = np.array([0.0, 0.02, 0.5, 1.0, 3.0, 12.0])
    wide = vx.Vortex("lamb-oseen", circulation=2 * math.pi, core_radius=math.sqrt(1 + 2 * 0.6**2))
    np.testing.assert_allclose(mean_swirl(UNIT, radius, wander=0.6), wide.swirl(radius), rtol=1e-9, atol=1e-12)


def test_mean_swirl_of_a_kink_against_plane_quadrature():
    """Rankine averaged over the plane by brute force (scipy.integrate.dblquad)."""
    from scipy.integrate import dblquad

    rankine = vx.Vortex("rankine", circulation=2 * math.pi, core_radius=1.0)
    r, sigma = 0.9, 0.4

    def integrand(angle, s):
        x, y = r - s * math.cos(angle), -s * math.sin(angle)
        return rankine.velocity(x, y)[1] * s / (2 * math.pi * sigma**2) * math.exp(-(s**2) / (2 * sigma**2))

    expected = dblquad(integrand, 0, 9 * sigma, 0, 2 * math.pi, epsabs=1e-7)[0]
    assert mean_swirl(rankine, r, wander=sigma) == pytest.approx(expected, abs=1e-5)


def test_without_wander_the_three_are_equal():
    assert len(set(vx.core_drops(UNIT, density=2.0).values())) == 1


def survey(noise=0.02, seed=1, points=80, span=10.0, gain=0.0):
    radius = np.linspace(0.05, span, points)
    scatter = noise * UNIT.peak_swirl
    swirl = UNIT.swirl(radius) + scatter * np.random.default_rng(seed).normal(size=points)
    return vx.Survey.radial(radius=radius, swirl=swirl, uncertainty=scatter, velocity_gain=(1.0, gain))


def test_velocity_gain_enters_the_drop_twice():
    """u(Δp)/Δp = 2 u(gain): Δp goes with the square of velocity (derived)."""
    ranking = vx.rank_models(survey(), ["lamb-oseen"])
    exact = Estimate(1.0, 0.0, "density")
    drop, _ = combined_drop(ranking.supported, density=exact, gain=Estimate(1.0, 0.05, "velocity_gain"))
    parts = {part.name: part.uncertainty for part in drop.budget}
    assert parts["velocity gain"] == pytest.approx(0.1 * drop.value, rel=1e-9)
    assert drop.uncertainty == pytest.approx(math.sqrt(sum(u**2 for u in parts.values())), rel=1e-12)
    low, high = drop.interval(0.95)
    assert (high - low) / 2 == pytest.approx(1.96 * drop.uncertainty, rel=0.03)


def test_the_spread_between_models_is_in_the_budget_and_the_envelope():
    radius = np.linspace(1.2, 6.0, 40)
    outer = vx.Survey.radial(radius=radius, swirl=UNIT.swirl(radius), uncertainty=0.1 * UNIT.peak_swirl)
    ranking = vx.rank_models(outer, ["lamb-oseen", "kaufmann"])
    exact = Estimate(1.0, 0.0, "density")
    drop, (low, high) = combined_drop(ranking.supported, density=exact, gain=exact)
    assert high / low > 1.5
    rows = ranking.supported
    weights = np.array([row.weight for row in rows]) / sum(row.weight for row in rows)
    singles = [row.fit.core_pressure_drop(1.0) for row in rows]
    mean = sum(w * d.value for w, d in zip(weights, singles, strict=True))
    variance = sum(w * (d.uncertainty**2 + (d.value - mean) ** 2) for w, d in zip(weights, singles, strict=True))
    assert drop.value == pytest.approx(mean)
    assert drop.uncertainty == pytest.approx(math.sqrt(variance))


def test_data_only_drop_agrees_and_shows_its_shares():
    fit = vx.fit_survey(survey(), "lamb-oseen")
    model = fit.core_pressure_drop(1.0)
    data = data_drop(survey(), fit, density=Estimate(1.0, 0.0), model_drop=model)
    assert data.measured + data.towards_axis + data.beyond == pytest.approx(data.estimate.value)
    assert data.estimate.value == pytest.approx(math.log(2), rel=0.05)
    assert "agrees" in " ".join(data.sentences)


def test_noise_does_not_bias_the_data_only_drop():
    """The variance of the noise is taken off v²; the mean over 200 surveys must not lie above the truth."""
    drops = []
    for seed in range(200):
        noisy = survey(noise=0.15, seed=seed)
        fit = vx.fit_survey(noisy, "lamb-oseen")
        drops.append(
            data_drop(noisy, fit, density=Estimate(1.0, 0.0), model_drop=fit.core_pressure_drop(1.0)).estimate.value
        )
    assert np.mean(drops) == pytest.approx(math.log(2), rel=0.05)


def test_a_disagreement_between_data_and_models_is_a_warning():
    fit = vx.fit_survey(survey(), "lamb-oseen")
    wrong = Estimate(2.0, 0.01, "core_pressure_drop")
    data = data_drop(survey(), fit, density=Estimate(1.0, 0.0), model_drop=wrong)
    assert any(sentence.startswith("Warning") for sentence in data.sentences)


@pytest.mark.parametrize(("drop", "excess"), [(5000.0, 1.7), (8300.0, 2.9), (21500.0, 7.4)])
def test_a_gas_expands_on_its_way_to_the_axis(drop, excess):
    """The true drop is this many per cent of it smaller than that at constant density, in air (derived, γ = 1.4)."""
    pressure = core_pressure_of(Estimate(drop, 1.0), Estimate(101325.0, 0.0), heat_capacity_ratio=1.4)
    assert 100 * (1 - (101325.0 - pressure.value) / drop) == pytest.approx(excess, abs=0.06)


def test_a_lower_bound_of_the_drop_is_an_upper_bound_of_the_pressure():
    pressure = core_pressure_of(Estimate(5000.0, math.nan, bound="lower"), Estimate(101325.0, 10.0))
    assert pressure.bound == "upper"
    # 1.96 standard uncertainties of the reference on the safe side.
    assert pressure.value == pytest.approx(96325.0 + 19.6, abs=0.01)


def test_core_pressure_keeps_the_budget_and_adds_the_reference():
    ranking = vx.rank_models(survey(gain=0.01), ["lamb-oseen"])
    drop, _ = combined_drop(ranking.supported, density=Estimate(998.0, 0.5), gain=Estimate(1.0, 0.01))
    pressure = core_pressure_of(drop, Estimate(101325.0, 200.0))
    parts = {part.name: part.uncertainty for part in pressure.budget}
    assert parts["reference pressure"] == 200.0
    assert {"scatter of the samples", "choice of model", "velocity gain", "density"} <= parts.keys()
    assert pressure.uncertainty == pytest.approx(math.sqrt(sum(u**2 for u in parts.values())))
