"""One observable value; no toolkit beyond traitlets."""

from __future__ import annotations

import functools
import traceback
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Any, ParamSpec

import traitlets

_PACKAGE = Path(__file__).parents[1]
_SENTENCES = (ValueError, KeyError, OSError, RuntimeError)  # what the package raises to be read; the rest are defects
_Arguments = ParamSpec("_Arguments")


class PanelState(traitlets.HasTraits):
    """What every panel holds beside its value: the last error and the work in progress, as sentences.

    Attributes
    ----------
    error : str
        What went wrong in the last action, empty when it went well.
    progress : str
        What is being done right now, empty when nothing is.
    """

    error = traitlets.Unicode("")
    progress = traitlets.Unicode("")

    _depth = 0

    @contextmanager
    def reporting(self, *, fresh: bool = True) -> Iterator[None]:
        """Show an exception of the enclosed work in the panel; a callback has no caller who could catch it.

        Parameters
        ----------
        fresh : bool
            Whether an error of earlier work goes. What an action sets off in turn never clears what it reported.
        """
        if fresh and self._depth == 0:
            self.error = ""
        self._depth += 1
        try:
            yield
        except Exception as problem:
            self.error = sentence_of(problem)
        finally:
            self._depth -= 1

    def reported(self, action: Callable[_Arguments, object]) -> Callable[_Arguments, None]:
        """Return what a person does as a callback whose exceptions end up in `error`."""

        @functools.wraps(action)
        def callback(*args: _Arguments.args, **kwargs: _Arguments.kwargs) -> None:
            with self.reporting():
                action(*args, **kwargs)

        return callback

    def showing(self, view: Callable[[], object]) -> Callable[[object], None]:
        """Return what follows a change of the value as an observer whose exceptions end up in `error`."""

        def observer(_: object) -> None:
            with self.reporting(fresh=False):
                view()

        return observer

    @contextmanager
    def working(self, message: str) -> Iterator[None]:
        """Say what is being done while the enclosed work lasts."""
        self.progress = message
        try:
            yield
        finally:
            self.progress = ""


def sentence_of(problem: Exception) -> str:
    """Return what an exception says; one that this package did not raise also says what it is and where it came from.

    Examples
    --------
    >>> sentence_of(ZeroDivisionError("division by zero"))
    'ZeroDivisionError: division by zero'
    """
    text = str(problem.args[0]) if isinstance(problem, KeyError) and problem.args else str(problem)
    frames = traceback.extract_tb(problem.__traceback__)
    own = bool(frames) and Path(frames[-1].filename).is_relative_to(_PACKAGE)
    if text and own and isinstance(problem, _SENTENCES):
        return text
    place = f" ({Path(frames[-1].filename).name}, line {frames[-1].lineno})" if frames else ""
    return f"{type(problem).__name__}: {text or 'no message'}{place}"


class VortexState(PanelState):
    """One vortex in a fluid. Controls replace the value, plots observe it, neither knows the other.

    Attributes
    ----------
    vortex : Vortex
        The vortex shown.
    density : float
        Density of the fluid. [kg/m³]
    """

    vortex = traitlets.Instance("vortexwidgets.models.vortex.Vortex")
    density = traitlets.Float(1000.0)

    def change(self, **numbers: float) -> None:
        """Replace the vortex by one with other numbers."""
        self.vortex = replace(self.vortex, **numbers)


class SurveyState(PanelState):
    """One survey and the instrument that took it.

    Attributes
    ----------
    survey : Survey
        The samples, in and out.
    instrument : Instrument
        Wander, probe width and how the probe averages.
    """

    survey = traitlets.Instance("vortexwidgets.survey.survey.Survey", allow_none=True)
    instrument = traitlets.Instance("vortexwidgets.survey.instrument.Instrument", allow_none=True)


class JobState(SurveyState):
    """The inputs of one appraisal and its result, which goes stale when an input changes.

    Attributes
    ----------
    fluid : Fluid or None
        None takes the fluid from the facts of the survey.
    site : Site or None
        None takes the site from the facts of the survey.
    models : tuple of str
        Keys of the models to rank; empty ranks all that the package ranks.
    appraisal : Appraisal or None
        The result, None until it is made and after an input has changed.
    """

    fluid: Any = traitlets.Any(None, allow_none=True)
    site: Any = traitlets.Any(None, allow_none=True)
    models = traitlets.Tuple(())
    appraisal: Any = traitlets.Any(None, allow_none=True)

    def __init__(self, **values: Any) -> None:
        super().__init__(**values)
        self.observe(self._forget, ["survey", "instrument", "fluid", "site", "models"])

    def _forget(self, _: object) -> None:
        self.appraisal = None
