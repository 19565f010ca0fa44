"""The parts of an appraisal as HTML for a panel; every text is escaped."""

from __future__ import annotations

import html
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from vortexwidgets.consequences.consequence import chance_text
from vortexwidgets.formatting import format_estimate, format_number

if TYPE_CHECKING:
    from vortexwidgets.appraisal import Appraisal
    from vortexwidgets.survey.survey import Survey
    from vortexwidgets.uncertainty import Contribution


_NO_SURVEY = '<p class="vx-quiet">Read a survey to begin.</p>'
_NOT_YET = '<p class="vx-quiet">Not appraised yet: press “Appraise”.</p>'


def appraisal_pages(survey: Survey | None, appraisal: Appraisal | None) -> dict[str, str]:
    """Return the page of every section of the panel."""
    read = _NO_SURVEY if survey is None else survey_page(survey)
    if appraisal is None:
        return {"survey": read, "answer": _NOT_YET, "models": _NOT_YET, "core": _NOT_YET, "consequences": _NOT_YET}
    return {
        "survey": read,
        "answer": f'<p class="vx-answer">{html.escape(appraisal.answer)}</p>',
        "models": models_page(appraisal),
        "core": core_page(appraisal),
        "consequences": consequences_page(appraisal),
    }


def html_table(header: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """Return a table of escaped cells.

    Examples
    --------
    >>> html_table(["model"], [["<b>"]])
    '<table><tr><th>model</th></tr><tr><td>&lt;b&gt;</td></tr></table>'
    """
    head = "".join(f"<th>{html.escape(cell)}</th>" for cell in header)
    body = "".join("<tr>" + "".join(f"<td>{html.escape(cell)}</td>" for cell in row) + "</tr>" for row in rows)
    return f"<table>{f'<tr>{head}</tr>' if head else ''}{body}</table>"


def sentences(texts: Iterable[str], css_class: str = "") -> str:
    """Return sentences as a list, nothing when there are none."""
    items = "".join(f"<li>{html.escape(text)}</li>" for text in texts)
    return f'<ul class="{css_class}">{items}</ul>' if items else ""


def survey_page(survey: Survey) -> str:
    """Return what was read, what each column was taken for, and what was dropped."""
    source = survey.provenance
    dropped = [f"Row {row.row} was dropped: {row.reason}" for row in source.dropped]
    return f"<p>{html.escape(str(survey))}</p>" + sentences([*source.columns, *source.notes, *dropped], "vx-quiet")


def models_page(appraisal: Appraisal) -> str:
    """Return the ranking with the core of every model."""
    rows = [
        [
            ", ".join(row.names),
            f"{row.aicc:.1f}",
            f"{100 * row.weight:.1f} %",
            "rejected" if row.rejected else "not rejected",
            format_estimate(row.parameters["core_radius"]) if "core_radius" in row.parameters else "",
            format_estimate(row.drop),
        ]
        for row in appraisal.models
    ]
    header = ["model", "AICc", "weight", "by the data", "core radius", "core pressure drop"]
    return html_table(header, rows) + f'<p class="vx-quiet">{html.escape(appraisal.criterion)}</p>'


def core_page(appraisal: Appraisal) -> str:
    """Return the pressure on the axis: the three named drops, the envelope, the cross-check, and what is doubtful."""
    low, high = appraisal.envelope
    pressure = (
        "not given: state a pressure" if appraisal.core_pressure is None else format_estimate(appraisal.core_pressure)
    )
    rows = [
        ["core pressure, absolute", pressure],
        *([f"drop, {drop.name}", format_estimate(drop.estimate)] for drop in appraisal.core_drops),
        ["envelope of the models not rejected", f"{format_number(low, 'Pa')} to {format_number(high, 'Pa')}"],
        ["straight from the data", format_estimate(appraisal.data_drop.estimate)],
        ["K in drop = K ρ v_peak²", format_number(appraisal.pressure_constant, "")],
        ["share from beyond the survey", f"{100 * appraisal.share_beyond:.1f} %"],
    ]
    budget = appraisal.core_pressure_drop.budget
    assumed = f'<p class="vx-quiet">Assumed:</p>{sentences(appraisal.assumptions, "vx-quiet")}'
    return html_table([], rows) + budget_page(budget) + sentences(appraisal.cautions, "vx-caution") + assumed


def budget_page(budget: Sequence[Contribution]) -> str:
    """Return which input contributes how much to the uncertainty of the drop, largest first."""
    ordered = sorted(budget, key=lambda item: -item.uncertainty)
    rows = [[item.name, format_number(item.uncertainty, "Pa")] for item in ordered]
    return html_table(["uncertainty of the drop from", "standard uncertainty"], rows) if rows else ""


def consequences_page(appraisal: Appraisal) -> str:
    """Return what follows, each with its criterion, verdict and caution."""
    blocks = []
    for item in appraisal.consequences:
        chance = "" if item.probability is None else f" (probability {chance_text(item.probability)})"
        verdict = html.escape(f"{item.criterion.text}: {item.verdict}{chance}")
        mark = item.verdict.replace(" ", "-")
        blocks.append(
            f'<div class="vx-consequence vx-{html.escape(mark)}"><b>{html.escape(item.name)}</b>: '
            f"{html.escape(item.question)}<br><b>{html.escape(format_estimate(item.estimate))}</b>. {verdict}"
            f"{html_table([], [[name, format_estimate(value)] for name, value in item.details])}{sentences(item.notes)}"
            f'<p class="vx-quiet">{html.escape(item.caution)}</p></div>'
        )
    return "".join(blocks) or '<p class="vx-quiet">Nothing follows that this package could judge.</p>'
