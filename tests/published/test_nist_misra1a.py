"""NIST StRD Misra1a read as a Lamb-Oseen survey.

With x = r² and y = circulation within r, y = b1 (1 - exp(-b2 x)) is the Lamb-Oseen circulation law, so the certified
values fix the circulation b1, the core radius b2^(-1/2) and both standard uncertainties.

Source: National Institute of Standards and Technology, Statistical Reference Datasets, nonlinear regression, Misra1a
(public domain). Provenance: opened.
"""

import math

import numpy as np
import pytest

import vortexwidgets as vx

X = np.array([77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0])
Y = np.array([10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78])

CIRCULATION, CIRCULATION_UNCERTAINTY = 238.94212918, 2.7070075241
B2, B2_UNCERTAINTY = 5.5015643181e-4, 7.2668688436e-6
CORE_RADIUS = B2**-0.5
CORE_RADIUS_UNCERTAINTY = 0.5 * B2**-1.5 * B2_UNCERTAINTY
RESIDUAL_SUM = 0.12455138894


@pytest.fixture(scope="module")
def fit():
    radius = np.sqrt(X)
    # The circulation has equal scatter, so the swirl y / (2πr) is known to 1 / (2πr) times it.
    survey = vx.Survey.radial(radius=radius, swirl=Y / (2 * np.pi * radius), uncertainty=1 / (2 * np.pi * radius))
    return vx.fit_survey(survey, "lamb-oseen", uncertainties="relative")


@pytest.mark.parametrize(
    ("name", "value", "uncertainty"),
    [
        ("circulation", CIRCULATION, CIRCULATION_UNCERTAINTY),
        ("core_radius", CORE_RADIUS, CORE_RADIUS_UNCERTAINTY),
        # α = 1.25643120862617 from e^α = 1 + 2α (derived); the certified value is that of the core radius.
        (
            "peak_radius",
            math.sqrt(1.25643120862617) * CORE_RADIUS,
            math.sqrt(1.25643120862617) * CORE_RADIUS_UNCERTAINTY,
        ),
    ],
)
def test_certified_values_to_eight_digits(fit, name, value, uncertainty):
    assert fit.value(name) == pytest.approx(value, rel=1e-8)
    assert fit.uncertainty(name) == pytest.approx(uncertainty, rel=1e-8)


def test_certified_residual_sum(fit):
    assert fit.chi_square == pytest.approx(RESIDUAL_SUM, rel=1e-9)
    assert fit.degrees_of_freedom == 12


@pytest.mark.parametrize("start", [{"core_radius": 100.0}, {"core_radius": 44.7}])
def test_both_certified_starts(fit, start):
    # Starts 1 and 2 of the file are b2 = 0.0001 and 0.0005, core radii of 100 and 44.7 (from memory).
    radius = np.sqrt(X)
    survey = vx.Survey.radial(radius=radius, swirl=Y / (2 * np.pi * radius), uncertainty=1 / (2 * np.pi * radius))
    again = vx.fit_survey(survey, "lamb-oseen", uncertainties="relative", start=start)
    assert again.value("circulation") == pytest.approx(CIRCULATION, rel=1e-8)
