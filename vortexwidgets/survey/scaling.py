"""Scaling: columns as they stand in a file to SI, standard uncertainties, and rows left out with the reason."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from vortexwidgets import units
from vortexwidgets.survey.columns import Heading, may_be_uncertainty, usual_unit
from vortexwidgets.survey.facts import Facts, fact_named
from vortexwidgets.survey.samples import FARTHEST, FASTEST, FloatArray, SurveyError
from vortexwidgets.uncertainty import Estimate, as_estimate

_MARKERS = (-99.99, -999.0, -9999.0, -99999.0, -999.25, -32768.0, 999.0, 9999.0, 99999.0, 999.99)
_HUGE = 1e9
_BESIDE = {"remark": "remark of each row", "valid": "whether a row is valid", "flag": "whether a row is valid"}
_USUAL_COVERAGE = 2.0  # of an expanded uncertainty that names none, also of "U95": common practice
_EXAMPLE = {"length": "mm", "velocity": "m/s", "pressure": "kPa"}


@dataclass(frozen=True)
class Series:
    """One column as it stands in the file; a column of text has no numbers."""

    heading: Heading
    values: FloatArray


@dataclass
class Readings:
    """Columns of one file on their way to SI; what was taken for what, and which rows are left out, is kept.

    Parameters
    ----------
    file : str
        Name for the messages.
    series : sequence of Series
        Columns whose meaning is known and whose cells are numbers.
    facts : Facts
        Facts of the file.
    rows : sequence of int
        Line of the file of each row.
    remarks : sequence of str
        Remark of each row, "" when there is none.
    flagged : mapping of int to str
        Rows that the file itself calls invalid, by index, with the reason.
    """

    file: str
    series: Sequence[Series]
    facts: Facts
    rows: Sequence[int]
    remarks: Sequence[str] = ()
    flagged: Mapping[int, str] = field(default_factory=dict)
    taken: dict[str, str] = field(default_factory=dict, init=False)
    notes: list[str] = field(default_factory=list, init=False)
    reasons: dict[int, str] = field(default_factory=dict, init=False)
    spread_of_scale: dict[str, float] = field(default_factory=dict, init=False)
    scale_names: dict[str, str] = field(default_factory=dict, init=False)
    by_role: dict[str, Series] = field(init=False)

    def __post_init__(self) -> None:
        self.by_role = self._roles()
        self.reasons.update(self.flagged)

    def _roles(self) -> dict[str, Series]:
        found: dict[str, Series] = {}
        for item in self.series:
            if item.heading.kind in ("", "text"):
                continue
            key = f"{item.heading.role}:{item.heading.of}" if item.heading.of else item.heading.role
            if key in found:
                raise SurveyError(
                    f"{self.file}: columns '{found[key].heading.text}' and '{item.heading.text}' both hold the {key}; "
                    "rename or remove one of them."
                )
            found[key] = item
        return found

    def meaning(self, item: Series) -> str:
        """Say what a column was taken for."""
        meaning = self.taken.get(item.heading.text, _BESIDE.get(item.heading.role, "not used"))
        unit = item.heading.unit
        if meaning != "not used" and unit and unit not in item.heading.text:
            meaning += f" [{unit}]"
        return meaning

    def names(self) -> str:
        """List the headings for a message."""
        return ", ".join(f"'{item.heading.text}'" for item in self.series[:12])

    def note(self, text: str) -> None:
        """Keep a remark on how the file was read, once."""
        if text not in self.notes:
            self.notes.append(text)

    def first(self, *roles: str, besides: str | None = None) -> str | None:
        """Return the first of some roles that the file has."""
        return next((role for role in roles if role in self.by_role and role != besides), None)

    def length(self, role: str, meaning: str) -> FloatArray:
        """Give positions in metres."""
        return self._quantity(self.by_role[role], "position", meaning, FARTHEST)

    def velocity(self, role: str | None, meaning: str) -> FloatArray:
        """Give a velocity component in metres per second."""
        if role is None:
            raise SurveyError(f"{self.file}: no column holds a velocity; the headings are {self.names()}.")
        return self._quantity(self.by_role[role], "velocity", meaning, FASTEST)

    def pressure(self) -> FloatArray | None:
        """Give the static pressure in pascals, None when there is none."""
        if "pressure" not in self.by_role:
            return None
        return self._quantity(self.by_role["pressure"], "pressure", "static pressure at the samples", 1e12)

    def _quantity(self, item: Series, quantity: str, meaning: str, limit: float) -> FloatArray:
        """Values in SI, with markers of invalid vectors taken out; a missing unit is asked for, never guessed."""
        heading = item.heading
        values = self._without_markers(item)
        scaled = values * self._scale(heading, quantity) + self._offset(heading, quantity)
        self.taken[heading.text] = meaning + (f", times the {self.scale_names[heading.text]}" if heading.per else "")
        with np.errstate(invalid="ignore"):
            bad = np.flatnonzero(np.abs(scaled) > limit)
        if bad.size:
            raise SurveyError(
                f"{self.file}, row {self.rows[bad[0]]}, column '{heading.text}': {item.values[bad[0]]:g} "
                f"{heading.unit} is beyond anything that is measured; check the unit, or leave the cell empty."
            )
        return scaled

    def _without_markers(self, item: Series) -> FloatArray:
        values = np.array(item.values)
        size = np.abs(values)
        with np.errstate(invalid="ignore"):
            marked = size >= _HUGE
            listed = np.isin(values, _MARKERS)
            if listed.any():
                ordinary = size[~marked & ~listed & np.isfinite(size)]
                marked |= listed & (size > 10.0 * (np.median(ordinary) if ordinary.size else 0.0))
        for index in np.flatnonzero(marked):
            text = f"{item.heading.text} is {item.values[index]:g}, a marker of an invalid value"
            if item.heading.role not in ("axial", "pressure"):
                self.reasons.setdefault(int(index), text + self._remark(int(index)))
        values[marked] = np.nan
        return values

    def _remark(self, index: int) -> str:
        remark = self.remarks[index] if self.remarks else ""
        return f" (remark: {remark})" if remark else ""

    def drop_missing(self, *needed: FloatArray) -> None:
        """Leave out the rows where one of the arrays has no value."""
        for index in np.flatnonzero(~np.all(np.isfinite(needed), axis=0)):
            self.reasons.setdefault(int(index), "a position or velocity is missing" + self._remark(int(index)))

    def _scale(self, heading: Heading, quantity: str) -> float:
        if heading.per:
            scale = self._reference(heading)
            return scale.value * (0.01 if heading.unit == "%" else 1.0)
        if heading.unit is None:
            kind = heading.kind
            unit = _EXAMPLE.get(kind, "m/s")
            raise SurveyError(
                f"{self.file}: column '{heading.text}' has no unit; write '{heading.name} [{unit}]' in the header, or "
                f"give units={{'{heading.name}': '{unit}'}} (command line: --units \"{heading.name}={unit}\")."
            )
        return self._factor(heading, quantity)[0]

    def _offset(self, heading: Heading, quantity: str) -> float:
        return 0.0 if heading.per else self._factor(heading, quantity)[1]

    def _factor(self, heading: Heading, quantity: str) -> tuple[float, float]:
        try:
            return units.factor(heading.unit or "", quantity)
        except ValueError as error:
            # The remedy of a single value, "write for example '5 mm'", is of no use for a column.
            what, found, _ = str(error).partition("; write for example")
            usual = usual_unit(heading.unit or "", heading.kind)
            if usual is not None and usual != heading.unit:
                what += f" (prefixes and names of units are case sensitive, {usual} is meant?)"
            unit = usual or _EXAMPLE.get(heading.kind, "m/s")
            remedy = (
                f"; write '{heading.name} [{unit}]' in the header, or give units={{'{heading.name}': '{unit}'}} "
                f'(command line: --units "{heading.name}={unit}").'
            )
            raise SurveyError(f"{self.file}, column '{heading.text}': {what}{remedy if found else ''}") from error

    def _reference(self, heading: Heading) -> Estimate:
        """Find the length or velocity that a column of ratios was divided by."""
        own = fact_named(heading.per)
        usual = ("length_scale",) if heading.kind == "length" else ("velocity_scale", "free_stream")
        for name in (own, *usual):
            estimate = self.facts.estimate(name)
            if estimate is None and name == own and self.facts.text(own):  # "r/R" and the fact "R: 50 mm"
                estimate = self._read_scale(own, "length_scale" if heading.kind == "length" else "free_stream")
            if estimate is not None:
                self.scale_names[heading.text] = name.replace("_", " ")
                self.spread_of_scale[heading.kind] = estimate.uncertainty / abs(estimate.value)
                return estimate
        example = "length scale: 50 mm" if heading.kind == "length" else "free stream: 12 m/s"
        raise SurveyError(
            f"{self.file}: column '{heading.text}' is a ratio; state what it was divided by in a comment line "
            f"'# {example}', or name the unit of the column."
        )

    def _read_scale(self, name: str, quantity: str) -> Estimate:
        try:
            return as_estimate(units.read_quantity(self.facts.text(name), quantity), quantity)
        except ValueError as error:
            raise SurveyError(f"{self.file}: fact '{name}': {error}") from error

    def common(self) -> dict[str, Estimate]:
        """Uncertainties common to all samples; a scale that is uncertain is one of them."""
        common = {}
        for name, kind in (("velocity_gain", "velocity"), ("position_scale", "length")):
            stated = self.facts.estimate(name)
            own = stated.uncertainty if stated is not None else 0.0
            common[name] = Estimate(1.0, float(np.hypot(own, self.spread_of_scale.get(kind, 0.0))), name)
        return common

    def uncertainties(self, roles: Sequence[str | None]) -> FloatArray | None:
        """Give standard uncertainties, shape (components, rows), of the components in the order given."""
        columns = [self._uncertainty_of(role) for role in roles if role is not None]
        known = [values for values in columns if values is not None]
        if not known:
            for item in self.series:
                if item.heading.kind == "" and may_be_uncertainty(item.heading.text):
                    self.note(
                        f"'{item.heading.text}' looks like an uncertainty but is not understood, and is not used; name "
                        "it 'uncertainty [m/s]', or 'uncertainty (k=2) [m/s]' where it is expanded"
                    )
            return None
        if columns[0] is None:
            self.note("uncertainties of a part of the components only: not used, the scatter is estimated from the fit")
            return None
        if len(known) < len(columns):
            self.note("a component without stated uncertainty is taken to be as uncertain as the first one")
        filled = np.array([columns[0] if values is None else values for values in columns])
        for index in np.flatnonzero(~np.all(np.isfinite(filled), axis=0)):
            self.reasons.setdefault(int(index), "the uncertainty is missing" + self._remark(int(index)))
        return filled

    def _uncertainty_of(self, role: str) -> FloatArray | None:
        for key in (f"uncertainty:{role}", "uncertainty"):
            if key in self.by_role:
                return self._standard(self.by_role[key], "standard uncertainty", 1.0)
        for key in (f"rms:{role}", "rms"):
            if key in self.by_role:
                number = self._number_of_samples()
                if number is not None:
                    return self._standard(self.by_role[key], "rms, divided by the root of the samples", np.sqrt(number))
                self.note(
                    f"'{self.by_role[key].heading.text}' is an rms without a number of samples and is not used as an "
                    "uncertainty; add a column 'samples' or a fact '# samples: 500'"
                )
        stated = self.facts.estimate("uncertainty")
        if stated is None:
            return None
        coverage = self.facts.number("coverage_factor") or 1.0
        if not stated.value > 0.0:
            raise SurveyError(f"{self.file}: uncertainty must be positive, got {stated.value:g} m/s; correct the fact.")
        return np.full(len(self.rows), stated.value / coverage)

    def _number_of_samples(self) -> FloatArray | float | None:
        stated = self.facts.number("effective_samples")
        if stated is None and "samples" in self.by_role:
            item = self.by_role["samples"]
            self.taken[item.heading.text] = "number of samples behind each row"
            return np.where(item.values >= 1.0, item.values, np.nan)
        stated = stated if stated is not None else self.facts.number("samples")
        if stated is not None and stated < 1.0:
            raise SurveyError(f"{self.file}: samples must be at least 1, got {stated:g}.")
        return stated

    def _standard(self, item: Series, meaning: str, divisor: FloatArray | float) -> FloatArray:
        heading = item.heading
        if heading.unit == "%" and heading.per == "scale":
            raise SurveyError(
                f"{self.file}: column '{heading.text}' is a percentage of something it does not name; give the "
                "uncertainty in m/s, or as 'uncertainty/U∞ [%]' with the fact '# free stream: 12 m/s'."
            )
        stated = heading.coverage or self.facts.number("coverage_factor")
        coverage = stated or (_USUAL_COVERAGE if heading.expanded else 1.0)
        coverage = coverage if meaning.startswith("standard") else 1.0
        scaled = np.asarray(item.values * self._scale(heading, "velocity") / divisor / coverage)
        usual = ", the usual coverage factor of an expanded uncertainty" if stated is None else ""
        self.taken[heading.text] = meaning + (f" after division by k = {coverage:g}{usual}" if coverage != 1.0 else "")
        bad = np.flatnonzero((scaled <= 0.0) & [index not in self.reasons for index in range(len(self.rows))])
        if bad.size:
            raise SurveyError(
                f"{self.file}, row {self.rows[bad[0]]}, column '{heading.text}': the uncertainty is "
                f"{item.values[bad[0]]:g}, and must be positive; correct it, or remove the column to have the scatter "
                "estimated from the fit."
            )
        return scaled
