"""fit_survey: one survey, one model."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING, Literal

import numpy as np
import numpy.typing as npt

from vortexwidgets.fitting.problem import (
    CENTRE_X,
    CENTRE_Y,
    CORE_RADIUS,
    SHAPE,
    Background,
    Problem,
    lay_out,
)
from vortexwidgets.fitting.result import Fit, FitError, Loss, Status, Uncertainties
from vortexwidgets.fitting.separable import Solution, misfit, solve
from vortexwidgets.fitting.starting import search
from vortexwidgets.quantities import QUANTITIES, check
from vortexwidgets.survey.survey import require_survey

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel
    from vortexwidgets.survey.instrument import Instrument
    from vortexwidgets.survey.survey import Survey

FloatArray = npt.NDArray[np.float64]

LOOK_AGAIN = "Check units and columns, measure closer to the axis, or take more points."

_ROBUST_ROUNDS = 50
_SCAN = tuple(2.0 ** (k / 2.0) for k in range(-4, 5))  # of the core radius about the search's


@dataclass(frozen=True)
class Settings:
    """How a survey is fitted, the same for every model."""

    instrument: Instrument | None
    background: Background
    uncertainties: Uncertainties
    loss: Loss = "linear"


def settings_for(
    survey: Survey,
    *,
    instrument: Instrument | None = None,
    background: Background | None = None,
    uncertainties: Uncertainties | None = None,
    loss: Loss = "linear",
) -> Settings:
    """Fill in what was not said: a uniform background for planar fields, stated uncertainties where there are any."""
    if background is None:
        background = "uniform" if survey.geometry == "plane" else "none"
    if uncertainties is None:
        uncertainties = "relative" if survey.uncertainty is None else "absolute"
    if background not in ("none", "uniform", "linear"):
        raise ValueError(f"background must be 'none', 'uniform' or 'linear', got {background!r}.")
    if uncertainties not in ("absolute", "relative"):
        raise ValueError(f"uncertainties must be 'absolute' or 'relative', got {uncertainties!r}.")
    if uncertainties == "absolute" and survey.uncertainty is None:
        raise ValueError(
            "The survey states no uncertainty, so uncertainties='absolute' has nothing to use; "
            "state an uncertainty or choose 'relative'."
        )
    if loss not in ("linear", "huber", "soft_l1"):
        raise ValueError(f"loss must be 'linear', 'huber' or 'soft_l1', got {loss!r}.")
    return Settings(instrument, background, uncertainties, loss)


def fit_survey(
    survey: Survey,
    model: str | VortexModel,
    *,
    instrument: Instrument | None = None,
    background: Background | None = None,
    uncertainties: Uncertainties | None = None,
    loss: Loss = "linear",
    start: Mapping[str, float] | None = None,
    fixed: Mapping[str, float] | None = None,
    on_failure: Literal["raise", "return"] = "raise",
) -> Fit:
    """Fit one vortex model to one survey.

    Parameters
    ----------
    survey : Survey
        Included in-plane samples are used.
    model : str or VortexModel
        Key of the catalogue, or a model.
    instrument : Instrument, optional
        Wander and probe width, corrected for inside the fit.
    background : {"none", "uniform", "linear"}, optional
        Flow added to the vortex. Default: uniform for planar fields, none otherwise.
    uncertainties : {"absolute", "relative"}, optional
        "absolute" takes the stated uncertainties as they are; "relative" scales them (ones, where none are stated) so
        that the residuals have the scatter they show. Default: absolute where the survey states uncertainties.
    loss : {"linear", "huber", "soft_l1"}
        The last two weigh outliers down; the covariance is then the sandwich estimate and limits are linear.
    start : mapping, optional
        centre_x, centre_y, core_radius, shape parameters to start from; found by a search where not given. [SI]
    fixed : mapping, optional
        Parameters held at a value. [SI]
    on_failure : {"raise", "return"}
        Whether a fit that finds no vortex or no minimum raises, or is handed back with its status.

    Returns
    -------
    Fit
        With `.status` as a sentence.

    Raises
    ------
    FitError
        If no vortex is seen, or the iteration stops short of the minimum.
    ValueError
        If the model cannot be fitted, a name is unknown, a number to start from or to hold is outside its range, or
        there are fewer samples than parameters.

    Examples
    --------
    NIST StRD Misra1a is the Lamb-Oseen circulation law in disguise; its certified values are in
    ``tests/published/test_nist_misra1a.py``.
    """
    require_survey(survey)
    model = _model(model)
    settings = settings_for(
        survey, instrument=instrument, background=background, uncertainties=uncertainties, loss=loss
    )
    problem = problem_for(survey, model, settings)
    free, held = free_parameters(survey, model, fixed)
    starts = _starts(problem, free, held, start or {})
    return fit_problem(problem, settings, free, starts, on_failure=on_failure, held=held)


def problem_for(survey: Survey, model: VortexModel, settings: Settings) -> Problem:
    """Lay out a survey for a model under given settings."""
    return Problem(lay_out(survey, instrument=settings.instrument, background=settings.background), model)


def free_parameters(
    survey: Survey, model: VortexModel, fixed: Mapping[str, float] | None = None
) -> tuple[tuple[int, ...], dict[int, float]]:
    """Nonlinear parameters that may move, and those that are held with their values."""
    held: dict[int, float] = {}
    if survey.geometry == "radial":
        held = {CENTRE_X: 0.0, CENTRE_Y: 0.0}
    elif survey.geometry == "traverse" and not survey.two_components:
        missed = survey.miss_distance
        if missed is None or missed.uncertainty == 0.0:
            held = {CENTRE_Y: 0.0 if missed is None else missed.value}
    names = nonlinear_names(model)
    for name, value in (fixed or {}).items():
        if name not in names:
            raise ValueError(f"No parameter {name!r} to hold for {model.name}. Known: {', '.join(names)}.")
        held[names.index(name)] = _usable(model, name, value, "fixed")
    return tuple([index for index in range(len(names)) if index not in held]), held


def fit_problem(
    problem: Problem,
    settings: Settings,
    free: tuple[int, ...],
    starts: list[list[float]],
    *,
    on_failure: Literal["raise", "return"] = "raise",
    held: Mapping[int, float] | None = None,
) -> Fit:
    """Fit from one or several starts and keep the lowest minimum."""
    samples = len(problem.samples.target) + (problem.samples.prior is not None)
    number = 1 + len(problem.samples.background) + len(free)
    if samples <= number:
        raise ValueError(
            f"Survey has {samples} points but {problem.model.name} has {number} free parameters here, which leaves "
            "nothing to judge the fit by; add points, fix a parameter or choose a smaller background."
        )
    solution = _lowest([solve(problem, start, free) for start in starts])
    if len(starts) > 1 and (
        not solution.converged
        or settings.uncertainties == "relative"
        or solution.chi_square > 2.0 * max(samples - number, 1)
    ):
        # Nothing says that this is the lowest minimum: look about more widely before believing it.
        solution = _lowest([solution, *(solve(problem, start, free) for start in _wider(problem, free, starts))])
    if settings.loss != "linear":
        problem, solution = _robust(problem, settings, solution)
    fit = Fit(
        model=problem.model,
        names=_names(problem, free),
        chi_square=solution.chi_square,
        degrees_of_freedom=samples - number,
        uncertainties=settings.uncertainties,
        background=settings.background,
        loss=settings.loss,
        evaluations=solution.steps,
        remarks=(),
        _problem=problem,
        _solution=solution,
    )
    if on_failure == "raise":
        _refuse_failure(fit)
    return fit


def starts_for(
    problem: Problem, free: tuple[int, ...], found: list[list[float]], held: Mapping[int, float]
) -> list[list[float]]:
    """Turn (centre_x, centre_y, peak_radius) of the search into starts of a model.

    The search knows one profile only, so the core radius is scanned again with the model's own.
    """
    default = [parameter.default for parameter in problem.model.shape]
    at, _ = problem.model.peak_of(*default)
    starts = []
    for centre_x, centre_y, peak_radius in found:
        start = [centre_x, centre_y, peak_radius / at, *default]
        for index, value in held.items():
            start[index] = value
        if CORE_RADIUS in free:
            scan = [[*start[:CORE_RADIUS], start[CORE_RADIUS] * factor, *start[SHAPE:]] for factor in _SCAN]
            start = min(scan, key=lambda here: misfit(problem, here))
        starts.append(start)
    return starts


def _lowest(solutions: list[Solution]) -> Solution:
    return min(solutions, key=lambda solution: (not solution.converged, solution.chi_square))


def _wider(problem: Problem, free: tuple[int, ...], starts: list[list[float]]) -> list[list[float]]:
    """The three best of a scan about every start, in the centre and in the core radius."""
    scan = []
    for start in starts:
        offsets_x = (-0.7, 0.0, 0.7) if CENTRE_X in free else (0.0,)
        offsets_y = (-0.7, 0.0, 0.7) if CENTRE_Y in free else (0.0,)
        for right in offsets_x:
            for up in offsets_y:
                for factor in _SCAN[::2]:
                    radius = start[CORE_RADIUS]
                    scan.append([start[0] + right * radius, start[1] + up * radius, radius * factor, *start[SHAPE:]])
    return sorted(scan, key=lambda here: misfit(problem, here))[:3]


def _refuse_failure(fit: Fit) -> None:
    if not fit.converged:
        raise FitError(
            f"{Status.STOPPED.value} What it had: "
            f"{', '.join(f'{n} = {v:.4g}' for n, v in zip(fit.names, fit._best, strict=True))}."
            " Give a start, fix a parameter, or choose another model.",
            fit,
        )
    # Only a weak drop of chi-square is worth the question whether there is a vortex at all.
    if fit._problem.samples.power < 10.0 * fit.chi_square + 1e3 and not fit._is_seen:
        raise FitError(f"{Status.NO_VORTEX.value} {LOOK_AGAIN}", fit)


@lru_cache(maxsize=64)
def nonlinear_names(model: VortexModel) -> tuple[str, ...]:
    """Names of a model's nonlinear parameters, in the order of the problem."""
    return ("centre_x", "centre_y", "core_radius", *(parameter.name for parameter in model.shape))


def _names(problem: Problem, free: tuple[int, ...]) -> tuple[str, ...]:
    names = nonlinear_names(problem.model)
    return (problem.strength_name, *problem.samples.background_names, *[names[index] for index in free])


def _starts(
    problem: Problem, free: tuple[int, ...], held: Mapping[int, float], given: Mapping[str, float]
) -> list[list[float]]:
    names = nonlinear_names(problem.model)
    wanted: dict[int, float] = {}
    for name, value in given.items():
        if name in names:
            wanted[names.index(name)] = _usable(problem.model, name, value, "start")
        elif name != problem.strength_name and name not in problem.samples.background_names:
            raise ValueError(f"No parameter {name!r} to start from. Known: {', '.join(names)}.")
    known = {**wanted, **held}
    if CENTRE_X in known and CENTRE_Y in known and CORE_RADIUS in known:
        shape = [known.get(index, parameter.default) for index, parameter in enumerate(problem.model.shape, SHAPE)]
        return [[known[CENTRE_X], known[CENTRE_Y], known[CORE_RADIUS], *shape]]
    found = search(problem, centre=(known.get(CENTRE_X), known.get(CENTRE_Y)), several=2)
    rest = tuple(index for index in free if index not in wanted)
    return starts_for(problem, rest, found, known)


def _usable(model: VortexModel, name: str, value: float, why: str) -> float:
    """Return a parameter that a fit can start from or hold; lengths and shapes are positive."""
    shape = {parameter.name: parameter for parameter in model.shape}
    try:
        if name not in shape:
            return check(name, value)
        number = check(name, value) if name in QUANTITIES else float(value)
    except (TypeError, ValueError) as error:
        raise ValueError(f"{why}: {error}") from error
    low, high = shape[name].valid
    if not low < number < high:
        raise ValueError(f"{why}: {name} of {model.name} must lie between {low:g} and {high:g}, got {number:g}.")
    return number


def _robust(problem: Problem, settings: Settings, solution: Solution) -> tuple[Problem, Solution]:
    """Iteratively reweighted least squares; the scale is one standard uncertainty, or the scatter's robust estimate."""
    original = problem
    for _ in range(_ROBUST_ROUNDS):
        residual = replace(solution, problem=original).residuals
        scale = 1.0
        if settings.uncertainties == "relative":
            scale = 1.4826 * float(np.median(np.abs(residual))) or 1.0
        z = np.abs(residual) / scale
        weight = (
            np.minimum(1.0, 1.345 / np.maximum(z, 1e-300)) if settings.loss == "huber" else 1.0 / np.sqrt(1.0 + z * z)
        )
        problem = replace(original, samples=original.samples.reweighted(np.sqrt(weight)))
        before = solution
        solution = solve(problem, before.nonlinear, before.free)
        move = np.abs(np.subtract(solution.nonlinear, before.nonlinear)) / solution.nonlinear[CORE_RADIUS]
        if float(move.max()) < 1e-8:
            break
    return problem, solution


def _model(model: str | VortexModel) -> VortexModel:
    from vortexwidgets.models.catalogue import model_named

    chosen = model_named(model)
    if not chosen.ranked:
        raise ValueError(
            f"{chosen.name} cannot be fitted: it has no core radius or no pressure on the axis. "
            "Choose a model with a core, such as 'lamb-oseen'."
        )
    return chosen
