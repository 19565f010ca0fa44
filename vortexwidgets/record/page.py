"""The record as a page: what each section says, as plain values for the template, and its figures."""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cache
from pathlib import Path
from typing import Any

from vortexwidgets.formatting import format_estimate, format_number, percent
from vortexwidgets.record.figures import consequence_figure, figures
from vortexwidgets.record.maths import font_rule, formulas
from vortexwidgets.record.texts import (
    Row,
    full_text,
    in_unit_of,
    interval_text,
    number_text,
    p_value_text,
    probability,
    shown,
    value_rows,
    value_text,
    when,
    words,
)

_MOST_READINGS = 30  # more would fill pages


def render(appraisal: Any) -> str:
    """Return the page of an appraisal.

    Parameters
    ----------
    appraisal : Appraisal

    Returns
    -------
    str
    """
    return str(_template().render(**content(appraisal)))


def content(appraisal: Any) -> dict[str, Any]:
    """Return what the page says, section by section; every text is plain and is escaped by the template.

    Parameters
    ----------
    appraisal : Appraisal

    Returns
    -------
    dict
    """
    from markupsafe import Markup

    survey = appraisal.survey
    title = str(survey.facts.get("title") or survey.provenance.file or "Survey")
    return {
        "title": title,
        "answer": appraisal.answer,
        "created": when(appraisal.created),
        "font": Markup(font_rule()),
        "result": result_rows(appraisal),
        "verdicts": [verdict_row(item, number) for number, item in enumerate(appraisal.consequences, 1)],
        "survey": str(survey),
        "provenance": survey.provenance,
        "heading": " · ".join(dict.fromkeys(filter(None, (title, survey.provenance.file)))),
        "dropped": by_reason([(row.row, row.reason) for row in survey.provenance.dropped]),
        "set_aside": set_aside_rows(survey),
        "screening": appraisal.screening,
        "reach": number_text(appraisal.screening.reach, "peak radii"),
        "facts": [(words(name), shown(name, value)) for name, value in survey.facts.items()],
        "common": common_rows(survey),
        "instrument": [] if appraisal.instrument is None else value_rows(appraisal.instrument),
        "settings": settings_rows(appraisal.settings),
        "reference": appraisal.reference,
        "site": value_rows(appraisal.site, skip=("confirm_absolute",)),
        "fluid": value_rows(appraisal.fluid, skip=("source",)),
        "fluid_source": appraisal.fluid.source,
        "models": [model_row(row) for row in appraisal.models],
        "criterion": appraisal.criterion,
        "parameters": parameter_tables(appraisal),
        "rejected": rejected_rows(appraisal),
        "drops": [
            (item.name, value_text(item.estimate), interval_text(item.estimate), item.explanation)
            for item in appraisal.core_drops
        ],
        "envelope": envelope(appraisal),
        "share_beyond": percent(appraisal.share_beyond),
        "edge_circulation": format_estimate(appraisal.edge_circulation),
        "data_drop": format_estimate(appraisal.data_drop.estimate),
        "data_shares": data_shares(appraisal.data_drop),
        "data_sentences": appraisal.data_drop.sentences,
        "deficit": None if appraisal.total_pressure_deficit is None else full_text(appraisal.total_pressure_deficit),
        "budgets": budgets(appraisal),
        "consequences": [consequence_page(item, number) for number, item in enumerate(appraisal.consequences, 1)],
        "derivation": derivation_steps(appraisal),
        "agreements": [agreement_table(item) for item in appraisal.agreements],
        "assumptions": appraisal.assumptions,
        "cautions": appraisal.cautions,
        "versions": list(appraisal.versions.items()),
        "figures": figures(appraisal),
    }


# Sections -------------------------------------------------------------------------------------------------------------


def result_rows(appraisal: Any) -> list[tuple[str, str, str]]:
    """Quantity, value with standard uncertainty, 95 % interval."""
    core = appraisal.core
    estimates = [
        ("core pressure drop (p∞ − p on the axis)", appraisal.core_pressure_drop),
        ("core pressure, absolute", appraisal.core_pressure),
        ("largest swirl velocity", core.peak_swirl),
        ("radius of the largest swirl", core.peak_radius),
        ("core radius of the best model", core.core_radius),
        ("circulation", core.circulation),
    ]
    known = appraisal.centred_drop.is_determined
    if appraisal.core_pressure_drop.bound is not None and known:
        estimates.insert(1, ("drop if the line went through the axis", appraisal.centred_drop))
    rows = [(name, value_text(estimate), interval_text(estimate)) for name, estimate in estimates]
    if known:
        rows.append(("K in drop = K ρ v_peak²", number_text(appraisal.pressure_constant, digits=3), ""))
    rows.append(("drop over the models not rejected", envelope(appraisal), ""))
    rows.append(("drop straight from the data, no model", value_text(appraisal.data_drop.estimate), ""))
    rows.append(("share of the drop from beyond the survey", percent(appraisal.share_beyond), ""))
    rows.append(("reference", appraisal.reference, ""))
    return rows


def by_reason(rows: Sequence[tuple[int, str]]) -> list[tuple[int, str, str]]:
    """Number, numbers of the rows, and reason; rows with one reason stand together.

    Examples
    --------
    >>> by_reason([(5, "no number"), (9, "repeated header"), (12, "no number")])
    [(2, '5, 12', 'no number'), (1, '9', 'repeated header')]
    """
    groups: dict[str, list[int]] = {}
    for row, reason in rows:
        groups.setdefault(reason, []).append(row)
    return [(len(found), ", ".join(map(str, found)), reason) for reason, found in groups.items()]


def set_aside_rows(survey: Any) -> list[tuple[str, str, str]]:
    """Samples, reading and reason: one by one as long as they are few."""
    aside = list(survey.set_aside.items())
    if len(aside) > _MOST_READINGS:
        return [(numbers, f"{count} samples", reason) for count, numbers, reason in by_reason(aside)]
    return [(str(index), _sample(survey, index), reason) for index, reason in aside]


def verdict_row(item: Any, number: int) -> dict[str, str]:
    """One line of the table of verdicts."""
    return {
        "target": f"consequence-{number}",
        "name": item.name,
        "estimate": value_text(item.estimate),
        "criterion": item.criterion.text,
        "verdict": item.verdict,
        "mark": item.verdict.replace(" ", "-"),
        "probability": probability(item.probability),
    }


def model_row(row: Any) -> dict[str, Any]:
    """One line of the ranking."""
    return {
        "names": " = ".join(row.names),
        "aicc": number_text(row.aicc, digits=1),
        "weight": percent(row.weight),
        "p": p_value_text(row.p_value),
        "rejected": row.rejected,
        "verdict": "rejected" if row.rejected else "not rejected",
        "reason": row.reason,
        "drop": format_estimate(row.drop),
        "constant": number_text(row.pressure_constant, digits=3),
        "status": row.status,
    }


def parameter_tables(appraisal: Any) -> list[dict[str, Any]]:
    """Parameters, with their limits, of each model that is not rejected."""
    return [
        {
            "names": " = ".join(row.names),
            "status": row.status,
            "misfit": f"chi² {row.chi_square:.4g} on {row.degrees_of_freedom} degrees of freedom",
            "rows": [(words(name), value_text(item), interval_text(item)) for name, item in row.parameters.items()],
        }
        for row in appraisal.models
        if not row.rejected
    ]


def rejected_rows(appraisal: Any) -> list[list[str]]:
    """Model, core radius, peak radius and peak swirl of each model that is rejected."""
    names = ("core_radius", "peak_radius", "peak_swirl")
    return [
        [" = ".join(row.names), *(value_text(row.parameters.get(name)) for name in names)]
        for row in appraisal.models
        if row.rejected
    ]


def common_rows(survey: Any) -> list[Row]:
    """What is common to all samples."""
    rows = [
        (
            "velocity gain",
            f"1 ± {survey.velocity_gain.uncertainty:.3g}" if survey.velocity_gain.uncertainty else "exact",
        ),
        (
            "position scale",
            f"1 ± {survey.position_scale.uncertainty:.3g}" if survey.position_scale.uncertainty else "exact",
        ),
    ]
    if survey.uncertainty is None:
        rows.append(("uncertainty of a sample", "not stated; taken from the scatter of the residuals"))
    else:
        low, high = float(survey.uncertainty.min()), float(survey.uncertainty.max())
        text = (
            format_number(low, "m/s") if low == high else f"{format_number(low, 'm/s')} to {format_number(high, 'm/s')}"
        )
        rows.append(("standard uncertainty of a sample", text))
    if survey.geometry == "traverse":
        missed = survey.miss_distance
        rows.append(("distance at which the line misses the axis", "not stated" if missed is None else str(missed)))
    return rows


def settings_rows(settings: Any) -> list[Row]:
    """How every model was fitted."""
    background = {"none": "none", "uniform": "uniform", "linear": "uniform with constant gradient"}
    uncertainties = {"absolute": "as stated in the survey", "relative": "from the scatter of the residuals"}
    return [
        ("background flow fitted", background.get(settings.background, settings.background)),
        ("uncertainties", uncertainties.get(settings.uncertainties, settings.uncertainties)),
        ("loss", "least squares" if settings.loss == "linear" else settings.loss),
    ]


def data_shares(data_drop: Any) -> list[tuple[str, str, str]]:
    """The three shares of the drop straight from the data."""
    parts = [
        ("between the first and the last station", data_drop.measured),
        ("towards the axis, at least a solid-body core", data_drop.towards_axis),
        ("beyond the last station, at constant circulation", data_drop.beyond),
    ]
    total = sum(part for _, part in parts)
    return [(name, in_unit_of(total, part, "Pa"), percent(part / total if total else math.nan)) for name, part in parts]


def budgets(appraisal: Any) -> list[dict[str, Any]]:
    """Which input contributes how much, for the drop and for the pressure on the axis."""
    from vortexwidgets.plots.result import sorted_budget

    tables = []
    for name, estimate in (
        ("core pressure drop", appraisal.core_pressure_drop),
        ("core pressure", appraisal.core_pressure),
    ):
        if estimate is None or not estimate.budget:
            continue
        parts = sorted_budget(estimate.budget)
        whole = sum(part.uncertainty**2 for part in parts)
        rows = [
            (
                part.name,
                in_unit_of(estimate.uncertainty, part.uncertainty, estimate.unit),
                percent(part.uncertainty**2 / whole),
            )
            for part in parts
        ]
        rows.append(("together", in_unit_of(estimate.uncertainty, estimate.uncertainty, estimate.unit), ""))
        tables.append({"name": name, "rows": rows})
    return tables


def consequence_page(item: Any, number: int) -> dict[str, Any]:
    """Everything that one consequence says."""
    return {
        **verdict_row(item, number),
        "question": item.question,
        "value": full_text(item.estimate),
        "value_name": f"value ({words(item.estimate.quantity)})" if item.estimate.quantity else "value",
        "criterion_source": item.criterion.source,
        "source": item.source,
        "caution": item.caution,
        "details": [(name, value_text(estimate)) for name, estimate in item.details],
        "notes": item.notes,
        "figure": consequence_figure(item),
    }


def derivation_steps(appraisal: Any) -> dict[str, Any]:
    """The derivation of the best model, typeset."""
    from markupsafe import Markup

    from vortexwidgets.models.derivation import derivation

    row = next((row for row in appraisal.models if not row.rejected), appraisal.models[0])
    steps = [
        {"title": step.title, "formulas": [Markup(part) for part in formulas(step.equation)], "sentence": step.sentence}
        for step in derivation(row.key).steps
    ]
    return {"name": row.names[0], "source": appraisal.core.vortex.model.source, "steps": steps}


def agreement_table(agreement: Any) -> dict[str, Any]:
    """Symbolic against numeric, for one model."""
    rows = [
        (
            words(row.quantity),
            row.compared_with,
            format_number(row.worst, "", 2),
            f"x = {format_number(row.at, digits=3)}",
        )
        for row in agreement.rows
    ]
    return {"model": str(getattr(agreement.model, "name", agreement.model)), "rows": rows}


def envelope(appraisal: Any) -> str:
    """Lowest to highest drop over the models that are not rejected."""
    low, high = appraisal.envelope
    if math.isnan(low):
        return "every model is rejected"
    if math.isinf(high):
        return f"at least {format_number(low, 'Pa', 3)}"
    return f"{format_number(low, 'Pa', 3)} to {format_number(high, 'Pa', 3)}"


# Inside ---------------------------------------------------------------------------------------------------------------


def _sample(survey: Any, index: int) -> str:
    coordinates = (survey.x[index], survey.y[index]) if survey.geometry == "plane" else (survey.x[index],)
    place = ", ".join(format_number(float(at), "m") for at in coordinates)
    return f"{format_number(float(survey.velocity[index]), 'm/s')} at {place}"


@cache
def _template() -> Any:
    import jinja2

    environment = jinja2.Environment(
        autoescape=True, undefined=jinja2.StrictUndefined, trim_blocks=True, lstrip_blocks=True
    )
    source = Path(__file__).with_name("page.html.jinja").read_text(encoding="utf-8")
    return environment.from_string(source)
