import numpy as np
import pytest

from vortexwidgets.survey.screening import screen
from vortexwidgets.survey.survey import Survey


def lamb_oseen(radius, core_radius=1.0):
    """Unit circulation; H. Lamb, Hydrodynamics, 6th ed. (1932), art. 334a."""
    radius = np.maximum(np.abs(radius), 1e-12)
    return -np.expm1(-((radius / core_radius) ** 2)) / (2.0 * np.pi * radius)


def line(position, noise=0.0, seed=0, **changes):
    velocity = np.sign(position) * lamb_oseen(position)
    velocity = velocity + noise * np.random.default_rng(seed).standard_normal(position.size)
    return Survey.traverse(position=position, velocity=velocity, **changes)


@pytest.mark.parametrize("spacing", [0.1, 0.5, 1.0, 2.0, 3.0, 5.0, 8.0])
@pytest.mark.parametrize("offset", [0.0, 0.3, 0.5, 0.9])
def test_the_steep_core_of_a_coarse_traverse_is_no_outlier(spacing, offset):
    position = (np.arange(-15, 16) + offset) * spacing
    assert screen(line(position)).outliers == ()
    assert screen(line(position, noise=0.003, seed=5)).outliers == ()


@pytest.mark.parametrize("spacing", [0.15, 0.5, 1.0, 2.5])
def test_a_coarse_plane_keeps_its_core(spacing):
    x, y = np.meshgrid((np.arange(-8, 9) + 0.35) * spacing, (np.arange(-8, 9) - 0.2) * spacing)
    radius = np.hypot(x, y)
    speed = lamb_oseen(radius)
    survey = Survey.plane(x=x, y=y, u=-speed * y / radius, v=speed * x / radius)
    assert screen(survey).outliers == ()


@pytest.mark.parametrize("velocity", [np.zeros(25), np.full(25, 2.0), np.linspace(-1.0, 1.0, 25)])
def test_no_flow_a_uniform_one_and_a_shear_have_no_outliers(velocity):
    survey = Survey.traverse(position=np.linspace(-1.0, 1.0, 25), velocity=velocity)
    assert screen(survey).outliers == ()


def test_good_samples_are_rarely_lost():
    # 200 traverses of 60 stations, noise 2 % of the peak (0.638 / 2π): at most one good sample in ten thousand.
    position = np.linspace(-8.0, 8.0, 60)
    lost = sum(len(screen(line(position, noise=0.02 * 0.1015, seed=seed)).outliers) for seed in range(200))
    assert lost <= 1


@pytest.mark.parametrize("index", [3, 25, 30, 31, 40, 59])
def test_a_gross_error_is_found_wherever_it_sits(index):
    position = np.linspace(-8.0, 8.0, 60)
    clean = line(position, noise=0.002, seed=1)
    velocity = np.array(clean.velocity)
    velocity[index] += 0.7  # seven times the peak
    found = screen(Survey.traverse(position=position, velocity=velocity))
    assert found.outliers == (index,)
    assert found.points == 59
    assert "1 outlier is set aside" in found.sentences[0]
    assert "Westerweel" in found.survey.set_aside[index]


def test_a_wrong_vector_of_a_plane_goes_with_both_components():
    x, y = np.meshgrid(np.arange(-5.0, 5.5, 0.5), np.arange(-5.0, 5.5, 0.5))
    radius = np.maximum(np.hypot(x, y), 1e-9)
    speed = lamb_oseen(radius)
    u, v = -speed * y / radius, speed * x / radius
    u[3, 4] = 2.0
    found = screen(Survey.plane(x=x, y=y, u=u, v=v))
    index = 3 * 21 + 4
    assert found.outliers == (index, index + 441)


def test_the_second_component_is_screened_by_itself():
    position = np.linspace(-5.0, 5.0, 41)
    along = np.full(41, 0.01)
    along[7] = 3.0
    assert screen(line(position, along=along)).outliers == (41 + 7,)


def test_few_points_inside_a_short_reach_and_a_gap_are_said():
    position = np.concatenate([np.arange(-2.5, -0.9, 0.3), np.arange(1.0, 2.6, 0.3)])
    found = screen(line(position), centre=(0.0, 0.0), peak_radius=1.1209)
    text = " ".join(found.sentences)
    assert found.inside_core == 2
    assert "Only 2 stations lie inside the core" in text
    assert "reaches 2.2 peak radii" in text
    assert "A gap of 2 m near the core" in text


def test_a_radial_survey_knows_its_centre_and_an_unknown_one_is_not_guessed():
    radius = np.linspace(0.1, 5.0, 30)
    known = screen(Survey.radial(radius=radius, swirl=lamb_oseen(radius)), peak_radius=1.1209)
    assert known.reach == pytest.approx(5.0 / 1.1209)
    assert known.inside_core == 7  # 0.1 + 0.169 n < 1.1209 for n = 0 to 6
    unknown = screen(line(np.linspace(-3, 3, 20)), peak_radius=1.0)
    assert unknown.inside_core is None
    assert np.isnan(unknown.reach)


def test_zeros_that_may_be_masks_are_said():
    x, y = np.meshgrid(np.arange(5.0), np.arange(5.0))
    u = np.ones((5, 5))
    u[0] = 0.0
    found = screen(Survey.plane(x=x, y=y, u=u, v=u))
    assert any("10 samples are exactly zero" in sentence for sentence in found.sentences)


def test_samples_set_aside_by_hand_stay_aside():
    survey = line(np.linspace(-5.0, 5.0, 41)).without([4], "by hand")
    found = screen(survey)
    assert found.survey.set_aside == {4: "by hand"}
    assert found.points == 40
