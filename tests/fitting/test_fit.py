"""fit_survey on surveys with a known truth."""

import dataclasses

import numpy as np
import pytest
from scipy.optimize import curve_fit, minimize

import vortexwidgets as vx
from vortexwidgets.models.catalogue import MODELS

FITTED = [key for key, model in MODELS.items() if model.ranked]


def truth(key, **changes):
    strength = {"circulation": 1.7} if MODELS[key].strength == "circulation" else {"swirl_scale": -14.0}
    shape = {"exponent": 1.6} if MODELS[key].shape else {}
    return vx.Vortex(key, core_radius=0.011, centre=(0.004, -0.002), **strength, **shape, **changes)


def plane(vortex, *, background=(0.0, 0.0), noise=0.0, seed=3, half=0.06, points=14, uncertainty=0.1):
    generator = np.random.default_rng(seed)
    x, y = (a.ravel() for a in np.meshgrid(np.linspace(-half, half, points), np.linspace(-half, half, points)))
    u, v = vortex.velocity(x, y)
    u = u + background[0] + noise * generator.normal(size=x.size)
    v = v + background[1] + noise * generator.normal(size=x.size)
    return vx.Survey.plane(x=x, y=y, u=u, v=v, uncertainty=uncertainty)


def line(vortex, *, noise=0.0, seed=3, points=60, uncertainty=0.1, along=True, half=0.09, **options):
    generator = np.random.default_rng(seed)
    position = np.linspace(-half, half, points)
    u, v = vortex.velocity(position, np.zeros(points))
    return vx.Survey.traverse(
        position=position,
        velocity=v + noise * generator.normal(size=points),
        along=u + noise * generator.normal(size=points) if along else None,
        uncertainty=uncertainty,
        **options,
    )


@pytest.mark.parametrize("key", FITTED)
@pytest.mark.parametrize("survey_of", [line, plane], ids=["line", "plane"])
def test_exact_data_give_back_the_vortex(key, survey_of):
    vortex = truth(key)
    fit = vx.fit_survey(survey_of(vortex), key, background="none")
    assert fit.converged
    assert fit.vortex.centre == pytest.approx(vortex.centre, abs=1e-8 * vortex.core_radius)
    assert fit.value("core_radius") == pytest.approx(vortex.core_radius, rel=1e-7)
    assert fit.value("peak_swirl") == pytest.approx(vortex.peak_swirl, rel=1e-7)
    assert fit.core_pressure_drop(998.0).value == pytest.approx(vortex.pressure_drop(0.0, density=998.0), rel=1e-7)
    for name, value in vortex.shape.items():
        assert fit.value(name) == pytest.approx(value, rel=1e-6)


@pytest.mark.parametrize("key", FITTED)
def test_a_radial_survey_knows_its_centre(key):
    vortex = dataclasses.replace(truth(key), centre=(0.0, 0.0))
    radius = np.linspace(0.001, 0.08, 40)
    fit = vx.fit_survey(vx.Survey.radial(radius=radius, swirl=vortex.swirl(radius), uncertainty=0.1), key)
    assert "centre_x" not in fit.names
    assert fit.centre == (0.0, 0.0)
    assert fit.value("core_radius") == pytest.approx(vortex.core_radius, rel=1e-7)


def test_background_gain_and_centre_are_found_together():
    vortex = truth("lamb-oseen")
    fit = vx.fit_survey(plane(vortex, background=(0.4, -0.2)), "lamb-oseen")
    assert fit.background == "uniform"
    assert fit.value("background_x") == pytest.approx(0.4, rel=1e-7)
    assert fit.value("background_y") == pytest.approx(-0.2, rel=1e-7)
    assert fit.value("circulation") == pytest.approx(1.7, rel=1e-7)


def test_linear_background_holds_a_shear():
    vortex = truth("kaufmann")
    survey = plane(vortex)
    sheared = dataclasses.replace(survey, velocity=survey.velocity + 3.0 * survey.y * survey.direction[:, 0])
    fit = vx.fit_survey(sheared, "kaufmann", background="linear")
    assert fit.value("gradient_xy") == pytest.approx(3.0, rel=1e-6)
    assert fit.value("gradient_yx") == pytest.approx(0.0, abs=1e-6)


@pytest.mark.parametrize("key", ["lamb-oseen", "kaufmann"])
def test_values_and_uncertainties_equal_those_of_an_independent_optimiser(key):
    """scipy.optimize.curve_fit on formulas written out here, polished to its last digit."""
    profile = {
        "lamb-oseen": lambda d, c: -np.expm1(-(d**2) / c**2) / d,
        "kaufmann": lambda d, c: d / (d**2 + c**2),
    }[key]

    def formula(x, circulation, centre, core_radius):
        return circulation / (2 * np.pi) * profile(x - centre, core_radius)

    vortex = dataclasses.replace(truth(key), centre=(0.0041, 0.0))
    survey = line(vortex, noise=0.4, uncertainty=0.4, along=False, miss_distance=0.0)
    fit = vx.fit_survey(survey, key)
    values, covariance = curve_fit(
        formula, survey.x, survey.velocity, p0=[1.5, 0.0, 0.01], sigma=survey.uncertainty, absolute_sigma=True,
        ftol=1e-15, xtol=1e-15, gtol=1e-15,
    )  # fmt: skip
    names = ["circulation", "centre_x", "core_radius"]
    # A centre near zero is compared with the core radius.
    assert [fit.value(name) for name in names] == pytest.approx(values, rel=1e-8, abs=1e-8 * 0.011)
    assert [fit.uncertainty(name) for name in names] == pytest.approx(np.sqrt(np.diag(covariance)), rel=1e-6)


@pytest.mark.parametrize(
    "name", ["circulation", "core_radius", "exponent", "centre_x", "peak_swirl", "core_pressure_drop"]
)
def test_profile_limits_equal_a_brute_force_profile(name):
    """The limit is where the smallest chi-square at a held quantity has risen by 1.96²; found here by a simplex."""
    vortex = truth("vatistas")
    survey = line(vortex, noise=2.0, uncertainty=2.0, seed=11)
    fit = vx.fit_survey(survey, "vatistas")

    def built(p):
        return vx.Vortex(
            "vatistas", circulation=p[0], core_radius=np.exp(p[1]), exponent=np.exp(p[2]), centre=(p[3], p[4])
        )

    def chi_square(p):
        u, v = built(p).velocity(survey.x, survey.y)
        model = u * survey.direction[:, 0] + v * survey.direction[:, 1]
        return np.sum(((survey.velocity - model) / survey.uncertainty) ** 2)

    def quantity(p):
        vortex = built(p)
        return {
            "circulation": p[0], "core_radius": np.exp(p[1]), "exponent": np.exp(p[2]), "centre_x": p[3],
            "peak_swirl": vortex.peak_swirl, "core_pressure_drop": float(vortex.pressure_drop(0.0, density=1.0)),
        }[name]  # fmt: skip

    best = [fit.value("circulation"), np.log(fit.value("core_radius")), np.log(fit.value("exponent")), *fit.centre]
    assert chi_square(best) == pytest.approx(fit.chi_square, rel=1e-9)
    low, high = fit.core_pressure_drop(1.0).interval(0.95) if name == "core_pressure_drop" else fit.interval(name)
    for edge in (low, high):
        # The excess of chi-square at the edge, by minimising with a stiff spring on the quantity.
        stiffness = 1e4 / (high - low) ** 2

        def penalised(p, edge=edge, stiffness=stiffness):
            return chi_square(p) + stiffness * (quantity(p) - edge) ** 2

        found = minimize(
            penalised,
            best,
            method="Nelder-Mead",
            options={"maxiter": 20000, "xatol": 1e-9, "fatol": 1e-9, "adaptive": True},
        )
        found = minimize(
            penalised, found.x, method="Nelder-Mead", options={"maxiter": 20000, "xatol": 1e-10, "fatol": 1e-10}
        )
        slip = stiffness * (quantity(found.x) - edge) ** 2
        assert chi_square(found.x) - fit.chi_square + 2 * slip == pytest.approx(1.959964**2, rel=0.02)


def test_relative_uncertainties_scale_with_the_scatter():
    survey = line(truth("lamb-oseen"), noise=0.3, uncertainty=0.1)
    absolute = vx.fit_survey(survey, "lamb-oseen", uncertainties="absolute")
    relative = vx.fit_survey(survey, "lamb-oseen", uncertainties="relative")
    ratio = relative.uncertainty("core_radius") / absolute.uncertainty("core_radius")
    assert ratio == pytest.approx(absolute.scatter, rel=1e-9)
    assert 2.5 < ratio < 3.5


def test_order_and_direction_of_the_traverse_do_not_matter():
    survey = line(truth("lamb-oseen"), noise=0.3)
    shuffled = np.random.default_rng(0).permutation(60)
    again = vx.Survey.traverse(
        position=survey.x[:60][shuffled],
        velocity=survey.velocity[:60][shuffled],
        along=survey.velocity[60:][shuffled],
        uncertainty=0.1,
    )
    one, two = vx.fit_survey(survey, "lamb-oseen"), vx.fit_survey(again, "lamb-oseen")
    assert two.values == pytest.approx(one.values, rel=1e-9)


def test_a_robust_loss_survives_spikes():
    survey = line(truth("lamb-oseen"), noise=0.1)
    spiked = dataclasses.replace(
        survey, velocity=np.where(np.arange(survey.velocity.size) % 17 == 3, 40.0, survey.velocity)
    )
    plain = vx.fit_survey(spiked, "lamb-oseen", on_failure="return")
    for loss in ("huber", "soft_l1"):
        robust = vx.fit_survey(spiked, "lamb-oseen", loss=loss)
        assert abs(robust.value("circulation") - 1.7) < 0.05
        assert abs(robust.value("circulation") - 1.7) < abs(plain.value("circulation") - 1.7)


def test_a_stated_miss_distance_enters_with_its_uncertainty():
    vortex = dataclasses.replace(truth("lamb-oseen"), centre=(0.002, 0.005))
    exact = line(vortex, along=False, miss_distance=0.005)
    fit = vx.fit_survey(exact, "lamb-oseen")
    assert fit.value("core_radius") == pytest.approx(0.011, rel=1e-7)
    assert fit.value("miss_distance") == 0.005
    doubtful = vx.fit_survey(line(vortex, along=False, miss_distance=(0.005, 0.001)), "lamb-oseen")
    assert doubtful.value("miss_distance") == pytest.approx(0.005, rel=1e-6)
    assert doubtful.uncertainty("core_radius") > 1.5 * fit.uncertainty("core_radius")


def test_a_miss_distance_may_be_nothing():
    """Where the axis may lie on either side of the line the smallest distance is zero."""
    vortex = dataclasses.replace(truth("lamb-oseen"), centre=(0.002, 0.0001))
    fit = vx.fit_survey(line(vortex, noise=0.3, uncertainty=0.3), "lamb-oseen")
    low, high = fit.interval("centre_y")
    assert low < 0.0 < high
    assert fit.interval("miss_distance") == (0.0, max(-low, high))


def test_an_unnoticed_miss_is_a_shallower_vortex():
    """Lamb-Oseen missed by half a core radius comes out 16 % too shallow (derived, quadrature at 50 digits)."""
    vortex = vx.Vortex("lamb-oseen", circulation=2 * np.pi, core_radius=1.0, centre=(0.0, 0.5))
    position = np.linspace(-6.0, 6.0, 121)
    survey = vx.Survey.traverse(
        position=position, velocity=vortex.velocity(position, np.zeros(121))[1], uncertainty=0.01
    )
    fit = vx.fit_survey(survey, "lamb-oseen", on_failure="return")
    assert fit.core_pressure_drop(1.0).value / vortex.pressure_drop(0.0, density=1.0) == pytest.approx(0.84, abs=0.01)


def test_a_survey_outside_the_core_gives_limits_and_no_number():
    vortex = dataclasses.replace(truth("lamb-oseen"), centre=(0.0, 0.0))
    radius = np.linspace(0.05, 0.12, 30)
    swirl = vortex.swirl(radius) + 0.05 * np.random.default_rng(1).normal(size=30)
    fit = vx.fit_survey(vx.Survey.radial(radius=radius, swirl=swirl, uncertainty=0.05), "lamb-oseen")
    assert fit.undetermined == ("core_radius",)
    assert np.isnan(fit.value("core_radius"))
    low, high = fit.interval("core_radius")
    assert low == 0.0
    assert 0.011 < high < 0.05
    assert fit.value("circulation") == pytest.approx(1.7, abs=4 * fit.uncertainty("circulation"))
    drop = fit.core_pressure_drop(1000.0)
    assert drop.bound == "lower"
    assert 0.0 < drop.value < vortex.pressure_drop(0.0, density=1000.0)
    assert "does not enter the core" in fit.status


@pytest.mark.parametrize("key", ["kaufmann", "lamb-oseen", "rankine", "vatistas"])
def test_every_model_names_a_limit_for_a_core_that_was_not_entered(key):
    """The upper limit lies above the truth and is a length; the core radius is a bound, never a number."""
    vortex = vx.Vortex("kaufmann", circulation=3.3, core_radius=0.009)
    radius = np.linspace(0.06, 0.3, 60)
    swirl = vortex.swirl(radius) + 0.7 * np.random.default_rng(1).normal(size=60)
    fit = vx.fit_survey(vx.Survey.radial(radius=radius, swirl=swirl, uncertainty=0.7), key)
    assert "core_radius" in fit.undetermined
    low, high = fit.interval("core_radius")
    assert low == 0.0
    assert 0.009 < high < 0.3
    assert fit.estimate("core_radius").bound == "upper"
    assert fit.core_pressure_drop(1000.0).bound == "lower"


def test_a_survey_inside_the_core_gives_no_circulation():
    vortex = dataclasses.replace(truth("lamb-oseen"), centre=(0.0, 0.0))
    radius = np.linspace(0.0002, 0.002, 30)
    swirl = vortex.swirl(radius) + 0.05 * np.random.default_rng(1).normal(size=30)
    fit = vx.fit_survey(vx.Survey.radial(radius=radius, swirl=swirl, uncertainty=0.05), "lamb-oseen")
    assert set(fit.undetermined) == {"core_radius", "circulation"}
    assert np.isinf(fit.interval("core_radius")[1])
    assert "does not reach outside the core" in fit.status


def test_no_vortex_is_said_and_not_fitted():
    generator = np.random.default_rng(4)
    survey = vx.Survey.traverse(position=np.linspace(-1, 1, 40), velocity=generator.normal(size=40), uncertainty=1.0)
    with pytest.raises(vx.FitError, match="No vortex is seen"):
        vx.fit_survey(survey, "lamb-oseen")
    fit = vx.fit_survey(survey, "lamb-oseen", on_failure="return")
    assert fit.status.startswith("No vortex is seen")
    assert all(np.isnan(fit.values))


def test_held_parameters_are_not_moved():
    survey = line(truth("vatistas"), noise=0.2)
    fit = vx.fit_survey(survey, "vatistas", fixed={"exponent": 2.0, "centre_y": 0.0})
    assert fit.value("exponent") == 2.0
    assert fit.uncertainty("exponent") == 0.0
    assert "exponent" not in fit.names


def test_samples_set_aside_are_not_used():
    survey = line(truth("lamb-oseen"))
    spoiled = dataclasses.replace(survey, velocity=np.where(np.arange(120) == 40, 900.0, survey.velocity))
    fit = vx.fit_survey(spoiled.without([40], reason="spike"), "lamb-oseen")
    assert fit.value("circulation") == pytest.approx(1.7, rel=1e-7)
    assert fit.residuals.shape == (119,)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"model": "free"}, "cannot be fitted"),
        ({"model": "forced"}, "cannot be fitted"),
        ({"model": "no such"}, "No model named"),
        ({"background": "cubic"}, "background must be"),
        ({"uncertainties": "guess"}, "uncertainties must be"),
        ({"loss": "cauchy"}, "loss must be"),
        ({"start": {"radius": 1.0}}, "No parameter 'radius'"),
        ({"fixed": {"exponent": 2.0}}, "No parameter 'exponent'"),
        ({"fixed": {"core_radius": -1.0}}, "fixed: core_radius must be positive, got -1 m"),
        ({"fixed": {"core_radius": np.inf}}, "fixed: core_radius must be a finite number"),
        ({"start": {"core_radius": -1.0}}, "start: core_radius must be positive, got -1 m"),
        ({"start": {"centre_x": np.nan}}, "start: centre_x must be a finite number"),
        ({"model": "vatistas", "start": {"exponent": -1.0}}, "start: exponent must be positive, got -1"),
        ({"model": "vatistas", "start": {"exponent": 2000.0}}, "exponent of Vatistas must lie between 0 and 1000"),
        ({"model": 3}, "A model is named by text, got 3"),
    ],
)
def test_refusals(options, message):
    survey = line(truth("lamb-oseen"))
    arguments = {"model": "lamb-oseen", **options}
    with pytest.raises(ValueError, match=message):
        vx.fit_survey(survey, **arguments)


def test_too_few_points_are_refused_with_the_numbers():
    survey = vx.Survey.traverse(position=[0.01, 0.02, 0.03], velocity=[1.0, 0.8, 0.7], uncertainty=0.1)
    with pytest.raises(ValueError, match="3 points but Vatistas has 4 free parameters"):
        vx.fit_survey(survey, "vatistas")


def test_absolute_needs_a_stated_uncertainty():
    survey = vx.Survey.radial(radius=[0.01, 0.02, 0.03, 0.04], swirl=[1.0, 0.8, 0.6, 0.5])
    with pytest.raises(ValueError, match="states no uncertainty"):
        vx.fit_survey(survey, "lamb-oseen", uncertainties="absolute")
    assert vx.fit_survey(survey, "lamb-oseen", on_failure="return").uncertainties == "relative"


def test_instrument_is_corrected_for_inside_the_fit():
    """Lamb-Oseen under wander is Lamb-Oseen with core_radius² + 2σ² (Devenport et al. 1996, closed form, derived)."""
    vortex = truth("lamb-oseen")
    wander = 0.004
    seen = dataclasses.replace(vortex, core_radius=np.sqrt(vortex.core_radius**2 + 2 * wander**2))
    fit = vx.fit_survey(plane(seen), "lamb-oseen", instrument=vx.Instrument(wander=wander), background="none")
    assert fit.value("core_radius") == pytest.approx(vortex.core_radius, rel=1e-4)
    assert fit.value("circulation") == pytest.approx(1.7, rel=1e-5)
