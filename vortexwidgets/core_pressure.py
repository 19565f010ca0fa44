"""From fits and survey to the three core drops, their spread, their budget."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from vortexwidgets.models.vortex import Vortex
    from vortexwidgets.uncertainty import Estimate


@dataclass(frozen=True)
class CoreDrop:
    """One of the three named core pressure drops. [Pa]"""

    name: str
    estimate: Estimate
    explanation: str


@dataclass(frozen=True)
class DataDrop:
    """The drop straight from the samples, without a model: three shares of one sum. [Pa]"""

    estimate: Estimate
    measured: float
    towards_axis: float
    beyond: float
    sentences: tuple[str, ...]


@dataclass(frozen=True)
class Core:
    """What the survey says of the core, free of the fitter: the input of every consequence."""

    vortex: Vortex
    supported: tuple[Vortex, ...]
    drop: Estimate
    tap_drop: Estimate
    ambient: Estimate | None
    pressure: Estimate | None
    envelope: tuple[float, float]
    circulation: Estimate
    core_radius: Estimate
    peak_swirl: Estimate
    peak_radius: Estimate
    density: Estimate
    missed_axis: bool
