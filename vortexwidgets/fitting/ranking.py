"""How strongly the survey supports each distinct profile, and which it does not reject."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from vortexwidgets.fitting.fit import (
    LOOK_AGAIN,
    Settings,
    fit_problem,
    free_parameters,
    nonlinear_names,
    problem_for,
    settings_for,
    starts_for,
)
from vortexwidgets.fitting.result import Fit, FitError, Loss, Status, Uncertainties
from vortexwidgets.fitting.starting import search
from vortexwidgets.formatting import table
from vortexwidgets.survey.survey import require_survey

if TYPE_CHECKING:
    from vortexwidgets.fitting.problem import Background
    from vortexwidgets.models.model import VortexModel
    from vortexwidgets.survey.instrument import Instrument
    from vortexwidgets.survey.survey import Survey

REJECTION = 0.01  # a profile whose chi-square would be exceeded by chance less often than this is rejected


@dataclass(frozen=True, eq=False)
class Ranked:
    """One distinct profile in the ranking.

    Attributes
    ----------
    model : VortexModel
        The profile.
    names : tuple of str
        Every published name that the profile goes by.
    fit : Fit
        Its fit.
    aicc : float
        Corrected Akaike criterion, less that of the best.
    weight : float
        Akaike weight among the profiles that are ranked.
    p_value : float
        Chance of a chi-square as large as this one if the profile were right.
    rejected : bool
        Whether the data reject it.
    reason : str
        The sentence behind `rejected`.
    """

    model: VortexModel
    names: tuple[str, ...]
    fit: Fit
    aicc: float
    weight: float
    p_value: float
    rejected: bool
    reason: str


@dataclass(frozen=True, eq=False, repr=False)
class Ranking:
    """Distinct profiles, best first."""

    rows: tuple[Ranked, ...]
    criterion: str
    failures: tuple[str, ...] = ()

    def __iter__(self) -> Iterator[Ranked]:
        return iter(self.rows)

    def __len__(self) -> int:
        return len(self.rows)

    def __getitem__(self, which: int | str) -> Ranked:
        if isinstance(which, int):
            return self.rows[which]
        for row in self.rows:
            if which == row.model.key or which in row.names:
                return row
        raise KeyError(f"No model {which!r} in the ranking. Ranked: {', '.join(row.model.key for row in self.rows)}.")

    def __repr__(self) -> str:
        return f"<Ranking: {', '.join(row.model.key for row in self.rows)}>"

    @property
    def best(self) -> Ranked:
        """The profile with the lowest criterion."""
        return self.rows[0]

    @property
    def supported(self) -> tuple[Ranked, ...]:
        """The profiles that the data do not reject."""
        return tuple(row for row in self.rows if not row.rejected)

    def __str__(self) -> str:
        body = [
            [
                " = ".join(row.names),
                f"{row.aicc:.1f}",
                f"{100 * row.weight:.1f} %",
                f"{row.p_value:.2g}" if row.p_value >= 1e-4 else "< 0.0001",
                "rejected" if row.rejected else "not rejected",
            ]
            for row in self.rows
        ]
        return table(body, ["model", "AICc above best", "weight", "p", "by the data"]) + "\n" + self.criterion


def rank_models(
    survey: Survey,
    models: Sequence[str | VortexModel] | str | VortexModel | None = None,
    *,
    instrument: Instrument | None = None,
    background: Background | None = None,
    uncertainties: Uncertainties | None = None,
    loss: Loss = "linear",
    fixed: Mapping[str, float] | None = None,
) -> Ranking:
    """Fit the distinct published profiles side by side and rank them.

    Parameters
    ----------
    survey : Survey
        Included in-plane samples are used.
    models : sequence of str or VortexModel, optional
        Which to rank, one alone also without a list; all ranked models of the catalogue by default. Models with one and
        the same swirl profile are ranked once, under all their names.
    instrument, background, uncertainties, loss, fixed
        As for `fit_survey`.

    Returns
    -------
    Ranking
        Best first.

    Raises
    ------
    FitError
        If no model can be fitted, no vortex is seen, or there are too few points for the criterion of any model.

    Notes
    -----
    With stated uncertainties AICc = chi² + 2k + 2k(k+1)/(N-k-1), and a profile is rejected when its chi-square has a
    chance below 0.01. With unknown scatter AICc = N ln(RSS/N) + 2(k+1) + 2(k+1)(k+2)/(N-k-2), and the test is
    relative: a profile is rejected when its sum of squares is larger than the smallest one by more than the F
    distribution allows at 0.01; or, where positions were repeated, when the lack of fit exceeds the scatter of the
    repeats.

    References
    ----------
    .. [1] C. M. Hurvich and C.-L. Tsai, Biometrika 76 (1989) 297-307.
    .. [2] K. P. Burnham and D. R. Anderson, Model Selection and Multimodel Inference, 2nd ed., Springer, 2002, ch. 2.
    """
    require_survey(survey)
    settings = settings_for(
        survey, instrument=instrument, background=background, uncertainties=uncertainties, loss=loss
    )
    profiles = distinct_profiles(models)
    fits, failures = _fits(survey, [model for model, _ in profiles], settings, fixed or {})
    kept = [(model, names, fit) for (model, names), fit in zip(profiles, fits, strict=True) if fit is not None]
    if not kept:
        if all(Status.STOPPED.value in failure for failure in failures):
            raise FitError(f"{Status.NO_VORTEX.value} None of the models comes to rest on them. {LOOK_AGAIN}")
        raise FitError("No model could be fitted. " + failures[0])
    if not any(fit._is_seen for _, _, fit in kept):
        raise FitError(f"{Status.NO_VORTEX.value} {LOOK_AGAIN}", kept[0][2])
    known = settings.uncertainties == "absolute"
    criteria = np.array([_aicc(fit, known=known) for _, _, fit in kept])
    if not np.any(np.isfinite(criteria)):
        raise FitError(_too_few([fit for _, _, fit in kept], known=known))
    criteria -= criteria.min()
    weights = np.exp(-0.5 * criteria)
    weights /= weights.sum()
    tests = _absolute_tests([fit for _, _, fit in kept]) if known else _relative_tests([fit for _, _, fit in kept])
    rows = [
        Ranked(model, names, fit, float(aicc), float(weight), p, p < REJECTION, reason)
        for (model, names, fit), aicc, weight, (p, reason) in zip(kept, criteria, weights, tests, strict=True)
    ]
    rows.sort(key=lambda row: row.aicc)
    return Ranking(tuple(rows), _criterion(known=known), tuple(failures))


def distinct_profiles(
    models: Sequence[str | VortexModel] | str | VortexModel | None = None,
) -> list[tuple[VortexModel, tuple[str, ...]]]:
    """Models to rank, each with every name of its profile."""
    from vortexwidgets.models.catalogue import MODELS, model_named

    if models is None:
        chosen = [model for model in MODELS.values() if model.ranked]
    else:
        named = models if isinstance(models, Iterable) and not isinstance(models, str) else [models]
        chosen = [model_named(model) for model in named]
        for model in chosen:
            if not model.ranked:
                raise ValueError(
                    f"{model.name} cannot be ranked: it has no core radius or no finite pressure on the axis. Leave "
                    "it out."
                )
    if not chosen:
        raise ValueError("No model to rank; name at least one, such as 'lamb-oseen'.")
    groups: dict[str, list[VortexModel]] = {}
    for model in chosen:
        groups.setdefault(model.same_profile_as or model.key, []).append(model)
    return [(group[0], tuple(model.name for model in group)) for group in groups.values()]


def _fits(
    survey: Survey, models: Sequence[VortexModel], settings: Settings, fixed: Mapping[str, float]
) -> tuple[list[Fit | None], list[str]]:
    """One fit per model, all from one search."""
    first = problem_for(survey, models[0], settings)
    _, held = free_parameters(survey, models[0], {})
    known = {**held, **{i: fixed[n] for i, n in enumerate(("centre_x", "centre_y")) if n in fixed}}
    found = search(first, centre=(known.get(0), known.get(1)), several=2)
    fits: list[Fit | None] = []
    failures: list[str] = []
    for model in models:
        names = nonlinear_names(model)
        free, held = free_parameters(survey, model, {n: v for n, v in fixed.items() if n in names})
        problem = problem_for(survey, model, settings)
        try:
            fit = fit_problem(problem, settings, free, starts_for(problem, free, found, held), on_failure="return")
        except ValueError as error:
            fits.append(None)
            failures.append(f"{model.name}: {error}")
            continue
        if not fit.converged:
            failures.append(f"{model.name}: {Status.STOPPED.value}")
        fits.append(fit if fit.converged else None)
    return fits, failures


def _too_few(fits: Sequence[Fit], *, known: bool) -> str:
    """Say how many points the criterion of the model with the fewest parameters needs."""
    smallest = min(fits, key=lambda fit: len(fit.names))
    points = smallest.degrees_of_freedom + len(smallest.names) if known else smallest.effective_samples
    needed = len(smallest.names) + (2 if known else 3)
    return (
        f"Too few points to rank models: {points:g} independent points, at least {needed} needed for the "
        f"{len(smallest.names)} parameters of {smallest.model.name}; add points, or fit one model with fit_survey."
    )


def _aicc(fit: Fit, *, known: bool) -> float:
    k = len(fit.names)
    if known:
        samples = fit.degrees_of_freedom + k
        value = fit.chi_square + 2.0 * k
    else:
        samples = fit.effective_samples
        value = samples * math.log(max(fit.chi_square, 1e-300) / samples)
        k += 1
        value += 2.0 * k
    room = samples - k - 1
    return value + 2.0 * k * (k + 1) / room if room > 0 else math.inf


def _criterion(*, known: bool) -> str:
    if known:
        return (
            "AICc with the stated uncertainties (chi² + 2k + 2k(k+1)/(N-k-1)); "
            f"a model is rejected where its chi² has a chance below {REJECTION}."
        )
    return (
        "AICc with the scatter estimated from the residuals (N ln(RSS/N) + ...); "
        "a model is rejected where its residuals exceed those of the best model, or of repeats, at a chance below "
        f"{REJECTION}."
    )


def _absolute_tests(fits: Sequence[Fit]) -> list[tuple[float, str]]:
    from scipy.special import chdtrc

    tests = []
    for fit in fits:
        p = float(chdtrc(max(fit.degrees_of_freedom, 1), fit.chi_square))
        tests.append(
            (p, f"chi² is {fit.chi_square:.1f} on {fit.degrees_of_freedom} degrees of freedom (p {_chance(p)}).")
        )
    return tests


def _relative_tests(fits: Sequence[Fit]) -> list[tuple[float, str]]:
    """Lack of fit against repeats where those tell the whole scatter, else against the smallest residuals."""
    from scipy.special import fdtrc

    best = min(fits, key=lambda fit: fit.scatter)
    pure, freedom = _repeats(best)
    if freedom >= 5 and pure > 0.0:
        rows = []
        for fit in fits:
            extra = max(fit.degrees_of_freedom - freedom, 1)
            ratio = max(fit.chi_square - pure, 0.0) / extra / (pure / freedom)
            p = float(fdtrc(extra, freedom, ratio))
            rows.append((p, f"lack of fit is {ratio:.2f} times the scatter of the repeats (p {_chance(p)})."))
        if rows[list(fits).index(best)][0] >= REJECTION:
            return rows
    shared = (
        " Repeated readings scatter less than the residuals of every model: readings at one station share an error, "
        "and stations are counted instead."
        if freedom >= 5
        else ""
    )
    samples = best.effective_samples
    share = samples / (best.degrees_of_freedom + len(best.names))
    unit = best.chi_square / max(best.degrees_of_freedom, 1) / share
    tests = []
    for fit in fits:
        rise = max(fit.chi_square - best.chi_square, 0.0)
        ratio = rise / unit if unit > 0.0 else (math.inf if rise > 0.0 else 0.0)
        p = float(fdtrc(1, max(samples - len(best.names), 1), ratio)) if math.isfinite(ratio) else 0.0
        if fit is best:
            p, reason = 1.0, "smallest residuals; their scatter is taken as the noise, so it cannot be rejected."
        else:
            reason = f"the sum of squares is {ratio:.1f} noise variances above the smallest (p {_chance(p)})."
        tests.append((p, reason + shared))
    return tests


def _chance(p: float) -> str:
    return f"= {p:.2g}" if p >= 1e-4 else "< 0.0001"


def _repeats(fit: Fit) -> tuple[float, int]:
    """Sum of squares of repeated readings about their means, and its degrees of freedom."""
    samples = fit._problem.samples
    if samples.station is None:
        return 0.0, 0
    count = np.bincount(samples.station)
    mean = np.bincount(samples.station, weights=samples.target) / count
    return float(np.sum((samples.target - mean[samples.station]) ** 2)), int(np.sum(count - 1))
