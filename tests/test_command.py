import json
import subprocess
import sys
import time
from pathlib import Path

import nbformat
import pytest

from vortexwidgets.command import main

STRANGERS = Path(__file__).parent / "strangers"


def run(capsys, *arguments):
    status = main([str(argument) for argument in arguments])
    printed = capsys.readouterr()
    assert status == 0, printed.err
    return printed.out


def test_help_and_version(capsys):
    assert "appraise" in run(capsys, "--help")
    assert "--ambient-pressure" in run(capsys, "appraise", "--help")
    assert "appraise" in run(capsys)
    assert run(capsys, "--version").startswith("vortexwidgets ")


def test_help_loads_no_heavy_library():
    code = (
        "import sys; from vortexwidgets.command import main; main(['--help']);"
        "heavy = {'numpy', 'sympy', 'scipy', 'matplotlib', 'pint'} & set(sys.modules);"
        "sys.exit(str(heavy) if heavy else 0)"
    )
    start = time.perf_counter()
    result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert result.returncode == 0, result.stderr
    assert time.perf_counter() - start < 5.0  # generous: a busy machine, a cold disk


@pytest.mark.parametrize("name", ["wing-tip", "pump-intake", "whirlwind"])
def test_the_demo_prints_the_answer_and_writes_its_record(name, tmp_path, capsys):
    printed = run(capsys, "demo", "--survey", name, "--folder", tmp_path)
    assert "invented survey" in printed
    assert "core pressure" in printed.lower()
    assert "lamb-oseen" in printed.lower()
    assert "Consequences" in printed
    assert f'vx.AppraisalPanel(vx.example_survey("{name}"))' in printed
    assert sorted(path.name for path in tmp_path.iterdir()) == ["record.html", "record.json"]
    assert "invented" in (tmp_path / "record.html").read_text(encoding="utf-8")
    json.loads((tmp_path / "record.json").read_text(encoding="utf-8"))
    run(capsys, "demo", "--survey", name, "--folder", tmp_path)  # again, over its own record


def test_appraise_says_what_it_read_and_options_replace_facts(tmp_path, capsys):
    from vortexwidgets.appraisal import load_appraisal

    record = tmp_path / "out.json"
    printed = run(
        capsys, "appraise", STRANGERS / "gaps.csv", "--fluid", "water", "--temperature", "59 degF",
        "--ambient-pressure", "101.3 ± 0.2 kPa", "--speed", "12", "--velocity-gain", "0.5 %", "--models",
        "lamb-oseen,kaufmann", "--json", record, "--record", tmp_path / "out.html",
    )  # fmt: skip
    assert "position [mm] -> position along the line" in printed
    assert "row 6 dropped" in printed
    appraisal = load_appraisal(record)
    assert appraisal.survey.facts["temperature"].value == pytest.approx(288.15)  # 59 °F is 15 °C
    assert appraisal.survey.facts["ambient_pressure"].uncertainty == pytest.approx(200.0)
    assert appraisal.survey.facts["free_stream"].value == 12.0
    assert appraisal.survey.velocity_gain.uncertainty == pytest.approx(0.005)
    assert {row.key for row in appraisal.models} == {"lamb-oseen", "kaufmann"}
    assert (tmp_path / "out.html").stat().st_size > 1000


def test_a_low_absolute_pressure_is_used_when_it_is_confirmed(tmp_path, capsys):
    arguments = ["appraise", str(STRANGERS / "coverage_factor_two.csv"), "--fluid", "water", "--temperature", "15"]
    arguments += ["--ambient-pressure", "40 kPa"]
    assert main(arguments) == 2
    assert "confirm_absolute" in capsys.readouterr().err
    assert "40" in run(capsys, *arguments, "--confirm-absolute")


def test_units_on_the_command_line(tmp_path, capsys):
    path = tmp_path / "bench.csv"
    text = (STRANGERS / "plain.csv").read_text(encoding="utf-8").replace("position [mm]", "position")
    path.write_text(text, encoding="utf-8")
    assert "position -> position along the line" in run(capsys, "appraise", path, "--units", "position=mm")


def test_long_sentences_are_wrapped_in_a_terminal(capsys, monkeypatch):
    from vortexwidgets import command

    monkeypatch.setattr("sys.stdout.isatty", lambda: True)
    monkeypatch.setenv("COLUMNS", "60")
    command._tell("  - " + "word " * 30 + "\nmodel    weight   " + "x" * 60)
    lines = capsys.readouterr().out.splitlines()
    assert all(len(line) <= 60 for line in lines[:-1])
    assert lines[1].startswith("    word")
    assert lines[-1].startswith("model    weight")


def test_models_are_listed(capsys):
    printed = run(capsys, "models")
    for key in ("free", "forced", "rankine", "kaufmann", "vatistas", "lamb-oseen", "taylor", "burgers"):
        assert key in printed


def test_a_derivation_and_a_check_are_printed(capsys):
    assert "vorticity" in run(capsys, "derivation", "lamb-oseen").lower()
    assert "kaufmann" in run(capsys, "check", "kaufmann").lower()


def test_open_writes_a_notebook_that_holds_the_panel(tmp_path, capsys):
    survey = tmp_path / "bench 1.csv"
    survey.write_bytes((STRANGERS / "plain.csv").read_bytes())
    assert "Written" in run(capsys, "open", survey, "--no-launch")
    notebook = nbformat.read(tmp_path / "bench 1.ipynb", as_version=4)
    nbformat.validate(notebook)
    source = "\n".join(cell.source for cell in notebook.cells if cell.cell_type == "code")
    assert "vx.read_survey('bench 1.csv')" in source
    assert "vx.AppraisalPanel(survey)" in source
    run(capsys, "open", survey, "--no-launch", "--force", "--units", "position=cm")
    assert "units={'position': 'cm'}" in (tmp_path / "bench 1.ipynb").read_text(encoding="utf-8")


def test_open_into_another_folder_names_the_file_in_full(tmp_path, capsys):
    run(capsys, "open", STRANGERS / "plain.csv", "--folder", tmp_path, "--no-launch")
    source = (tmp_path / "plain.ipynb").read_text(encoding="utf-8")
    assert str((STRANGERS / "plain.csv").resolve()) in json.loads(source)["cells"][1]["source"].replace("\\\\", "\\")


def test_open_starts_jupyterlab_or_says_how(tmp_path, capsys, monkeypatch):
    calls = []
    monkeypatch.setattr("vortexwidgets.command.subprocess.run", lambda words, check: calls.append(words))
    run(capsys, "open", STRANGERS / "plain.csv", "--folder", tmp_path)
    assert calls == [[sys.executable, "-m", "jupyterlab", str(tmp_path / "plain.ipynb")]]
    monkeypatch.setattr("vortexwidgets.command.importlib.util.find_spec", lambda name: None)
    assert "JupyterLab is not installed" in run(
        capsys, "open", STRANGERS / "plain.csv", "--folder", tmp_path, "--force"
    )


def test_an_unforeseen_error_is_not_hidden(monkeypatch):
    def broken(options):
        raise KeyError("a fault of the program")

    monkeypatch.setattr("vortexwidgets.command._models", broken)
    with pytest.raises(KeyError):
        main(["models"])


def test_an_interrupt_ends_quietly(monkeypatch, capsys):
    def interrupted(options):
        raise KeyboardInterrupt

    monkeypatch.setattr("vortexwidgets.command._models", interrupted)
    assert main(["models"]) == 130
    assert capsys.readouterr().err == ""
