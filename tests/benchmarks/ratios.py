"""Speed as ratios within one run, since machines are noisy.

    python tests/benchmarks/ratios.py

Every figure is the median of pairs measured one after the other. The last column is the mark the project sets itself.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time

import numpy as np
from scipy.optimize import curve_fit

import vortexwidgets as vx


def seconds(action, repeats):
    start = time.perf_counter()
    for _ in range(repeats):
        action()
    return (time.perf_counter() - start) / repeats


def paired(ours, theirs, repeats=40, rounds=25):
    """Median over rounds of theirs / ours, measured in turn."""
    ours(), theirs()
    pairs = [(seconds(ours, repeats), seconds(theirs, repeats)) for _ in range(rounds)]
    ratio = float(np.median([b / a for a, b in pairs]))
    return ratio, float(np.median([a for a, _ in pairs])), float(np.median([b for _, b in pairs]))


def traverse():
    """An invented traverse of 60 points with 3 % noise, and the NumPy model a user would write."""
    generator = np.random.default_rng(1)
    position = np.linspace(-0.1, 0.1, 60)

    def swirl(x, circulation, centre, core_radius):
        d = x - centre
        return circulation / (2 * np.pi * d) * -np.expm1(-(d**2) / core_radius**2)

    velocity = swirl(position, 2.0, 0.0031, 0.012) + generator.normal(0.0, 0.5, 60)
    return position, velocity, np.full(60, 0.5), swirl


def fit_ratio():
    position, velocity, uncertainty, swirl = traverse()
    survey = vx.Survey.traverse(position=position, velocity=velocity, uncertainty=uncertainty, miss_distance=0.0)
    start = {"circulation": 1.8, "centre_x": 0.002, "core_radius": 0.0135}
    first = list(start.values())

    def ours():
        fit = vx.fit_survey(survey, "lamb-oseen", start=start)
        return fit.values, fit.standard_uncertainties

    def theirs():
        values, covariance = curve_fit(swirl, position, velocity, p0=first, sigma=uncertainty, absolute_sigma=True)
        return values, np.sqrt(np.diag(covariance))

    reference = polished(swirl, position, velocity, uncertainty, first)
    errors = [float(np.max(np.abs(fit()[0] / reference - 1.0))) for fit in (ours, theirs)]
    return (*paired(ours, theirs), *errors)


def polished(swirl, position, velocity, uncertainty, values):
    """curve_fit restarted from its own end until its last digit is at rest."""
    for _ in range(5):
        values, _ = curve_fit(
            swirl, position, velocity, p0=values, sigma=uncertainty, absolute_sigma=True,
            ftol=1e-15, xtol=1e-15, gtol=1e-15,
        )  # fmt: skip
    return values


def first_fit_seconds():
    """One fit of a survey that was not fitted before: it is laid out first, which later fits of it are spared."""
    position, velocity, uncertainty, _ = traverse()
    times = []
    for _ in range(200):
        survey = vx.Survey.traverse(position=position, velocity=velocity, uncertainty=uncertainty, miss_distance=0.0)
        start = time.perf_counter()
        fit = vx.fit_survey(survey, "lamb-oseen", start={"centre_x": 0.002, "core_radius": 0.0135})
        fit.standard_uncertainties  # noqa: B018  (computed when asked for)
        times.append(time.perf_counter() - start)
    return float(np.median(times))


def kernel_ratio():
    x = np.linspace(1e-3, 8.0, 100_000)
    kernel = vx.MODELS["lamb-oseen"].kernel("swirl")
    return paired(lambda: kernel(x), lambda: -np.expm1(-(x**2)) / x, repeats=5)


def process_seconds(code, rounds=9):
    """Least wall time of a fresh interpreter, less that of an empty one."""

    def one(text):
        start = time.perf_counter()
        subprocess.run([sys.executable, "-c", text], check=True, capture_output=True)
        return time.perf_counter() - start

    return min(one(code) for _ in range(rounds)) - min(one("pass") for _ in range(rounds))


def main():
    ratio, ours, theirs, our_error, their_error = fit_ratio()
    print(f"{'':58}{'measured':>12}{'mark':>10}")
    print(f"{'one 60-point traverse with standard errors, times faster':58}{ratio:12.2f}{'2':>10}")
    print(f"{'   fit_survey / curve_fit, µs':58}{1e6 * ours:6.0f} /{1e6 * theirs:4.0f}")
    print(f"{'   largest relative difference from a polished fit':58}{our_error:12.1e}{'1e-8':>10}")
    print(f"{'   and that of curve_fit with its defaults':58}{their_error:12.1e}")
    print(f"{'   the first fit of a survey, µs':58}{1e6 * first_fit_seconds():6.0f}")
    ratio, _, _ = kernel_ratio()
    print(f"{'Lamb-Oseen kernel, 1e5 points, times hand-written NumPy':58}{ratio:12.2f}{'1.0':>10}")
    print(f"{'import vortexwidgets, s':58}{process_seconds('import vortexwidgets'):12.3f}{'0.15':>10}")
    with tempfile.TemporaryDirectory() as folder:
        start = time.perf_counter()
        command = [sys.executable, "-m", "vortexwidgets.command", "demo", "--folder", folder]
        subprocess.run(command, check=True, capture_output=True)
        print(f"{'vortexwidgets demo, s':58}{time.perf_counter() - start:12.1f}{'10':>10}")


if __name__ == "__main__":
    main()
