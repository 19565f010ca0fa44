"""appraise: from a survey to a defended core pressure, once."""

from __future__ import annotations

import math
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from functools import cached_property
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

from vortexwidgets.cautions import assumptions_of, may_have_missed, reference_sentence, survey_cautions
from vortexwidgets.circumstances import fluid_of, instrument_of, site_of
from vortexwidgets.consequences import assess_all
from vortexwidgets.consequences.consequence import NOT_DECIDED, Consequence, Criterion, chance_text
from vortexwidgets.core_pressure import (
    Core,
    CoreDrop,
    circulation_at,
    combined_drop,
    core_pressure_of,
    named_drops,
    relative_to,
    share_beyond,
    total_pressure_deficit,
    with_contribution,
)
from vortexwidgets.data_drop import DataDrop, data_drop
from vortexwidgets.fitting.fit import Settings, fit_survey, settings_for
from vortexwidgets.fitting.ranking import Ranking, rank_models
from vortexwidgets.fitting.result import Loss, Uncertainties
from vortexwidgets.fluids import Fluid, Site
from vortexwidgets.formatting import format_estimate, format_number, table
from vortexwidgets.models.agreement import Agreement, AgreementRow, check_agreement
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.record import saving
from vortexwidgets.survey.instrument import Instrument
from vortexwidgets.survey.samples import DroppedRow, Provenance
from vortexwidgets.survey.screening import Screening, screen
from vortexwidgets.survey.survey import Survey, require_survey
from vortexwidgets.uncertainty import Contribution, Estimate

if TYPE_CHECKING:
    from vortexwidgets.fitting.problem import Background
    from vortexwidgets.fitting.result import Fit
    from vortexwidgets.models.model import VortexModel

Named = TypeVar("Named", Consequence, CoreDrop)

_CAUTION_BEYOND, _UNDETERMINED_BEYOND = 0.10, 0.30  # shares of the drop that no station saw
_COMPRESSIBLE = 0.02  # of the ambient pressure

NO_MODEL_FITS = "No model fits: the data reject every profile that was tried."


@dataclass(frozen=True)
class ModelRow:
    """What the record keeps of one ranked profile."""

    key: str
    names: tuple[str, ...]
    aicc: float
    weight: float
    p_value: float
    rejected: bool
    reason: str
    status: str
    chi_square: float
    degrees_of_freedom: int
    parameters: Mapping[str, Estimate]
    drop: Estimate
    pressure_constant: float


@dataclass(frozen=True, eq=False, repr=False)
class Appraisal:
    """Everything that was concluded from one survey; frozen, equal by content, kept by `save`.

    Attributes
    ----------
    survey, fluid, site, instrument, settings
        What went in. The survey has its outliers set aside.
    screening : Screening
        Whether the survey is good enough.
    models : tuple of ModelRow
        Distinct profiles, best first, with parameters, limits and drop of each.
    core_pressure_drop : Estimate
        Of the instantaneous vortex: weighted over the models that are not rejected. [Pa]
    centred_drop : Estimate
        The same if the line of the survey went through the axis; it differs only where that is not known. [Pa]
    core_pressure : Estimate or None
        Absolute pressure on the axis; None without a reference pressure. [Pa]
    core_drops : tuple of CoreDrop
        The three named drops.
    envelope : tuple of float
        Lowest and highest drop over the models that are not rejected. [Pa]
    pressure_constant : float
        K in drop = K ρ v_peak².
    share_beyond : float
        Share of the drop from beyond the last station.
    consequences : tuple of Consequence
        What follows, each with criterion, verdict, source and caution.
    """

    survey: Survey
    fluid: Fluid
    site: Site
    instrument: Instrument | None
    settings: Settings
    model_keys: tuple[str, ...] | None
    screening: Screening
    models: tuple[ModelRow, ...]
    criterion: str
    core: Core
    core_pressure_drop: Estimate
    centred_drop: Estimate
    core_pressure: Estimate | None
    core_drops: tuple[CoreDrop, ...]
    envelope: tuple[float, float]
    pressure_constant: float
    edge_circulation: Estimate
    share_beyond: float
    reference: str
    data_drop: DataDrop
    total_pressure_deficit: Estimate | None
    consequences: tuple[Consequence, ...]
    agreements: tuple[Agreement, ...]
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]
    versions: Mapping[str, str]
    created: str
    _ranking: Ranking | None = field(default=None, repr=False)

    @cached_property
    def ranking(self) -> Ranking:
        """The live ranking with its fits; computed again from the survey where the appraisal was loaded."""
        if self._ranking is not None:
            return self._ranking
        return _rank(self.survey, self.model_keys, self.settings)

    @property
    def answer(self) -> str:
        """The answer in one line: drop = K ρ v_peak², ± u, envelope, share beyond the survey, reference."""
        drop = self.core_pressure_drop
        if math.isnan(drop.value):
            return f"{NO_MODEL_FITS} No core pressure drop is given; see the residuals."
        parts = [f"Core pressure drop {format_estimate(drop)}"]
        if self.centred_drop.is_determined:
            if drop.bound is not None:
                parts.append(f"{format_estimate(self.centred_drop)} if the line went through the axis")
            parts[-1] += f" (k = 1) = {self.pressure_constant:.2f} ρ v_peak²"
        low, high = self.envelope
        if math.isfinite(high):
            kept = [row for row in self.models if not row.rejected]
            if len(kept) == 1:
                parts.append(f"only {' = '.join(kept[0].names)} is not rejected")
            else:
                span = f"{format_number(low, 'Pa')} to {format_number(high, 'Pa')}"
                parts.append(f"{span} over {len(kept)} models not rejected")
        if self.share_beyond > _UNDETERMINED_BEYOND:
            parts.append(f"{100 * self.share_beyond:.0f} % of the whole drop lies beyond the survey and is left out")
        else:
            parts.append(f"{100 * self.share_beyond:.1f} % from beyond the survey")
        parts.append(self.reference)
        return "; ".join(parts) + "."

    def consequence(self, name: str) -> Consequence:
        """A consequence by its name, such as "Cavitation"."""
        return _named(self.consequences, name, "consequence")

    def core_drop(self, name: str) -> CoreDrop:
        """One of the three core drops by its name, such as "mean profile"."""
        return _named(self.core_drops, name, "core drop")

    def summary(self) -> str:
        """The appraisal as text for a terminal."""
        lines = [self.answer, ""]
        body = [
            [
                " = ".join(row.names),
                f"{row.aicc:.1f}",
                f"{100 * row.weight:.1f} %",
                "rejected" if row.rejected else "not rejected",
                str(row.parameters["core_radius"]) if "core_radius" in row.parameters else "",
                str(row.drop),
            ]
            for row in self.models
        ]
        lines.append(
            table(body, ["model", "AICc above best", "weight", "by the data", "core radius", "core pressure drop"])
        )
        lines += ["", "Core pressure: " + self._pressure_line()]
        lines += [f"  {drop.name}: {drop.estimate}" for drop in self.core_drops]
        if self.total_pressure_deficit is not None:
            deficit = format_estimate(self.total_pressure_deficit)
            lines.append(f"  Total pressure deficit on the axis: {deficit} (static drop plus axial velocity)")
        lines += ["", "Consequences:"]
        for item in self.consequences:
            chance = "" if item.probability is None else f" (probability {chance_text(item.probability)})"
            lines.append(f"  {item.name}: {item.estimate}; {item.criterion.text} {item.verdict}{chance}.")
            lines += [f"    {name}: {estimate}" for name, estimate in item.details]
            if item.verdict == NOT_DECIDED:
                lines += [f"    {note}" for note in item.notes[:1]]
            lines.append(f"    {item.caution}")
        for title, sentences in (("Assumed", self.assumptions), ("Cautions", self.cautions)):
            if sentences:
                lines += ["", f"{title}:", *(f"  - {sentence}" for sentence in sentences)]
        return "\n".join(lines)

    def _pressure_line(self) -> str:
        if math.isnan(self.core_pressure_drop.value):
            return "not given, because no model fits."
        if self.core_pressure is None and self.core.ambient is None and self.site.ambient_pressure is not None:
            return "not given, because the drop is known to the last station only."
        if self.core_pressure is None:
            return "not given, because no reference pressure was; give ambient_pressure, or surface_pressure and depth."
        return f"{self.core_pressure} absolute."

    def __str__(self) -> str:
        return self.summary()

    def __repr__(self) -> str:
        return f"<Appraisal: {self.answer}>"

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Appraisal) and saving.encode(self) == saving.encode(other)

    def __hash__(self) -> int:
        return hash((self.answer, self.created))

    def to_json(self) -> str:
        """The appraisal as JSON text that `from_json` turns back into an equal one."""
        return saving.to_json(self)

    @staticmethod
    def from_json(text: str) -> Appraisal:
        """An appraisal from its JSON text; nothing in it is executed."""
        return _checked(saving.from_json(text, REGISTRY))

    def save(self, path: str | Path) -> Path:
        """Write the record: .html for people, .json for machines; an interrupted write leaves nothing half-done."""
        target = Path(path)
        if target.suffix == ".html":
            saving.save_html(self, target)
        elif target.suffix == ".json":
            saving.save_json(self, target)
        else:
            raise ValueError(f"A record ends in .html or .json, got {target.name!r}.")
        return target


def _named(items: Sequence[Named], name: str, kind: str) -> Named:
    for item in items:
        if item.name == name:
            return item
    raise KeyError(f"No {kind} named {name!r} here. There are: {', '.join(item.name for item in items) or 'none'}.")


def load_appraisal(path: str | Path) -> Appraisal:
    """Load an appraisal from a JSON record."""
    return _checked(saving.load_json(path, REGISTRY))


def _checked(value: Any) -> Appraisal:
    if not isinstance(value, Appraisal):
        raise ValueError(
            f"The record holds a {type(value).__name__}, not an appraisal; save one with appraisal.save('record.json')."
        )
    return value


# Every class that a JSON record may name. What is not here is refused.
REGISTRY: Mapping[str, type] = {
    cls.__name__: cls
    for cls in (
        Agreement, AgreementRow, Appraisal, Consequence, Contribution, Core, CoreDrop, Criterion, DataDrop, DroppedRow,
        Estimate, Fluid, Instrument, ModelRow, Provenance, Screening, Settings, Site, Survey, Vortex,
    )
}  # fmt: skip


def appraise(
    survey: Survey,
    *,
    fluid: Fluid | None = None,
    site: Site | None = None,
    instrument: Instrument | None = None,
    models: Sequence[str | VortexModel] | None = None,
    background: Background | None = None,
    uncertainties: Uncertainties | None = None,
    loss: Loss = "linear",
) -> Appraisal:
    """Take a survey to the core pressure and what follows from it.

    Parameters
    ----------
    survey : Survey
        Outliers are set aside by `screen` and listed.
    fluid, site, instrument : optional
        What the survey's own facts do not say, or say wrongly. A site and an instrument are completed by the facts,
        field by field; a fluid counts as a whole. Facts that are not used are listed in the assumptions. A fluid that
        nobody named is taken as water at 15 ± 5 °C, and the answer says so.
    models : sequence, optional
        Models to rank; all ranked ones of the catalogue by default.
    background, uncertainties, loss : optional
        As for `fit_survey`.

    Returns
    -------
    Appraisal
        Printable, savable; `.answer` is one line.

    Raises
    ------
    FitError
        If no vortex is seen or no model can be fitted.
    ValueError
        If facts contradict each other or lie outside a fluid's range.
    """
    require_survey(survey)
    models = [models] if isinstance(models, str) else models
    assumptions: list[str] = []
    site = site_of(survey, site, assumptions)
    fluid = fluid_of(survey, assumptions, site=site, given=fluid)
    instrument = instrument_of(survey, instrument, assumptions)
    screened = screen(survey).survey
    settings = settings_for(
        screened, instrument=instrument, background=background, uncertainties=uncertainties, loss=loss
    )
    ranking = _rank(screened, models, settings)
    supported = ranking.supported
    best = supported[0] if supported else ranking.best
    cautions = survey_cautions(screened, ranking)
    answer = _answer(screened, ranking, fluid, site, instrument, cautions)
    drops = named_drops(answer.drop, best.fit.vortex, wander=instrument.wander if instrument else 0.0)
    core = _core(screened, ranking, fluid, answer, drops)
    return Appraisal(
        survey=screened,
        fluid=fluid,
        site=site,
        instrument=instrument,
        settings=settings,
        model_keys=None if models is None else tuple(m if isinstance(m, str) else m.key for m in models),
        screening=screen(survey, centre=best.fit.centre, peak_radius=core.vortex.peak_radius),
        models=_model_rows(ranking, fluid, answer.reference_radius),
        criterion=ranking.criterion,
        core=core,
        core_pressure_drop=answer.drop,
        centred_drop=answer.centred,
        core_pressure=answer.pressure,
        core_drops=drops if supported else (),
        envelope=answer.envelope,
        pressure_constant=answer.centred.value / (fluid.density.value * core.vortex.peak_swirl**2),
        edge_circulation=_edge_circulation(screened, best.fit),
        share_beyond=answer.beyond,
        reference=answer.reference,
        data_drop=_data_drop(screened, best.fit, fluid, answer, instrument),
        total_pressure_deficit=total_pressure_deficit(screened, best.fit, answer.centred, density=fluid.density),
        consequences=assess_all(core, fluid, site) if supported else (),
        agreements=tuple(check_agreement(row.model.key) for row in (supported or (best,))[:3]),
        assumptions=tuple(assumptions + assumptions_of(survey, settings, instrument)),
        cautions=tuple(cautions),
        versions=_versions(),
        created=datetime.now(UTC).isoformat(timespec="seconds"),
        _ranking=ranking,
    )


@dataclass(frozen=True)
class _Answer:
    """The drop, what it is relative to, and the pressure that follows."""

    drop: Estimate
    centred: Estimate
    envelope: tuple[float, float]
    beyond: float
    reference: str
    reference_radius: float | None
    ambient: Estimate | None
    pressure: Estimate | None


def _answer(
    survey: Survey,
    ranking: Ranking,
    fluid: Fluid,
    site: Site,
    instrument: Instrument | None,
    cautions: list[str],
) -> _Answer:
    """Combine the models that are not rejected; what limits the answer goes to the cautions."""
    supported = ranking.supported
    best = supported[0] if supported else ranking.best
    last_radius = float(best.fit.radius.max())
    ambient = site.axis_pressure(fluid)
    limit = site.reference_radius
    beyond = share_beyond(best.fit.vortex, last_radius, reference_radius=limit)
    reference = reference_sentence(ambient, limit)
    if beyond > _UNDETERMINED_BEYOND:
        limit, ambient = last_radius, None
        reference = f"relative to the pressure at the last station, {format_number(last_radius, 'm')} from the axis"
        cautions.append(
            f"{100 * beyond:.0f} % of the drop would come from beyond the survey, so the drop is given relative to the "
            "last station; measure farther out for the whole drop."
        )
    elif beyond > _CAUTION_BEYOND:
        cautions.append(
            f"{100 * beyond:.0f} % of the drop comes from beyond the last station, where only the model speaks; "
            "measure farther out."
        )
    if supported:
        drop, envelope = combined_drop(supported, density=fluid.density, gain=survey.velocity_gain, beyond=limit)
        for name, uncertainty in _of_the_instrument(survey, best.fit, fluid, instrument, limit):
            drop = with_contribution(drop, name, uncertainty)
    else:
        drop, envelope = Estimate(math.nan, math.nan, "core_pressure_drop"), (math.nan, math.nan)
        cautions.insert(0, f"{NO_MODEL_FITS} The closest is {best.model.name}: {best.reason} The residuals are shown.")
    centred = drop
    if may_have_missed(survey) and drop.is_determined:
        drop = Estimate(drop.interval(0.95)[0], math.nan, drop.quantity, bound="lower")
    pressure = None
    if ambient is not None and not math.isnan(drop.value):
        pressure = core_pressure_of(drop, ambient, heat_capacity_ratio=fluid.heat_capacity_ratio)
        if fluid.heat_capacity_ratio is not None and drop.value > _COMPRESSIBLE * ambient.value:
            cautions.append(
                f"The drop is {100 * drop.value / ambient.value:.1f} % of the ambient pressure: the gas expands, "
                "and the core pressure is taken through the isentropic relation instead of the constant-density "
                "drop."
            )
    return _Answer(drop, centred, envelope, beyond, reference, limit, ambient, pressure)


def _of_the_instrument(
    survey: Survey, fit: Fit, fluid: Fluid, instrument: Instrument | None, limit: float | None
) -> list[tuple[str, float]]:
    """What the stated uncertainties of wander and probe width contribute: half the change of the drop over ±u."""
    parts = []
    for name in ("wander", "probe_width"):
        stated = survey.facts.get(name)
        if instrument is None or not isinstance(stated, Estimate) or stated.uncertainty == 0.0:
            continue
        if stated.value != getattr(instrument, name):
            continue  # another value was given in its place
        ends = []
        for side in (-1.0, 1.0):
            changed: dict[str, Any] = {name: max(stated.value + side * stated.uncertainty, 0.0)}
            moved = fit_survey(
                survey,
                fit.model,
                instrument=replace(instrument, **changed),
                background=fit.background,
                uncertainties=fit.uncertainties,
                loss=fit.loss,
                start={n: fit.value(n) for n in ("centre_x", "centre_y", "core_radius")},
                on_failure="return",
            )
            ends.append(relative_to(moved.core_pressure_drop(fluid.density.value), moved.vortex, limit).value)
        parts.append((name.replace("_", " "), 0.5 * abs(ends[1] - ends[0])))
    return parts


def _core(
    survey: Survey, ranking: Ranking, fluid: Fluid, answer: _Answer, drops: tuple[CoreDrop, CoreDrop, CoreDrop]
) -> Core:
    supported = ranking.supported
    fit = (supported[0] if supported else ranking.best).fit
    if "circulation" in fit.names:
        circulation = _with_common(fit.estimate("circulation"), survey, gain=1.0, scale=1.0)
    else:
        circulation = _edge_circulation(survey, fit)
    return Core(
        vortex=fit.vortex,
        supported=tuple(row.fit.vortex for row in supported),
        drop=answer.drop,
        tap_drop=drops[1].estimate,
        ambient=answer.ambient,
        pressure=answer.pressure,
        envelope=answer.envelope,
        circulation=circulation,
        core_radius=_with_common(fit.estimate("core_radius"), survey, scale=1.0),
        peak_swirl=_with_common(fit.estimate("peak_swirl"), survey, gain=1.0),
        peak_radius=_with_common(fit.estimate("peak_radius"), survey, scale=1.0),
        density=fluid.density,
        missed_axis=may_have_missed(survey),
    )


def _rank(survey: Survey, models: Sequence[str | VortexModel] | None, settings: Settings) -> Ranking:
    return rank_models(
        survey,
        models,
        instrument=settings.instrument,
        background=settings.background,
        uncertainties=settings.uncertainties,
        loss=settings.loss,
    )


def _data_drop(survey: Survey, fit: Fit, fluid: Fluid, answer: _Answer, instrument: Instrument | None) -> DataDrop:
    """The data see the mean profile, so it is the drop of the mean profile that they are compared with."""
    whole = fit.core_pressure_drop(fluid.density.value) if answer.reference_radius is not None else answer.centred
    mean_profile = named_drops(whole, fit.vortex, wander=instrument.wander if instrument else 0.0)[2].estimate
    averaged = instrument is not None and instrument.probe_width > 0.0
    return data_drop(survey, fit, density=fluid.density, model_drop=None if averaged else mean_profile)


def _edge_circulation(survey: Survey, fit: Fit) -> Estimate:
    edge = circulation_at(fit, float(fit.radius.max()))
    return _with_common(edge, survey, gain=1.0, scale=1.0)


def _model_rows(ranking: Ranking, fluid: Fluid, reference_radius: float | None) -> tuple[ModelRow, ...]:
    rows = []
    for row in ranking:
        fit = row.fit
        shape = [fit.value(parameter.name) for parameter in fit.model.shape]
        drop = relative_to(fit.core_pressure_drop(fluid.density.value), fit.vortex, reference_radius)
        rows.append(
            ModelRow(
                key=row.model.key,
                names=row.names,
                aicc=row.aicc,
                weight=row.weight,
                p_value=row.p_value,
                rejected=row.rejected,
                reason=row.reason,
                status=fit.status,
                chi_square=fit.chi_square,
                degrees_of_freedom=fit.degrees_of_freedom,
                parameters={
                    **fit.parameters,
                    "peak_radius": fit.estimate("peak_radius"),
                    "peak_swirl": fit.estimate("peak_swirl"),
                },
                drop=drop,
                pressure_constant=fit.model.pressure_constant(*shape) if all(map(math.isfinite, shape)) else math.nan,
            )
        )
    return tuple(rows)


def _with_common(estimate: Estimate, survey: Survey, *, gain: float = 0.0, scale: float = 0.0) -> Estimate:
    """Add velocity gain and position scale, each to the power at which it enters; neither averages out."""
    if not estimate.is_determined:
        return estimate
    for name, power, common in (
        ("velocity gain", gain, survey.velocity_gain.uncertainty),
        ("position scale", scale, survey.position_scale.uncertainty),
    ):
        if not estimate.budget:
            own = (Contribution("scatter of the samples", estimate.uncertainty),)
            estimate = replace(estimate, budget=own)
        estimate = with_contribution(estimate, name, power * common * abs(estimate.value))
    return estimate


def _versions() -> dict[str, str]:
    names = ("vortexwidgets", "numpy", "scipy", "sympy", "matplotlib", "CoolProp")
    return {"Python": sys.version.split()[0], **{name: version(name) for name in names}}
