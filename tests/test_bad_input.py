"""Bad input ends in one clear sentence and exit status 2, with no file written."""

import json
import os
import subprocess
import sys
import zipfile

import pytest

from vortexwidgets.command import main
from vortexwidgets.survey.table import LARGEST_FILE

HEAD = "position [mm],velocity [m/s],uncertainty [m/s]\n"
POSITIONS = [-60, -40, -25, -15, -10, -6, -3, 0, 3, 6, 10, 15, 25, 40, 60]
# A bell of swirl about 0, by hand: v = 20 x / (x² + 64), x in mm; good enough to be appraised.
GOOD = HEAD + "".join(f"{x},{20 * x / (x * x + 64):.4f},0.03\n" for x in POSITIONS)


def with_row(row: str) -> str:
    return GOOD + row + "\n"


def with_fact(fact: str) -> str:
    return f"# {fact}\n" + GOOD


def numbers(header: str, *rows: str) -> str:
    return "\n".join([header, *(rows or ("-10,-1", "0,0", "10,1", "20,0.5"))]) + "\n"


# name: (content, what the sentence must say)
FILES: dict[str, tuple[str | bytes, str]] = {
    "empty": ("", "is empty"),
    "blank lines only": ("\n\n  \n", "is empty"),
    "comments only": ("# title: nothing\n", "comments only"),
    "header only": (HEAD, "no numbers below it"),
    "header and units only": ("position,velocity\nmm,m/s\n", "no numbers below it"),
    "no header": ("1,2\n2,3\n3,4\n", "no header row"),
    "prose": ("The vortex was strong, and we were impressed.\n", "no header row"),
    "one column": ("velocity [m/s]\n1\n2\n3\n", "one column"),
    "two rows": (HEAD + "1,2,0.1\n2,3,0.1\n", "at least 3"),
    "one position": (numbers("position [mm],velocity [m/s]", "5,1", "5,2", "5,3", "5,4"), "same position"),
    "NaN only": (numbers("position [mm],velocity [m/s]", "1,NaN", "2,NaN", "3,nan"), "0 of 3 rows are usable"),
    "empty cells only": (numbers("position [mm],velocity [m/s]", "1,", "2,", "3,"), "0 of 3 rows are usable"),
    "markers only": (numbers("position [mm],velocity [m/s]", "1,9.99e9", "2,9.99e9", "3,9.99e9"), "0 of 3 rows"),
    "text in numbers": (with_row("70,fast,0.03"), "'fast' is not a number"),
    "text in positions": (with_row("left,1,0.03"), "'left' is not a number"),
    "a date": (with_row("2021-03-04,1,0.03"), "'2021-03-04' is not a number"),
    "infinite": (with_row("70,inf,0.03"), "'inf' is not finite"),
    "formula": (with_row("70,=B2*2,0.03"), "looks like a formula"),
    "formula with a command": (with_row("70,@SUM(A1:A9),0.03"), "looks like a formula"),
    "code": (with_row("70,__import__('os').getcwd(),0.03"), "looks like a formula"),
    "hexadecimal": (with_row("70,0x1F,0.03"), "'0x1F' is not a number"),
    "complex": (with_row("70,1+2j,0.03"), "'1+2j' is not a number"),
    "underscores": (with_row("70,1_000,0.03"), "'1_000' is not a number"),
    "thousands": (GOOD.replace(",", ";") + "70;1.234,5;0.03\n", "separators of thousands"),
    "decimal comma and point": (GOOD.replace(",", ";") + "70;0,4;0.03\n", "decimal comma"),
    "decimal commas between commas": (
        numbers("position [mm],velocity [m/s]", "-10,5,1,2", "0,0,0,1"),
        "decimal commas",
    ),
    "too many cells": (with_row("70,1,0.03,5"), "4 cells under 3 headings"),
    "too few cells": (with_row("70,1"), "2 cells under 3 headings"),
    "mixed separators": (with_row("70;1;0.03"), "same sign"),
    "unbalanced quotes": (with_row('70,"1,0.03'), "quotation marks"),
    "zero uncertainty": (with_row("70,1,0"), "must be positive"),
    "negative uncertainty": (with_row("70,1,-0.03"), "must be positive"),
    "position in seconds": (GOOD.replace("[mm]", "[s]"), "position [s]"),
    "velocity in millimetres": (GOOD.replace("velocity [m/s]", "velocity [mm]"), "velocity [mm]"),
    "unknown unit": (GOOD.replace("[mm]", "[smoot]"), "smoot"),
    "uncertainty in kilograms": (GOOD.replace("uncertainty [m/s]", "uncertainty [kg]"), "uncertainty [kg]"),
    "uncertainty in percent of nothing": (
        GOOD.replace("uncertainty [m/s]", "uncertainty [%]"),
        "percentage of something",
    ),
    "no unit": (GOOD.replace("position [mm]", "position"), "has no unit"),
    "no velocity unit": (GOOD.replace("velocity [m/s]", "velocity"), "has no unit"),
    "ratio without a scale": (GOOD.replace("position [mm]", "x/c"), "length scale"),
    "ratio without a speed": (GOOD.replace("velocity [m/s]", "V/U∞"), "free stream"),
    "unknown columns": (numbers("alpha,beta"), "'alpha', 'beta'"),
    "no position": (numbers("alpha,velocity [m/s]"), "no column holds a position"),
    "no velocity": (numbers("position [mm],beta"), "no column holds a velocity"),
    "duplicate columns": (
        numbers("position [mm],position [mm],velocity [m/s]", "1,1,1", "2,2,2", "3,3,3"),
        "both hold",
    ),
    "a speed instead of a component": (
        numbers("position [mm],speed [m/s]", "1,1", "2,2", "3,1"),
        "a speed has no sign",
    ),
    "a plane with one component": (numbers("x [mm],y [mm],u [m/s]", "1,1,1", "2,2,2", "3,1,1"), "two velocity comp"),
    "a volume": (numbers("x [mm],y [mm],z [mm],u [m/s],v [m/s]", "1,1,1,1,1", "2,2,2,2,2", "3,1,3,1,2"), "all vary"),
    "far too fast": (with_row("70,3e6,0.03"), "beyond anything"),
    "far too far": (with_row("3e5,1,0.03").replace("[mm]", "[km]"), "beyond anything"),
    "binary": (bytes(range(256)) * 40, "not a text file"),
    "zeros": (b"\x00" * 500, "not a text file"),
    "not UTF-16": (b"\xff\xfe" + b"a" * 11, "UTF-16"),
    "JSON": (json.dumps({"x": [1, 2]}), "JSON"),
    "HTML": ("<!doctype html><p>1,2</p>", "HTML"),
    "PDF": ("%PDF-1.7 and so on", "a PDF"),
    "a picture": (b"\x89PNG\r\n\x1a\n rest", "picture"),
    "damaged NetCDF": (b"\x89HDF\r\n\x1a\n rest", "NetCDF"),
    "damaged NetCDF 3": (b"CDF\x01 rest", "NetCDF"),
    "a very long line": (HEAD + "1" * 50_000 + "\n", "characters"),
    "hundreds of columns": (",".join(f"c{i}" for i in range(400)) + "\n1,2\n", "400 columns"),
    "temperature without unit": (with_fact("temperature: 15"), "temperature"),
    "temperature in pascals": (with_fact("temperature: 15 kPa"), "temperature"),
    "impossible temperature": (with_fact("temperature: -300 degC"), "temperature"),
    "boiling water": (with_fact("fluid: water\n# temperature: 800 degC"), "temperature"),
    "unknown fluid": (with_fact("fluid: honey"), "honey"),
    "gauge pressure": (with_fact("fluid: water\n# temperature: 15 degC\n# ambient pressure: 20 kPa"), "kPa"),
    "negative pressure": (with_fact("ambient pressure: -5 kPa"), "pressure"),
    "pressure in metres per second": (with_fact("ambient pressure: 5 m/s"), "pressure"),
    "contradicting facts": (with_fact("depth: 1 m\n# depth: 2 m"), "contradicts"),
    "unknown orientation": (with_fact("orientation: upside down"), "upside down"),
    "a gain that is not one": (with_fact("velocity gain: 1.05 ± 0.01"), "is not 1"),
    "an absurd coverage factor": (with_fact("coverage factor: 95"), "coverage factor"),
    "negative probe": (with_fact("probe width: -2 mm"), "probe"),
    "capital units": (GOOD.replace("position [mm]", "Position (MM)"), "write 'Position [mm]' in the header"),
    "uncertainty in percent of the velocity": (
        with_fact("uncertainty: 2 %"),
        "write the standard uncertainty of every",
    ),
    "negative miss distance": (with_fact("miss distance: -5 mm"), "miss_distance must not be negative, got -0.005 m"),
    "a miss distance beyond the survey": (with_fact("miss distance: 5 m"), "survey is only 0.12 m long"),
    "three points": (HEAD + "-5,-1,0.03\n5,1,0.03\n9,0.8,0.03\n", "3 points"),
    "four points of unknown scatter": (
        numbers("position [mm],velocity [m/s]", "-9,-1.241", "-3,-0.822", "5,1.124", "12,1.154"),
        "Too few points to rank models: 4 independent points, at least 6 needed",
    ),
    "axes along one line": (with_fact("axes: x up, y down"), "same line"),
}


@pytest.fixture
def refuse(tmp_path, capsys):
    """Run a command that must fail: one sentence, status 2, no file."""

    def run(*arguments, says=""):
        before = sorted(path.name for path in tmp_path.rglob("*"))
        status = main([str(argument) for argument in arguments])
        printed = capsys.readouterr()
        sentence = printed.err.strip()
        assert status == 2
        assert "\n" not in sentence, sentence
        assert sentence.startswith("vortexwidgets")
        assert sentence.endswith("."), sentence
        assert "Traceback" not in sentence
        assert says.lower() in sentence.lower(), sentence
        assert printed.out == ""
        assert sorted(path.name for path in tmp_path.rglob("*")) == before
        return sentence

    return run


def records(folder):
    return ["--record", folder / "out.html", "--json", folder / "out.json"]


@pytest.mark.parametrize("name", FILES)
def test_a_bad_file_is_refused_in_one_sentence(name, tmp_path, refuse):
    content, says = FILES[name]
    path = tmp_path / "bench.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    refuse("appraise", path, *records(tmp_path), says=says)


def test_there_are_at_least_sixty_bad_files():
    assert len(FILES) >= 60


def test_files_that_are_no_files(tmp_path, refuse):
    refuse("appraise", tmp_path, says="is a folder")
    refuse("appraise", tmp_path / "none.csv", says="there is no file")
    refuse("appraise", os.devnull, says="not an ordinary file")
    with zipfile.ZipFile(tmp_path / "sheet.csv", "w") as archive:
        archive.writestr("a.txt", "1,2")
    refuse("appraise", tmp_path / "sheet.csv", says="zip archive or an Excel workbook")
    with (tmp_path / "huge.csv").open("wb") as stream:
        stream.truncate(LARGEST_FILE + 1)
    refuse("appraise", tmp_path / "huge.csv", says="the limit is 64 MB")
    refuse("appraise", "bad\0name.csv", says="there is no file bad name.csv")


@pytest.fixture
def good(tmp_path):
    path = tmp_path / "bench.csv"
    path.write_text(GOOD, encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("options", "says"),
    [
        (["--fluid", "honey"], "honey"),
        (["--temperature", "warm"], "--temperature"),
        (["--temperature", "-400"], "--temperature"),
        (["--temperature", "15 kPa"], "--temperature"),
        (["--temperature", "__import__('os')"], "--temperature"),
        (["--fluid", "water", "--temperature", "15", "--ambient-pressure", "20 kPa"], "kPa"),
        (["--ambient-pressure", "1,5,0 kPa"], "--ambient-pressure"),
        (["--ambient-pressure", "nan"], "--ambient-pressure"),
        (["--depth", "3 psi"], "--depth"),
        (["--speed", "fast"], "--speed"),
        (["--wander", "-1 mm"], "--wander"),
        (["--probe-width", "1e400"], "--probe-width"),
        (["--miss-distance", "2 s"], "--miss-distance"),
        (["--miss-distance", "-5"], "miss_distance must not be negative, got -5 m"),
        (["--miss-distance", "5"], "miss_distance is 5 m, but the survey is only 0.12 m long"),
        (["--velocity-gain", "1.1 ± 0.1"], "--velocity-gain"),
        (["--models", "rankin"], "rankin"),
        (["--models", ""], "model"),
        (["--units", "mm"], "COLUMN=UNIT"),
        (["--units", "depth=mm"], "no column 'depth'"),
        (["--units", "position=kg"], "write 'position [mm]' in the header"),
        (["--units", "velocity=furlong"], "write 'velocity [m/s]' in the header"),
        (["--orientation", "sideways"], "--orientation"),
        (["--background", "cubic"], "--background"),
        (["--nonsense", "1"], "--nonsense"),
        (["--record", "out.pdf"], "must end in .html"),
        (["--json", "out.txt"], "must end in .json"),
    ],
)
def test_a_bad_option_is_refused_in_one_sentence(options, says, tmp_path, good, refuse, monkeypatch):
    monkeypatch.chdir(tmp_path)
    more = [] if "--record" in options or "--json" in options else records(tmp_path)
    refuse("appraise", good, *more, *options, says=says)


def test_a_record_that_cannot_be_written_is_refused_before_the_work(tmp_path, good, refuse):
    (tmp_path / "out.html").mkdir()
    refuse("appraise", good, "--record", tmp_path / "out.html", says="is a folder")
    refuse("appraise", good, "--json", tmp_path / "no" / "out.json", says="there is no folder")
    refuse("appraise", good, "--json", good / "out.json", says="there is no folder")
    refuse("demo", "--folder", tmp_path / "no", says="there is no folder")


def test_unknown_names_are_refused(tmp_path, good, refuse):
    refuse("derivation", "rankin", says="rankin")
    refuse("check", "rankin", says="rankin")
    refuse("demo", "--survey", "wingtip", "--folder", tmp_path, says="known: pump-intake, whirlwind, wing-tip")
    refuse("fly", says="fly")
    refuse("appraise", says="file")
    refuse("open", tmp_path / "none.csv", "--no-launch", says="there is no file")
    (tmp_path / "bench.ipynb").write_text("mine", encoding="utf-8")
    refuse("open", good, "--no-launch", says="--force")


def test_a_file_that_is_not_the_demos_is_not_replaced(tmp_path, refuse):
    (tmp_path / "record.html").write_text("mine", encoding="utf-8")
    refuse("demo", "--folder", tmp_path, says="is not a record of this demo")
    assert (tmp_path / "record.html").read_text(encoding="utf-8") == "mine"


def test_nothing_is_left_when_the_second_record_fails(tmp_path, good, refuse, monkeypatch):
    from vortexwidgets.appraisal import Appraisal

    def save(self, path):
        if path.suffix == ".json":
            raise OSError(28, "No space left on device", str(path))
        path.write_text("half", encoding="utf-8")
        return path

    monkeypatch.setattr(Appraisal, "save", save)
    monkeypatch.setattr("vortexwidgets.command._report", lambda survey, appraisal: None)
    refuse("appraise", good, *records(tmp_path), says="no space left on device")


def test_html_in_a_title_is_shown_as_text(tmp_path, capsys):
    path = tmp_path / "bench.csv"
    attack = "<script>alert(1)</script><img src=x onerror=alert(2)>"
    path.write_text(f"# title: {attack}\n# operator: {attack}\n" + GOOD, encoding="utf-8")
    assert main(["appraise", str(path), "--record", str(tmp_path / "out.html"), "--fluid", "water"]) == 0
    page = (tmp_path / "out.html").read_text(encoding="utf-8")
    assert "<script>alert" not in page
    assert "<img src=x" not in page
    assert "&lt;script&gt;alert(1)" in page
    assert main(["open", str(path), "--no-launch"]) == 0
    capsys.readouterr()
    notebook = (tmp_path / "bench.ipynb").read_text(encoding="utf-8")
    assert "<script>" not in notebook


@pytest.mark.parametrize(
    "arguments",
    [["appraise", "no such file.csv"], ["appraise", ".", "--record", "out.html"]],
    ids=["missing", "folder"],
)
def test_the_installed_command_says_one_sentence(arguments, tmp_path):
    result = subprocess.run(
        [sys.executable, "-m", "vortexwidgets.command", *arguments],
        cwd=tmp_path, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert result.returncode == 2
    assert result.stdout == ""
    assert len(result.stderr.splitlines()) == 1
    assert list(tmp_path.iterdir()) == []


def test_a_record_that_is_not_there_is_said_in_one_sentence(tmp_path):
    from vortexwidgets.appraisal import load_appraisal

    with pytest.raises(
        FileNotFoundError, match=r"nope\.json cannot be read \(no such file.*; give the path of a record"
    ):
        load_appraisal(tmp_path / "nope.json")
