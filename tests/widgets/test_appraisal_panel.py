import html
import json

import numpy as np
import pytest

import vortexwidgets as vx
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Estimate
from vortexwidgets.widgets.appraisal_panel import AppraisalPanel

FEW = ("kaufmann", "lamb-oseen")


@pytest.fixture(scope="module")
def survey():
    vortex = Vortex("lamb-oseen", circulation=0.3, core_radius=0.01)
    position = np.linspace(-0.06, 0.06, 25)
    return Survey.simulated(
        vortex, position=position, along=True, noise=0.05, seed=1, fluid="water", temperature=288.15,
        ambient_pressure=Estimate(150e3, 200.0, "ambient_pressure"),
    )  # fmt: skip


@pytest.fixture
def panel(survey):
    panel = AppraisalPanel(front_end="image")
    panel.state.models = FEW
    panel.source.start = panel.survey = survey
    yield panel
    panel.close()


@pytest.fixture
def appraised(panel):
    panel.appraise()
    assert panel.state.error == ""
    return panel


def test_a_survey_is_appraised_at_once(survey):
    panel = AppraisalPanel(survey, front_end="image")
    assert panel.state.error == ""
    assert panel.appraisal.survey == survey
    panel.close()


def test_without_a_survey_the_panel_says_what_to_do():
    panel = AppraisalPanel(front_end="image")
    assert "Read a survey to begin" in panel.pages["survey"].value
    panel.state.reported(panel.appraise)()
    assert panel.state.error == "There is no survey yet; read one first."
    panel.close()


def test_the_sections_show_the_appraisal(appraised):
    assert appraised.appraisal.answer.split(";")[0] in appraised.pages["answer"].value
    assert "Lamb-Oseen" in appraised.pages["models"].value
    assert "core pressure, absolute" in appraised.pages["core"].value
    consequences = appraised.pages["consequences"].value
    assert "vx-consequence" in consequences
    for item in appraised.appraisal.consequences:
        for name, value in item.details:
            assert f"<td>{html.escape(name)}</td><td>{html.escape(str(value))}</td>" in consequences


def test_the_vortex_by_hand_begins_as_the_best_fit_and_moves_the_plot(appraised):
    assert appraised.hand.vortex == appraised.appraisal.core.vortex
    line = appraised.figure.plot._curves[-1]
    before = np.array(line.get_ydata(), copy=True)
    appraised.hand_controls.numbers["circulation"].value *= 2.0
    assert np.nanmax(line.get_ydata()) == pytest.approx(2.0 * np.nanmax(before), rel=1e-3)


def test_another_fact_makes_the_appraisal_stale(appraised):
    appraised.facts.fields["temperature"].field.set_state({"value": "25 °C"})
    assert appraised.survey.facts["temperature"].value == pytest.approx(298.15)
    assert appraised.appraisal is None
    assert "press “Appraise”" in appraised.pages["answer"].value
    assert "with_facts(temperature=298.15)" in appraised.python


def test_the_facts_of_the_survey_are_shown(panel):
    assert panel.facts.choices["fluid"].value == "water"
    assert panel.facts.fields["temperature"].field.value == "15 °C"
    assert panel.facts.fields["ambient_pressure"].field.value == "150 ± 0.2 kPa"
    assert panel.facts.fields["depth"].field.value == ""


def test_a_gauge_pressure_is_asked_about_in_the_panel(panel):
    panel.facts.fields["ambient_pressure"].field.set_state({"value": "20 kPa"})
    panel.state.reported(panel.appraise)()
    assert "20" in panel.state.error
    assert panel.appraisal is None


def test_models_are_ticked(panel):
    panel.state.models = ()
    panel.models.boxes["rankine"].value = False
    assert "rankine" not in panel.state.models
    assert "lamb-oseen" in panel.state.models
    panel.models.boxes["rankine"].value = True
    assert panel.state.models == ()


def test_the_last_model_cannot_be_unticked(panel):
    panel.state.models = ("taylor",)
    panel.models.boxes["taylor"].value = False
    assert "At least one profile" in panel.state.error
    assert panel.state.models == ("taylor",)
    assert panel.models.boxes["taylor"].value


def test_a_file_is_read_and_a_missing_one_is_answered(panel, tmp_path):
    path = tmp_path / "survey.csv"
    rows = "\n".join(f"{1 + i},{2.0 + 0.1 * i}" for i in range(9))
    path.write_text(f"# fluid: air\nradius [mm],swirl [m/s]\n{rows}\n", encoding="utf-8")
    panel.source.path.value = str(path)
    panel.state.reported(panel.source.read)()
    assert panel.state.error == ""
    assert panel.survey.geometry == "radial"
    assert panel.facts.choices["fluid"].value == "air"
    assert f"vx.read_survey({str(path)!r})" in panel.python
    panel.source.path.value = "nowhere.csv"
    panel.state.reported(panel.source.read)()
    assert "nowhere.csv" in panel.state.error


def test_a_file_of_the_browser_is_read(panel):
    content = b"radius [mm],swirl [m/s]\n1,2\n2,3\n3,2.5\n4,2.2\n5,1.9\n"
    panel.source.upload.value = [
        {"name": "../up.csv", "type": "text/csv", "size": len(content), "content": memoryview(content),
         "last_modified": np.datetime64("2024-01-01").astype("datetime64[s]").item()}
    ]  # fmt: skip
    assert panel.state.error == ""
    assert panel.survey.points == 5
    assert panel.python.startswith("survey = vx.read_survey('up.csv')")


def test_the_figure_changes_with_the_geometry(panel):
    grid = np.linspace(-0.03, 0.03, 7)
    vortex = Vortex("lamb-oseen", circulation=0.3, core_radius=0.01)
    before = type(panel.figure.plot)
    panel.survey = Survey.simulated(vortex, x=grid, y=grid[:-1], noise=0.02)
    assert panel.state.error == ""
    assert type(panel.figure.plot) is not before


def test_the_python_does_the_same_job(appraised, survey, tmp_path, monkeypatch):
    appraised.points.toggle(3)
    appraised.facts.fields["free_stream"].field.set_state({"value": "5 ± 0.1 m/s"})
    appraised.appraise()
    monkeypatch.chdir(tmp_path)
    names = {"vx": vx, "survey": survey, "print": lambda *_: None}
    exec(appraised.python, names)
    assert names["survey"] == appraised.survey
    assert names["appraisal"].core_pressure_drop == appraised.appraisal.core_pressure_drop
    assert (tmp_path / "record.json").exists()


def test_the_record_is_saved(appraised, tmp_path):
    appraised.record.name.value = str(tmp_path / "bench")
    appraised.state.reported(appraised.record.save)("json")
    assert appraised.state.error == ""
    assert vx.load_appraisal(tmp_path / "bench.json") == appraised.appraisal
    assert "bench.json" in appraised.record.saved.value


def test_there_is_nothing_to_save_before_the_appraisal(panel):
    panel.state.reported(panel.record.save)("html")
    assert "nothing to save yet" in panel.state.error


def test_parameters_are_saved_loaded_and_reset(panel, survey):
    panel.points.toggle(3)
    panel.facts.fields["depth"].field.set_state({"value": "1.2 ± 0.05 m"})
    text, shown = panel.save_parameters(), panel.survey
    panel.reset()
    assert panel.survey == survey
    panel.load_parameters(text)
    assert panel.survey == shown
    assert panel.state.models == FEW


@pytest.mark.parametrize("text", ["", "{}", json.dumps({"facts": {}, "set_aside": {}, "models": ["x"]})])
def test_parameters_that_are_none_are_refused(panel, text):
    with pytest.raises(ValueError, match=r"Paste what 'Save' wrote|No model 'x' can be ranked"):
        panel.load_parameters(text)
