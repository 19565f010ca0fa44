"""The iteration: its minimum, its shortcuts against the long way, and the cases that have no answer."""

import math

import numpy as np
import pytest
from scipy.optimize import least_squares

import vortexwidgets as vx
from vortexwidgets.fitting.problem import Problem, lay_out
from vortexwidgets.fitting.separable import SHAPE_BOUNDS, misfit, solve


def line(key="lamb-oseen", noise=0.0, uncertainty=0.4, seed=0, points=41, **given):
    """An invented traverse at 0.1 m and its problem."""
    generator = np.random.default_rng(seed)
    position = np.linspace(-0.1, 0.1, points)
    vortex = vx.Vortex(key, swirl_scale=26.0, core_radius=0.012, centre=(0.0031, 0.0), **given)
    velocity = vortex.velocity(position, np.zeros(points))[1] + generator.normal(0.0, noise, points)
    survey = vx.Survey.traverse(position=position, velocity=velocity, uncertainty=uncertainty, miss_distance=0.0)
    return Problem(lay_out(survey), vx.MODELS[key])


def residuals(problem, free, start, tie=None):
    """Residuals of all parameters at once, as an optimiser wants them that knows nothing of separation."""
    background = problem.samples.background

    def function(parameters):
        here = list(start)
        for index, value in zip(free, parameters[1 + len(background) :], strict=True):
            here[index] = value
        response, _ = problem.columns(here, ())
        rest = problem.samples.target - parameters[0] * response - parameters[1 : 1 + len(background)] @ background
        if problem.samples.prior is not None:
            index, value, uncertainty = problem.samples.prior
            rest = np.append(rest, (here[index] - value) / uncertainty)
        return rest

    return function


def polished(problem, free, solution):
    """scipy.optimize.least_squares from another start, to its last digit."""
    first = np.array([*solution.linear, *(solution.nonlinear[i] for i in free)])
    return least_squares(
        residuals(problem, free, solution.nonlinear),
        first * 1.02,
        jac="3-point",
        method="lm",
        x_scale=np.abs(first) + 1e-3,
        ftol=1e-15,
        xtol=1e-15,
        gtol=1e-15,
    )


def agrees(problem, free, solution):
    other = polished(problem, free, solution)
    ours = [*solution.linear, *(solution.nonlinear[i] for i in free)]
    uncertainty = np.sqrt(np.diag(np.linalg.inv(other.jac.T @ other.jac)))
    assert solution.converged
    assert np.max(np.abs(ours - other.x) / uncertainty) < 3e-6
    assert solution.chi_square == pytest.approx(2.0 * other.cost, rel=1e-9)


@pytest.mark.parametrize("key", ["lamb-oseen", "kaufmann", "taylor", "vatistas"])
@pytest.mark.parametrize("noise", [0.1, 0.5, 2.0])
def test_minimum_equals_that_of_an_optimiser_without_separation(key, noise):
    problem = line(key, noise)
    shape = [parameter.default for parameter in problem.model.shape]
    free = (0, 2) if not shape else (0, 2, 3)
    agrees(problem, free, solve(problem, [0.002, 0.0, 0.0135, *shape], free))


@pytest.mark.parametrize("background", ["uniform", "linear"])
def test_background_is_eliminated_with_the_strength(background):
    generator = np.random.default_rng(3)
    x, y = (a.ravel() for a in np.meshgrid(np.linspace(-3, 3, 9), np.linspace(-2.5, 3.1, 8)))
    u, v = vx.Vortex("kaufmann", swirl_scale=2.0, core_radius=1.1, centre=(0.3, -0.2)).velocity(x, y)
    u, v = u + 0.4 + generator.normal(0.0, 0.1, x.size), v - 0.2 + 0.1 * x + generator.normal(0.0, 0.1, x.size)
    survey = vx.Survey.plane(x=x, y=y, u=u, v=v, uncertainty=0.1)
    problem = Problem(lay_out(survey, background=background), vx.MODELS["kaufmann"])
    agrees(problem, (0, 1, 2), solve(problem, [0.1, 0.0, 1.3], (0, 1, 2)))


def test_what_is_known_beforehand_pulls_like_a_sample():
    generator = np.random.default_rng(4)
    position = np.linspace(-3.0, 3.0, 41)
    v = vx.Vortex("lamb-oseen", swirl_scale=2.0, core_radius=0.8, centre=(0.1, 0.3)).velocity(position, 0.0 * position)[
        1
    ]
    survey = vx.Survey.traverse(
        position=position, velocity=v + generator.normal(0.0, 0.05, 41), uncertainty=0.05, miss_distance=(0.2, 0.1)
    )
    problem = Problem(lay_out(survey), vx.MODELS["lamb-oseen"])
    agrees(problem, (0, 1, 2), solve(problem, [0.0, 0.2, 1.0], (0, 1, 2)))


@pytest.mark.parametrize("key", ["lamb-oseen", "kaufmann", "rankine", "taylor"])
def test_samples_without_noise_give_the_vortex_back(key):
    problem = line(key)
    solution = solve(problem, [0.002, 0.0, 0.0135], (0, 2))
    assert solution.converged
    assert [solution.linear[0], *solution.nonlinear] == pytest.approx([26.0, 0.0031, 0.0, 0.012], rel=1e-9, abs=1e-12)
    assert solution.chi_square < 1e-12


def test_a_model_that_does_not_fit_converges_all_the_same():
    samples = line("rankine", 0.1).samples
    problem = Problem(samples, vx.MODELS["taylor"])
    agrees(problem, (0, 2), solve(problem, [0.002, 0.0, 0.0135], (0, 2)))


def test_a_centre_on_a_sample_has_no_swirl_there():
    position = np.linspace(-3.0, 3.0, 41)
    survey = vx.Survey.traverse(position=position, velocity=position, uncertainty=0.1, miss_distance=0.0)
    problem = Problem(lay_out(survey), vx.MODELS["lamb-oseen"])
    response, (by_centre, by_radius) = problem.columns([position[7], 0.0, 1.0], (0, 2))
    near, (near_centre, near_radius) = problem.columns([position[7] + 1e-9, 0.0, 1.0], (0, 2))
    np.testing.assert_allclose([response, by_centre, by_radius], [near, near_centre, near_radius], atol=1e-7)


def test_a_parameter_that_does_not_matter_is_left_where_it_was():
    problem = line(noise=0.3)
    general = solve(problem, [0.002, 0.0, 0.0135], (0, 1, 2))  # on a line through the axis the miss distance is flat
    assert general.converged
    assert general.nonlinear[1] == 0.0
    assert general.nonlinear == pytest.approx(solve(problem, [0.002, 0.0, 0.0135], (0, 2)).nonlinear, rel=1e-8)
    assert math.isinf(general.inverse[2][2])
    assert np.isfinite([general.inverse[i][i] for i in (0, 1, 3)]).all()


def test_no_signal_is_no_vortex_and_no_error():
    survey = vx.Survey.traverse(
        position=np.linspace(-1.0, 1.0, 9), velocity=np.zeros(9), uncertainty=0.1, miss_distance=0.0
    )
    solution = solve(Problem(lay_out(survey), vx.MODELS["lamb-oseen"]), [0.1, 0.0, 0.3], (0, 2))
    assert solution.converged
    assert solution.swirl_scale == 0.0
    assert solution.nonlinear == [0.1, 0.0, 0.3]


def test_a_shape_parameter_stops_at_its_bound_and_the_rest_goes_on():
    problem = Problem(line("rankine", 0.2, points=60).samples, vx.MODELS["vatistas"])
    free = (0, 2, 3)
    solution = solve(problem, [0.003, 0.0, 0.012, 20.0], free)
    assert solution.converged
    if solution.nonlinear[3] == SHAPE_BOUNDS[1]:  # there the profile is Rankine's
        held = solve(problem, solution.nonlinear, (0, 2))
        assert solution.nonlinear == pytest.approx(held.nonlinear, rel=1e-5)
        assert solution.linear == pytest.approx(held.linear, rel=1e-5)


def test_a_tie_holds_the_strength_while_the_rest_follows():
    problem = line(noise=0.4)
    circulation = 1.9

    def tie(core_radius, _shape):
        return circulation / (2.0 * math.pi * core_radius), [-1.0]

    solution = solve(problem, [0.002, 0.0, 0.0135], (0, 2), tie)

    def function(parameters):
        response, _ = problem.columns([parameters[0], 0.0, parameters[1]], ())
        return problem.samples.target - circulation / (2.0 * math.pi * parameters[1]) * response

    other = least_squares(
        function, [0.003, 0.012], jac="3-point", method="lm", x_scale=[0.01, 0.01], ftol=1e-15, xtol=1e-15, gtol=1e-15
    )
    assert solution.converged
    assert [solution.nonlinear[0], solution.nonlinear[2]] == pytest.approx(other.x, rel=1e-7)
    assert solution.chi_square == pytest.approx(2.0 * other.cost, rel=1e-10)
    assert 2.0 * math.pi * solution.nonlinear[2] * solution.swirl_scale == pytest.approx(circulation, rel=1e-12)


def test_covariance_and_jacobian_belong_to_the_minimum():
    problem = line(noise=0.5)
    solution = solve(problem, [0.002, 0.0, 0.0135], (0, 2))
    rows = solution.jacobian
    assert solution.normal == pytest.approx(rows @ rows.T, rel=1e-5, abs=1e-5)
    assert np.array(solution.inverse) == pytest.approx(np.linalg.inv(solution.normal), rel=1e-9)
    assert misfit(problem, solution.nonlinear) == pytest.approx(solution.chi_square, rel=1e-9)
