"""What follows from the core pressure: one file each, same face, none knows the fitter."""

from __future__ import annotations

import importlib
import pkgutil
from typing import TYPE_CHECKING, Protocol, cast

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vortexwidgets.consequences.consequence import Consequence
    from vortexwidgets.core_pressure import Core
    from vortexwidgets.fluids import Fluid, Site


class ConsequenceModule(Protocol):
    """The face of every file here that holds a consequence."""

    NAME: str

    def assess(self, core: Core, fluid: Fluid, site: Site) -> Consequence | None:
        """Return what follows, or None where it does not apply."""

    def draw(self, axes: Axes, consequence: Consequence) -> None:
        """Draw it."""


def all_consequences() -> tuple[ConsequenceModule, ...]:
    """Find every file here that has an `assess`, by name of the file."""
    names = sorted(module.name for module in pkgutil.iter_modules(__path__))
    modules = [importlib.import_module(f"{__name__}.{name}") for name in names]
    return tuple(cast("ConsequenceModule", module) for module in modules if "assess" in vars(module))


def assess_all(core: Core, fluid: Fluid, site: Site) -> tuple[Consequence, ...]:
    """Assess every consequence that applies.

    Parameters
    ----------
    core : Core
        What the survey says of the core.
    fluid : Fluid
    site : Site

    Returns
    -------
    tuple of Consequence
    """
    found = (module.assess(core, fluid, site) for module in all_consequences())
    return tuple(item for item in found if item is not None)


def draw(axes: Axes, consequence: Consequence) -> None:
    """Draw a consequence in axes, labelled with units.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
    consequence : Consequence

    Raises
    ------
    ValueError
        If no file here draws a consequence of this name.
    """
    modules = all_consequences()
    for module in modules:
        if consequence.name == module.NAME:
            module.draw(axes, consequence)
            return
    known = ", ".join(module.NAME for module in modules)
    raise ValueError(f"No file draws a consequence named '{consequence.name}'; known are {known}.")
