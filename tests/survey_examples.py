"""Makes the built-in invented surveys: python tests/survey_examples.py vortexwidgets/survey/examples.

The truth is the Lamb-Oseen profile v = Γ / (2π r) (1 - exp(-r²/r_c²)), written here and not taken from the package.
The seeds give ordinary noise: its chi-square is near the number of samples.
"""

import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np


@dataclass(frozen=True)
class Recipe:
    seed: int
    circulation: float  # m²/s
    core_radius: float  # m, 1/e radius of vorticity
    centre: tuple[float, float]  # m: position of the axis along the line, and how far the line misses it
    noise: float  # m/s
    stations: tuple[tuple[float, float, int], ...]  # from, to, number; m
    scale: float  # metres per unit of position
    unit: str
    along: bool
    facts: tuple[str, ...]


RECIPES = {
    "wing-tip": Recipe(
        seed=2,
        circulation=0.360,
        core_radius=5.0e-3,
        centre=(1.7e-3, 0.9e-3),
        noise=0.15,
        stations=(
            (-60e-3, -20e-3, 9),
            (-16e-3, -8.5e-3, 6),
            (-8e-3, 11e-3, 31),
            (11.5e-3, 19e-3, 6),
            (24e-3, 60e-3, 8),
        ),
        scale=1e-3,
        unit="mm",
        along=True,
        facts=(
            "title: wing-tip vortex in a water tunnel (invented survey)",
            "fluid: water",
            "temperature: 20.0 ± 0.2 degC",
            "ambient pressure: 93.0 ± 0.3 kPa",
            "free stream: 10.00 ± 0.05 m/s",
            "velocity gain: 1.000 ± 0.005",
            "orientation: submerged",
        ),
    ),
    "pump-intake": Recipe(
        seed=7,
        circulation=0.115,
        core_radius=20e-3,
        centre=(-6e-3, 4e-3),
        noise=0.012,
        stations=((-300e-3, -120e-3, 10), (-100e-3, 90e-3, 39), (110e-3, 300e-3, 11)),
        scale=1e-3,
        unit="mm",
        along=True,
        facts=(
            "title: vortex above a pump intake (invented survey)",
            "fluid: water",
            "temperature: 12.0 ± 0.5 degC",
            "surface pressure: 101.30 ± 0.10 kPa",
            "depth: 0.150 ± 0.005 m",
            "submergence: 0.60 ± 0.01 m",
            "free stream: 0.40 ± 0.02 m/s",
            "velocity gain: 1.00 ± 0.01",
            "orientation: surface",
        ),
    ),
    "whirlwind": Recipe(
        seed=11,
        circulation=11_300.0,
        core_radius=30.0,
        centre=(12.0, 8.0),
        noise=1.0,
        stations=((-400.0, -120.0, 15), (-100.0, 120.0, 34), (140.0, 400.0, 14)),
        scale=1.0,
        unit="m",
        along=False,
        facts=(
            "title: whirlwind passing a mast, time turned into position (invented survey)",
            "fluid: air",
            "temperature: 22 ± 1 degC",
            "ambient pressure: 98.5 ± 0.2 kPa",
            "translation speed: 14 ± 1 m/s",
            "miss distance: 8 ± 3 m",
            "velocity gain: 1.00 ± 0.01",
            "orientation: air",
        ),
    ),
}


def text_of(name: str) -> str:
    recipe = RECIPES[name]
    generator = np.random.default_rng(recipe.seed)
    position = np.concatenate([np.linspace(*part) for part in recipe.stations])
    x, y = position - recipe.centre[0], -recipe.centre[1]
    radius = np.hypot(x, y)
    swirl = recipe.circulation / (2.0 * np.pi * radius) * -np.expm1(-((radius / recipe.core_radius) ** 2))
    across = swirl * x / radius + recipe.noise * generator.standard_normal(radius.size)
    along = -swirl * y / radius + recipe.noise * generator.standard_normal(radius.size)
    truth = (
        f"# Made by a script with seed {recipe.seed} from a Lamb-Oseen vortex of circulation {recipe.circulation:g} "
        f"m²/s and 1/e radius {recipe.core_radius / recipe.scale:g} {recipe.unit} with its axis at "
        f"{recipe.centre[0] / recipe.scale:g} {recipe.unit}. The line passes it at {recipe.centre[1] / recipe.scale:g} "
        f"{recipe.unit}. Normal noise of {recipe.noise:g} m/s was added."
    )
    columns = ["position [" + recipe.unit + "]", "velocity [m/s]"]
    values = [position / recipe.scale, across]
    if recipe.along:
        columns.append("along [m/s]")
        values.append(along)
    columns.append("uncertainty [m/s]")
    values.append(np.full(position.size, recipe.noise))
    digits = ["%.2f", *["%.4f"] * (len(values) - 2), "%.3g"]
    rows = [
        ",".join(form % value for form, value in zip(digits, row, strict=True)) for row in zip(*values, strict=True)
    ]
    return "\n".join([truth, *(f"# {fact}" for fact in recipe.facts), ",".join(columns), *rows]) + "\n"


if __name__ == "__main__":
    for example in RECIPES:
        (Path(sys.argv[1]) / f"{example}.csv").write_text(text_of(example), encoding="utf-8")
