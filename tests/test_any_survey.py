"""Whatever a survey holds, the appraisal ends in numbers or in a sentence, without a warning on the way."""

import numpy as np
import pytest

import vortexwidgets as vx

MODELS = ("lamb-oseen", "kaufmann", "vatistas", "taylor", "rankine")


def vortex_of(generator):
    key = str(generator.choice(MODELS))
    radius = 10 ** generator.uniform(-3, 1.5)
    numbers = (
        {"swirl_scale": generator.uniform(-30, 30)}
        if key == "taylor"
        else {"circulation": generator.normal() * radius * 50}
    )
    if key == "vatistas":
        numbers["exponent"] = 10 ** generator.uniform(-0.3, 1)
    centre = (generator.normal() * radius, generator.choice([0.0, 0.3, 1.0]) * generator.normal() * radius)
    return vx.Vortex(key, core_radius=radius, centre=centre, **numbers)


def survey_of(vortex, generator):
    """Few or many points, near or far, clean or drowned in noise, on a line, about the axis or in a plane."""
    count = int(generator.integers(4, 70))
    span = vortex.core_radius * 10 ** generator.uniform(-0.5, 1.3)
    x = np.sort(generator.uniform(-span, span, count)) + generator.choice([0.0, 0.0, 2.0 * span])
    noise = abs(vortex.peak_swirl) * 10 ** generator.uniform(-4, 0.3) * generator.choice([0, 1, 1, 1])

    def noisy(values):
        return values + noise * generator.normal(size=count)

    common = {"uncertainty": noise if noise and generator.random() < 0.5 else None, "velocity_gain": (1.0, 0.01)}
    kind = generator.choice(["line", "both", "radial", "plane"])
    if kind == "radial":
        return vx.Survey.radial(radius=np.abs(x), swirl=noisy(vortex.swirl(np.abs(x))), **common)
    y = generator.uniform(-span, span, count) if kind == "plane" else np.zeros(count)
    u, v = vortex.velocity(x, y)
    if kind == "plane":
        return vx.Survey.plane(x=x, y=y, u=noisy(u), v=noisy(v), **common)
    along = noisy(u) if kind == "both" else None
    missed = 0.0 if generator.random() < 0.5 else None
    return vx.Survey.traverse(position=x, velocity=noisy(v), along=along, miss_distance=missed, **common)


@pytest.mark.parametrize("seed", range(60))
def test_it_ends_in_numbers_or_in_a_sentence(seed):
    generator = np.random.default_rng(seed)
    vortex = vortex_of(generator)
    options = {}
    if generator.random() < 0.3:
        options["background"] = str(generator.choice(["none", "uniform", "linear"]))
    if generator.random() < 0.2:
        options["instrument"] = vx.Instrument(wander=vortex.core_radius * generator.uniform(0, 0.5))
    if generator.random() < 0.3:
        options["loss"] = str(generator.choice(["huber", "soft_l1"]))
    fluid = vx.air(20.0) if generator.random() < 0.4 else vx.water(15.0)
    orientation = "air" if fluid.is_gas else str(generator.choice(["surface", "submerged"]))
    site = vx.Site(ambient_pressure=(101325.0, 100.0), orientation=orientation, speed=10.0, translation_speed=5.0)
    try:
        appraisal = vx.appraise(survey_of(vortex, generator), fluid=fluid, site=site, **options)
    except (vx.FitError, ValueError) as error:
        words = str(error)
    else:
        words = appraisal.summary()
        low, high = appraisal.core_pressure_drop.interval(0.95)
        assert low <= high
    assert len(words) > 20
