"""Reading: CSV and NetCDF in; every refusal names file, row, column and remedy."""

from __future__ import annotations

import dataclasses
import hashlib
import os
from collections.abc import Mapping, Sequence
from importlib import resources
from pathlib import Path

import numpy as np

from vortexwidgets.survey.assembly import assemble
from vortexwidgets.survey.columns import Heading, understand
from vortexwidgets.survey.facts import read_facts
from vortexwidgets.survey.grid import is_grid, read_grid
from vortexwidgets.survey.scaling import Readings, Series
from vortexwidgets.survey.survey import Survey, SurveyError
from vortexwidgets.survey.table import Table, numbers, parse_table, read_bytes

_YES = {"1", "1.0", "true", "yes", "y", "ok", "good", "valid", "t", ""}
_NO = {"0", "0.0", "false", "no", "n", "bad", "invalid", "outlier", "x", "f", "rejected", "reject"}
_NUMERIC = ("length", "velocity", "pressure", "number")


def read_survey(path: str | os.PathLike[str], units: Mapping[str, str] | None = None) -> Survey:
    r"""Read a survey from a CSV or NetCDF file; what each column was taken for is in ``survey.provenance.columns``.

    Parameters
    ----------
    path : path
        CSV with comma, semicolon, tab or blanks between the columns, decimal points or decimal commas, one header row
        such as ``position [mm],velocity [m/s],uncertainty [m/s]`` and facts in comment lines such as
        ``# temperature: 15 degC``; or NetCDF with `units` attributes.
    units : mapping of str to str, optional
        Units of columns by heading, for headings that have none or a wrong one: ``{"position": "mm"}``.

    Returns
    -------
    Survey

    Raises
    ------
    SurveyError
        If the file cannot be read as a survey: the message names file, row, column, value and remedy.

    Notes
    -----
    *Columns.* A position along a line (``position``, ``x``), a radius (``r``) or two coordinates (``x``, ``y``); a
    velocity (``velocity``, ``swirl``, ``v_theta``, ``u``, ``v``, ``w``, ``along``, ``axial``); an ``uncertainty``, or
    an ``rms`` with ``samples``, or an expanded uncertainty (``U95``, ``uncertainty (k=2)``), which is divided by its
    coverage factor, 2 where none is stated; ``static pressure``; ``valid``, ``flag`` and ``remark``. Units stand in
    brackets, behind the name, or in a row of their own. Ratios such as ``r/c`` and ``V/U∞`` need the facts ``length
    scale`` and ``free stream``.

    *Facts.* ``title``, ``fluid``, ``temperature``, ``salinity``, ``density``, ``viscosity`` (kinematic), ``vapour
    pressure``, ``surface tension`` (these replace the fluid's own), ``ambient pressure``, ``surface pressure``,
    ``depth``, ``submergence``, ``free stream``, ``orientation`` (surface, submerged, air), ``elevation``,
    ``gravity``, ``wander``, ``probe width``, ``averaging``, ``translation speed``, ``length scale``, ``reference
    radius``, ``tensile strength``, ``gas saturation``, ``inception``, ``miss distance``, ``velocity gain`` and
    ``position scale`` (1 ± u), ``uncertainty``, ``coverage factor``, ``samples``, ``axes`` (as ``y down``), ``view``
    (``upstream``), ``vortex axis``.

    *Signs.* A traverse is positive to the left of increasing position, so that counter-clockwise circulation is
    positive, seen against the axis of the vortex. Rows without a value, with a marker such as 9.99e9, or flagged as
    invalid are left out and listed in ``survey.provenance.dropped``.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     file = pathlib.Path(folder) / "bench.csv"
    ...     _ = file.write_text("position [mm];velocity [m/s]\n-10;-0,8\n0;0,1\n10;0,9\n")
    ...     survey = read_survey(file)
    >>> survey.x.tolist(), survey.velocity.tolist()
    ([-0.01, 0.0, 0.01], [-0.8, 0.1, 0.9])
    """
    place = Path(path)
    content = read_bytes(place)
    if is_grid(content):
        return _survey_of_grid(place, content, units or {})
    return _survey_of_table(parse_table(content, place.name), units or {})


def example_survey(name: str) -> Survey:
    """Read a built-in survey; all of them are invented and say so in their title.

    Parameters
    ----------
    name : str
        "wing-tip", "pump-intake" or "whirlwind".

    Returns
    -------
    Survey

    Raises
    ------
    SurveyError
        If there is no such survey.

    Examples
    --------
    >>> "invented" in example_survey("wing-tip").facts["title"]
    True
    """
    folder = resources.files("vortexwidgets.survey") / "examples"
    known = sorted(item.name.removesuffix(".csv") for item in folder.iterdir() if item.name.endswith(".csv"))
    if name not in known:
        raise SurveyError(f"no built-in survey is named '{name}'; known: {', '.join(known)}.")
    return _survey_of_table(parse_table((folder / f"{name}.csv").read_bytes(), f"{name}.csv"), {})


def _survey_of_table(table: Table, units: Mapping[str, str]) -> Survey:
    row_of_units = table.units or (None,) * len(table.headings)
    headings = [
        understand(text, None if unit is None or not unit.strip() else unit)
        for text, unit in zip(table.headings, row_of_units, strict=True)
    ]
    if len(headings) == 1:
        raise SurveyError(
            f"{table.file} has one column, '{headings[0].text[:60]}'; a survey needs a position and a velocity, "
            "separated by comma, semicolon, tab or blanks."
        )
    headings = _with_units(headings, units, table.file)
    series = []
    for column, heading in enumerate(headings):
        values = numbers(table, column) if heading.kind in _NUMERIC else np.full(len(table.rows), np.nan)
        series.append(Series(heading, values))
    remarks = [""] * len(table.rows)
    flagged: dict[int, str] = {}
    notes = list(table.notes)
    for column, heading in enumerate(headings):
        cells = [row[column] for _, row in table.rows]
        if heading.role == "remark":
            remarks = [cell[:80] for cell in cells]
        elif heading.role in ("valid", "flag"):
            flagged.update(_invalid(cells, heading, notes))
    readings = Readings(
        file=table.file,
        series=series,
        facts=read_facts(table.comments, table.file),
        rows=[row for row, _ in table.rows],
        remarks=remarks,
        flagged=flagged,
    )
    return assemble(readings, table.sha256, notes)


def _survey_of_grid(path: Path, content: bytes, units: Mapping[str, str]) -> Survey:
    grid = read_grid(path)
    headings = _with_units([heading for heading, _ in grid.columns], units, path.name)
    series = [Series(heading, values) for heading, (_, values) in zip(headings, grid.columns, strict=True)]
    readings = Readings(
        file=path.name,
        series=series,
        facts=read_facts([(0, comment) for comment in grid.comments], path.name),
        rows=range(series[0].values.size),
    )
    return assemble(readings, hashlib.sha256(content).hexdigest(), ["rows are counted from 0 over the flattened grid"])


def _with_units(headings: Sequence[Heading], units: Mapping[str, str], file: str) -> list[Heading]:
    """Replace units of headings by those the caller gave."""
    changed = list(headings)
    for name, unit in units.items():
        wanted = name.strip().lower()
        exact = [i for i, h in enumerate(headings) if wanted in (h.text.strip().lower(), h.name.lower())]
        found = exact or [i for i, heading in enumerate(headings) if wanted == heading.role]
        if not found:
            known = ", ".join(f"'{heading.name}'" for heading in headings)
            raise SurveyError(f"{file} has no column '{name}' to give the unit '{unit}'; its columns are {known}.")
        for index in found:
            old = headings[index]
            again = understand(old.name, unit)
            changed[index] = dataclasses.replace(old, unit=again.unit, per=again.per)
    return changed


def _invalid(cells: Sequence[str], heading: Heading, notes: list[str]) -> dict[int, str]:
    """Rows that the file itself calls invalid; a code whose meaning is not common is left alone and said so."""
    found, unknown = {}, set()
    for index, cell in enumerate(cells):
        word = cell.strip().lower()
        negative = word.startswith("-") and word[1:].replace(".", "", 1).isdigit()
        if (word in _NO and (heading.role == "valid" or not word[:1].isdigit())) or (
            heading.role == "flag" and negative
        ):
            found[index] = f"{heading.text} is '{cell}'"
        elif word not in _YES:
            unknown.add(cell)
    if unknown:
        shown = ", ".join(sorted(unknown)[:5])
        notes.append(f"column '{heading.text}': the meaning of {shown} is not known; those rows are kept")
    return found
