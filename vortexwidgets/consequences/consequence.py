"""Consequence: what was asked, an Estimate, the criterion with its source, a verdict in words, and its caution."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

import numpy as np
import numpy.typing as npt

from vortexwidgets.uncertainty import Estimate

if TYPE_CHECKING:
    from matplotlib.axes import Axes

FloatArray = npt.NDArray[np.float64]
Verdict = Literal["met", "not met", "not decided"]
Side = Literal["at or below", "at or above"]

MET: Verdict = "met"
NOT_MET: Verdict = "not met"
NOT_DECIDED: Verdict = "not decided"
LEVEL = 0.95
INSIDE_INTERVAL = (
    "The criterion lies inside the 95 % interval, so it is not decided; the budget says which input to improve."
)


@dataclass(frozen=True)
class Criterion:
    """What an estimate is compared with, as a noun phrase that a verdict may follow, and where it comes from."""

    text: str
    source: str


@dataclass(frozen=True)
class Consequence:
    """One thing that follows from the core pressure.

    Parameters
    ----------
    name : str
        Short title.
    question : str
        What was asked.
    estimate : Estimate
        The number that the criterion is compared with; undetermined where an input is missing.
    criterion : Criterion
    verdict : "met", "not met" or "not decided"
        "not decided": the criterion lies inside the 95 % interval, an input is missing, or a limit leaves it open.
    probability : float or None
        That the criterion is met; None where the inputs do not say.
    source : str
        Of the formula.
    caution : str
        What must be read with the number.
    details : tuple of (str, Estimate)
        Further numbers, each with its name.
    notes : tuple of str
        What was taken, what is missing and what it would add; one sentence or two each.
    curves : tuple of (str, tuple of float)
        What its plot shows. [SI]

    Raises
    ------
    ValueError
        If the verdict is none of the three, or the probability is not one.
    """

    name: str
    question: str
    estimate: Estimate
    criterion: Criterion
    verdict: Verdict
    probability: float | None
    source: str
    caution: str
    details: tuple[tuple[str, Estimate], ...] = ()
    notes: tuple[str, ...] = ()
    curves: tuple[tuple[str, tuple[float, ...]], ...] = ()

    def __post_init__(self) -> None:
        if self.verdict not in (MET, NOT_MET, NOT_DECIDED):
            raise ValueError(f"A verdict is 'met', 'not met' or 'not decided', got {self.verdict!r}.")
        if self.probability is not None and not 0.0 <= self.probability <= 1.0:
            raise ValueError(f"A probability lies between 0 and 1, got {self.probability:g}; give None if unknown.")
        object.__setattr__(self, "details", tuple((name, item) for name, item in self.details))
        object.__setattr__(self, "notes", tuple(self.notes))
        curves = tuple((name, tuple(float(number) for number in numbers)) for name, numbers in self.curves)
        object.__setattr__(self, "curves", curves)

    def detail(self, name: str) -> Estimate:
        """Return the detail of this name.

        Raises
        ------
        KeyError
            If there is none; the message lists those there are.
        """
        found = dict(self.details)
        if name not in found:
            raise KeyError(f"{self.name} has no detail '{name}'; it has {', '.join(found) or 'none'}.")
        return found[name]

    def curve(self, name: str) -> FloatArray:
        """Return the curve of this name, empty where there is none. [SI]"""
        return np.array(dict(self.curves).get(name, ()), dtype=float)

    def __str__(self) -> str:
        chance = "" if self.probability is None else f" (probability {chance_text(self.probability)})"
        lines = [f"{self.name}: {self.estimate}. {self.criterion.text}: {self.verdict}{chance}."]
        lines += [f"  {name}: {item}" for name, item in self.details]
        lines += [f"  {note}" for note in self.notes]
        lines += [f"  Caution: {self.caution}", f"  Criterion: {self.criterion.source}", f"  Source: {self.source}"]
        return "\n".join(lines)


def decide(estimate: Estimate, threshold: float, *, met_when: Side) -> tuple[Verdict, float | None]:
    """Compare an estimate with a criterion.

    Parameters
    ----------
    estimate : Estimate
    threshold : float
        [SI unit of the estimate]
    met_when : "at or below" or "at or above"
        On which side of the threshold the criterion is met; a value exactly on it meets it.

    Returns
    -------
    verdict : "met", "not met" or "not decided"
        Not decided where the threshold lies inside the symmetric 95 % interval.
    probability : float or None
        That the criterion is met; None where the estimate does not say.

    Examples
    --------
    A normal deviate of 1.96 has 2.5 % beyond it (any table of the normal distribution).

    >>> decide(Estimate(1.0, 0.5), 0.0, met_when="at or below")
    ('not met', 0.02275013194817...)
    >>> decide(Estimate(0.9, 0.5), 0.0, met_when="at or below")[0]
    'not decided'
    """
    if math.isnan(estimate.value):
        return NOT_DECIDED, None
    low, high = estimate.interval(LEVEL)
    below = estimate.probability_below(threshold)
    if low == high == threshold:
        return MET, 1.0
    chance = below if met_when == "at or below" else 1.0 - below
    probability = None if math.isnan(chance) else chance
    surely, never = (
        (high <= threshold, low > threshold) if met_when == "at or below" else (low >= threshold, high < threshold)
    )
    if surely:
        return MET, 1.0 if probability is None else probability
    if never:
        return NOT_MET, 0.0 if probability is None else probability
    return NOT_DECIDED, probability


def chance_text(probability: float) -> str:
    """Write a probability without claiming more than a distribution's tails can bear.

    Examples
    --------
    >>> chance_text(0.6), chance_text(1e-9), chance_text(1.0)
    ('0.60', 'below 0.001', 'above 0.999')
    """
    if probability < 1e-3:
        return "below 0.001"
    if probability > 1.0 - 1e-3:
        return "above 0.999"
    return f"{probability:.2f}" if 0.0095 < probability < 0.9905 else f"{probability:.3f}"


def scaled(estimate: Estimate, factor: float, quantity: str, *, without: str = "") -> Estimate:
    """Return an estimate times an exact positive factor, as another quantity.

    Parameters
    ----------
    estimate : Estimate
    factor : float
    quantity : str
        Key of the result.
    without : str
        Name of a contribution that cancels in the result and is taken off.

    Returns
    -------
    Estimate
        With its budget.
    """
    gone = sum(part.uncertainty**2 for part in estimate.budget if part.name == without)
    left = math.sqrt(max(estimate.uncertainty**2 - gone, 0.0)) if gone else estimate.uncertainty
    kept = tuple(part for part in estimate.budget if part.name != without)
    estimate = replace(estimate, uncertainty=left, budget=kept)
    return estimate.scaled(factor, quantity)


def undetermined(quantity: str) -> Estimate:
    """Return an estimate of which nothing is known."""
    return Estimate(math.nan, math.nan, quantity)


def draw_sentence(axes: Axes, consequence: Consequence) -> None:
    """Fill axes that have nothing to plot with what is missing."""
    from textwrap import fill

    from vortexwidgets.plots.style import FONT_SIZE, dress, theme_in_use

    theme = theme_in_use()
    dress(axes, theme)
    axes.set_axis_off()
    text = consequence.notes[0] if consequence.notes else "There is nothing to plot."
    axes.text(
        0.02, 0.95, fill(text, 64), transform=axes.transAxes, va="top", ha="left", color=theme.text, fontsize=FONT_SIZE
    )
