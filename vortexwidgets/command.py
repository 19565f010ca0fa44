"""The command line; the same verbs as the library."""

from __future__ import annotations

import argparse
import dataclasses
import html
import importlib.util
import json
import os
import shutil
import subprocess
import sys
import textwrap
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn

if TYPE_CHECKING:
    from vortexwidgets.appraisal import Appraisal
    from vortexwidgets.survey.survey import Survey

DONE, AT_FAULT = 0, 2

# Option -> fact, quantity, unit of a bare number.
_FACTS = {
    "temperature": ("temperature", "temperature", "degC"),
    "density": ("density", "density", "kg/m3"),
    "salinity": ("salinity", "salinity", "g/kg"),
    "ambient_pressure": ("ambient_pressure", "ambient_pressure", "Pa"),
    "surface_pressure": ("surface_pressure", "surface_pressure", "Pa"),
    "depth": ("depth", "depth", "m"),
    "speed": ("free_stream", "free_stream", "m/s"),
    "translation_speed": ("translation_speed", "translation_speed", "m/s"),
    "reference_radius": ("reference_radius", "reference_radius", "m"),
    "wander": ("wander", "wander", "m"),
    "probe_width": ("probe_width", "probe_width", "m"),
}


class _Parser(argparse.ArgumentParser):
    """A parser whose complaint is one sentence."""

    def error(self, message: str) -> NoReturn:
        self.exit(AT_FAULT, f"{self.prog}: {message}; see '{self.prog} --help'.\n")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one verb of the command line.

    Parameters
    ----------
    arguments : sequence of str, optional
        Words after the program's name; those of the process by default.

    Returns
    -------
    int
        0 done; 2 the input or the command is at fault, said in one sentence on standard error.
    """
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):  # a terminal without "±" shows "?" instead of failing
            stream.reconfigure(errors="replace")
    try:
        options = _parser().parse_args(arguments)
        options.run(options)
        sys.stdout.flush()
    except SystemExit as stop:  # argparse has said its sentence, or printed its help
        return int(stop.code or 0)
    except BrokenPipeError:  # the reader of a pipe has seen enough
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except KeyboardInterrupt:
        return 130
    except (ValueError, OSError, RuntimeError) as error:
        print(f"vortexwidgets: {_sentence(error)}", file=sys.stderr)
        return AT_FAULT
    return DONE


def _sentence(error: Exception) -> str:
    if isinstance(error, OSError) and error.strerror:
        where = f" {error.filename}" if error.filename else ""
        return f"cannot use{where}: {error.strerror.lower()}."
    text = "".join(sign if sign.isprintable() else " " for sign in str(error))
    return " ".join(text.split()) or type(error).__name__


def _parser() -> _Parser:
    parser = _Parser(prog="vortexwidgets", description="From a survey of a swirling flow to a defended core pressure.")
    parser.add_argument("--version", action="store_true", help="print the version")
    parser.set_defaults(run=_version_or_help, parser=parser)
    verbs = parser.add_subparsers(metavar="VERB", title="verbs", parser_class=_Parser)

    demo = verbs.add_parser("demo", help="appraise an invented built-in survey and write its record")
    demo.add_argument(
        "--survey", default="wing-tip", metavar="NAME", help="wing-tip (default), pump-intake or whirlwind"
    )
    demo.add_argument("--folder", default=".", type=Path, help="where record.html and record.json go (default: here)")
    demo.set_defaults(run=_demo)

    appraise = verbs.add_parser("appraise", help="appraise a survey file", epilog=_UNITS_NOTE)
    appraise.add_argument("file", type=Path, help="CSV or NetCDF file")
    _add_facts(appraise)
    appraise.add_argument("--record", type=Path, metavar="OUT.html", help="write the record for people")
    appraise.add_argument("--json", type=Path, metavar="OUT.json", help="write the record for machines")
    appraise.set_defaults(run=_appraise)

    models = verbs.add_parser("models", help="list the models")
    models.set_defaults(run=_models)
    derivation = verbs.add_parser("derivation", help="print how a model's quantities follow from its profile")
    derivation.add_argument("name", help="a model, see 'vortexwidgets models'")
    derivation.set_defaults(run=_derivation)
    check = verbs.add_parser("check", help="compare a model's symbolic forms with numeric ones")
    check.add_argument("name", nargs="*", help="models; all of them by default")
    check.set_defaults(run=_check)

    opened = verbs.add_parser("open", help="write a ready notebook for a survey and open it in JupyterLab")
    opened.add_argument("file", type=Path, help="CSV or NetCDF file")
    opened.add_argument("--folder", type=Path, help="where the notebook goes (default: next to the file)")
    opened.add_argument("--units", action="append", metavar="COLUMN=UNIT", help="unit of a column, as 'position=mm'")
    opened.add_argument("--force", action="store_true", help="replace a notebook of that name")
    opened.add_argument("--no-launch", action="store_true", help="write the notebook only")
    opened.set_defaults(run=_open)
    return parser


_UNITS_NOTE = (
    "Values carry a unit, as '59 degF', '101.3 kPa' or '92.0 ± 0.3 kPa' (standard uncertainty); a bare number is in "
    "the unit named above. An option replaces what the file says."
)


def _add_facts(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--units", action="append", metavar="COLUMN=UNIT", help="unit of a column, as 'position=mm'")
    parser.add_argument("--fluid", help="water, sea water, air or helium")
    for option, (_, _, unit) in _FACTS.items():
        name = option.replace("_", " ")
        parser.add_argument(f"--{option.replace('_', '-')}", metavar="VALUE", help=f"{name}, bare number in {unit}")
    parser.add_argument(
        "--confirm-absolute", action="store_true", help="a pressure below 50 kPa is absolute, not gauge"
    )
    parser.add_argument("--orientation", choices=("surface", "submerged", "air"), help="what the vortex ends at")
    parser.add_argument("--miss-distance", metavar="VALUE", help="how far the line misses the axis, bare number in m")
    parser.add_argument("--velocity-gain", metavar="VALUE", help="'1.000 ± 0.005' or '0.5 %%': common to all samples")
    parser.add_argument("--averaging", choices=("along", "across", "square"), help="how the probe averages")
    parser.add_argument("--models", metavar="NAMES", help="models to rank, separated by commas (default: all)")
    parser.add_argument("--background", choices=("none", "uniform", "linear"), help="flow in which the vortex sits")
    parser.add_argument("--uncertainties", choices=("absolute", "relative"), help="absolute: as stated in the file")


def _version_or_help(options: argparse.Namespace) -> None:
    if options.version:
        from importlib.metadata import version

        print(f"vortexwidgets {version('vortexwidgets')}")
    else:
        options.parser.print_help()


def _demo(options: argparse.Namespace) -> None:
    from vortexwidgets.survey.reading import example_survey

    survey = example_survey(options.survey)
    records = [options.folder / "record.html", options.folder / "record.json"]
    for record in records:
        _check_writable(record)
        if record.exists() and survey.provenance.file.encode() not in record.read_bytes():
            raise ValueError(f"{record} exists and is not a record of this demo; name another place with --folder.")

    from vortexwidgets.appraisal import appraise

    appraisal = appraise(survey)
    _report(survey, appraisal)
    _save(appraisal, records)
    print(f"\nWritten: {records[0]} (for people) and {records[1]} (for machines).")
    print("Open the panel in JupyterLab, in a notebook cell:")
    print(f'  import vortexwidgets as vx; vx.AppraisalPanel(vx.example_survey("{options.survey}"))')
    print("or, with a survey of your own: vortexwidgets open survey.csv")


def _appraise(options: argparse.Namespace) -> None:
    records = [path for path in (options.record, options.json) if path is not None]
    for path, suffix in ((options.record, ".html"), (options.json, ".json")):
        if path is not None:
            if path.suffix.lower() != suffix:
                raise ValueError(f"the record {path} must end in {suffix}; write for example {path.stem}{suffix}.")
            _check_writable(path)
    models = _named_models(options.models)
    survey = _survey_with_facts(options)

    from vortexwidgets.appraisal import appraise

    appraisal = appraise(survey, models=models, background=options.background, uncertainties=options.uncertainties)
    _report(survey, appraisal)
    _save(appraisal, records)
    for path in records:
        print(f"\nWritten: {path}")


def _report(survey: Survey, appraisal: Appraisal) -> None:
    origin = survey.provenance
    dropped = [f"row {item.row} dropped: {item.reason}" for item in origin.dropped[:10]]
    if len(origin.dropped) > 10:
        dropped.append(f"and {len(origin.dropped) - 10} more rows; the record lists them all")
    lines = [*origin.columns, *origin.notes, *dropped, *appraisal.screening.sentences]
    _tell("\n".join([str(survey), *(f"  {line}" for line in lines), "", appraisal.summary()]))


def _tell(text: str) -> None:
    """Print text, its long sentences wrapped where a person reads it in a terminal."""
    width = shutil.get_terminal_size().columns if sys.stdout.isatty() else sys.maxsize
    for line in text.splitlines():
        indent = line[: len(line) - len(line.lstrip())]
        if len(line) <= width or "  " in line.strip():  # a row of a table keeps its columns
            print(line)
        else:
            hanging = indent + ("  " if line.strip().startswith("- ") else "")
            print(textwrap.fill(line.strip(), max(width, 40), initial_indent=indent, subsequent_indent=hanging))


def _named_models(text: str | None) -> list[str] | None:
    if text is None:
        return None
    from vortexwidgets.models.catalogue import model_named

    return [model_named(name.strip()).key for name in text.split(",")]


def _survey_with_facts(options: argparse.Namespace) -> Survey:
    """Read the file; options replace its facts."""
    from vortexwidgets.survey.facts import read_fact
    from vortexwidgets.survey.reading import read_survey
    from vortexwidgets.units import read_quantity

    facts: dict[str, Any] = {}
    for option, (fact, quantity, unit) in _FACTS.items():
        text = getattr(options, option)
        if text is not None:
            facts[fact] = _about(option, lambda t=text, q=quantity, u=unit: read_quantity(t, q, default_unit=u))
    facts.update({name: getattr(options, name) for name in ("fluid", "orientation", "averaging")})
    if options.confirm_absolute:
        facts["confirm_absolute"] = "yes"
    changes: dict[str, Any] = {}
    if options.miss_distance is not None:
        changes["miss_distance"] = _about(
            "miss_distance", lambda: read_quantity(options.miss_distance, "miss_distance", default_unit="m")
        )
    if options.velocity_gain is not None:
        changes["velocity_gain"] = _about("velocity_gain", lambda: read_fact("velocity_gain", options.velocity_gain))
    survey = read_survey(options.file, units=_units(options.units))
    stated = {fact: value for fact, value in facts.items() if value is not None}
    # A reference pressure given here replaces the file's, however the file stated it.
    if "ambient_pressure" in stated and "surface_pressure" not in stated:
        stated.update(dict.fromkeys({"surface_pressure", "depth"} - set(stated)))
    elif "surface_pressure" in stated:
        stated.setdefault("ambient_pressure", None)
    return dataclasses.replace(survey.with_facts(**stated), **changes)


def _about(option: str, read: Any) -> Any:
    try:
        return read()
    except ValueError as error:
        raise ValueError(f"--{option.replace('_', '-')}: {error}") from error


def _units(given: Sequence[str] | None) -> Mapping[str, str] | None:
    pairs = [pair for text in given or () for pair in text.split(",")]
    for pair in pairs:
        if "=" not in pair:
            raise ValueError(f"--units: '{pair}' is not COLUMN=UNIT; write for example --units position=mm.")
    return {name.strip(): unit.strip() for name, _, unit in (pair.partition("=") for pair in pairs)} or None


def _check_writable(path: Path) -> None:
    """Say before the work that a file cannot be written after it."""
    folder = path.parent
    if path.is_dir():
        raise ValueError(f"{path} is a folder; give the name of a file.")
    if not folder.is_dir():
        raise ValueError(f"there is no folder {folder} to write {path.name} into; make it, or name another place.")
    if not os.access(folder, os.W_OK):
        raise ValueError(f"{folder} cannot be written to; name another place for {path.name}.")


def _save(appraisal: Appraisal, paths: Sequence[Path]) -> None:
    """Write all records or none."""
    waiting = [(path.with_name(f".{path.stem}.{os.getpid()}.partial{path.suffix.lower()}"), path) for path in paths]
    try:
        for partial, _ in waiting:
            appraisal.save(partial)
        for partial, path in waiting:
            partial.replace(path)
    finally:
        for partial, _ in waiting:
            partial.unlink(missing_ok=True)


def _models(_: argparse.Namespace) -> None:
    from vortexwidgets.formatting import table
    from vortexwidgets.models.catalogue import MODELS

    rows = []
    for key, model in MODELS.items():
        shape = ", ".join(f"{item.name} = {item.default:g}" for item in model.shape)
        rows.append([key, model.name, model.strength, shape, model.source])
    print(table(rows, ["key", "name", "strength", "shape", "source"]))


def _derivation(options: argparse.Namespace) -> None:
    from vortexwidgets.models.derivation import derivation

    print(derivation(options.name))


def _check(options: argparse.Namespace) -> None:
    from vortexwidgets.models.agreement import check_agreement
    from vortexwidgets.models.catalogue import MODELS

    for name in options.name or list(MODELS):
        print(check_agreement(name))


def _open(options: argparse.Namespace) -> None:
    from vortexwidgets.survey.reading import read_survey

    units = _units(options.units)
    survey = read_survey(options.file, units=units)
    folder = options.folder or options.file.parent
    notebook = folder / f"{options.file.stem}.ipynb"
    _check_writable(notebook)
    if notebook.exists() and not options.force:
        raise ValueError(f"{notebook} exists; open it as it is, or replace it with --force.")
    source = options.file.resolve()
    if source.parent == folder.resolve():
        source = Path(source.name)
    _write_text(notebook, _notebook(survey, source, units))
    print(f"Written: {notebook}")
    if options.no_launch:
        return
    if importlib.util.find_spec("jupyterlab") is None:
        print(f'JupyterLab is not installed: pip install "vortexwidgets[lab]", then jupyter lab {notebook}')
        return
    subprocess.run([sys.executable, "-m", "jupyterlab", str(notebook)], check=False)


def _notebook(survey: Survey, source: Path, units: Mapping[str, str] | None) -> str:
    """Make a notebook that opens a survey in the panel; text from the file is escaped."""
    title = html.escape(str(survey.facts.get("title", source.name)))
    for sign in "\\`*_[]#$":
        title = title.replace(sign, f"\\{sign}")
    columns = "\n".join(f"    {line}" for line in survey.provenance.columns)
    more = f", units={dict(units)!r}" if units else ""
    cells = [
        ("markdown", f"# {title}\n\nColumns of the file were taken as:\n\n{columns}\n"),
        ("code", f"import vortexwidgets as vx\n\nsurvey = vx.read_survey({str(source)!r}{more})\nprint(survey)"),
        ("code", "panel = vx.AppraisalPanel(survey)\npanel"),
    ]
    blocks: list[dict[str, Any]] = []
    for number, (kind, text) in enumerate(cells):
        block: dict[str, Any] = {"cell_type": kind, "id": f"cell-{number}", "metadata": {}, "source": text}
        if kind == "code":
            block.update(execution_count=None, outputs=[])
        blocks.append(block)
    kernel = {"display_name": "Python 3 (ipykernel)", "language": "python", "name": "python3"}
    content = {
        "cells": blocks,
        "metadata": {"kernelspec": kernel, "language_info": {"name": "python"}},
        "nbformat": 4,
        "nbformat_minor": 5,
    }
    return json.dumps(content, indent=1, ensure_ascii=False) + "\n"


def _write_text(path: Path, text: str) -> None:
    partial = path.with_name(f".{path.name}.{os.getpid()}.partial")
    try:
        partial.write_text(text, encoding="utf-8")
        partial.replace(path)
    finally:
        partial.unlink(missing_ok=True)


if __name__ == "__main__":
    sys.exit(main())
