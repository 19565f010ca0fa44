"""What was assumed and what limits the answer, as sentences."""

from __future__ import annotations

from vortexwidgets.fitting.fit import Settings, fit_survey
from vortexwidgets.fitting.ranking import Ranking
from vortexwidgets.fitting.result import FitError
from vortexwidgets.formatting import format_estimate, format_number
from vortexwidgets.survey.instrument import Instrument
from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Estimate


def may_have_missed(survey: Survey) -> bool:
    """Whether the line of a traverse may have missed the axis without showing it."""
    return survey.geometry == "traverse" and not survey.two_components and survey.miss_distance is None


def reference_sentence(ambient: Estimate | None, radius: float | None) -> str:
    """What the drop is relative to."""
    if radius is not None:
        return f"relative to the pressure at {format_number(radius, 'm')} from the axis"
    if ambient is None:
        return "relative to the far field, whose pressure was not given"
    return f"relative to p∞ = {format_estimate(ambient)} absolute at the elevation of the axis"


def survey_cautions(survey: Survey, ranking: Ranking) -> list[str]:
    """What the survey and its fits leave open."""
    cautions = []
    best = ranking.best
    if may_have_missed(survey):
        cautions.append(
            "One component was measured and no miss distance stated, so the line may have missed the axis: the drop "
            "is a lower "
            "bound. Measure the component along the line, or state the miss distance."
        )
    for row in ranking.supported or (best,):
        cautions += [f"{row.model.name}: {text}" for text in dict.fromkeys(row.fit._open.values())]
    if survey.geometry == "traverse" and best.fit.background == "none":
        try:
            wider = fit_survey(
                survey, best.model, background="uniform", uncertainties=best.fit.uncertainties, on_failure="return"
            )
        except (ValueError, FitError):
            wider = None
        unit = best.fit.scatter**2 if best.fit.uncertainties == "relative" else 1.0
        if wider is not None and wider.converged and best.fit.chi_square - wider.chi_square > 10.0 * unit:
            cautions.append(
                "A uniform background flow would fit markedly better "
                f"(chi² falls by {(best.fit.chi_square - wider.chi_square) / unit:.0f}); consider background='uniform'."
            )
    cautions.append(
        "An intrusive probe can move or burst a core, seeding can leave it empty, a hot wire reads speed and not a "
        "component, "
        "and tunnel walls have images (common practice)."
    )
    return cautions


def assumptions_of(survey: Survey, settings: Settings, instrument: Instrument | None) -> list[str]:
    """What was taken without being measured."""
    sentences = ["The vortex is axisymmetric and in radial equilibrium, dp/dr = ρ v²/r."]
    if instrument is None or instrument.wander == 0.0:
        sentences.append("The vortex did not wander while it was measured; fluctuation is not included.")
    else:
        sentences.append(
            f"The vortex wandered with a standard deviation of {format_number(instrument.wander, 'm')} along each axis."
        )
    if instrument is None or instrument.probe_width == 0.0:
        sentences.append("The probe is small beside the core.")
    else:
        sentences.append(
            f"The probe averages over {format_number(instrument.probe_width, 'm')} ({instrument.averaging})."
        )
    background = {"none": "No background flow is fitted.", "uniform": "A uniform background flow is fitted.",
                  "linear": "A background flow with a constant gradient is fitted."}  # fmt: skip
    sentences.append(background[settings.background])
    if settings.uncertainties == "absolute":
        sentences.append("The stated uncertainties are standard ones, independent from sample to sample.")
    else:
        sentences.append("The uncertainty of a sample is the scatter of the residuals.")
    if survey.velocity_gain.uncertainty == 0.0:
        sentences.append("The velocity gain is taken as exact; its uncertainty would enter the drop twice.")
    return sentences
