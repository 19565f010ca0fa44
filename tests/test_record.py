"""The record says everything, shows no markup of a stranger, needs nothing from outside, and loads back equal."""

import base64
import dataclasses
import html
import itertools
import json
import math
import re
from html.parser import HTMLParser

import numpy as np
import pytest
from colour_vision import contrast
from hypothesis import given
from hypothesis import strategies as st

from vortexwidgets.appraisal import REGISTRY, Appraisal, appraise, load_appraisal
from vortexwidgets.models.catalogue import MODELS
from vortexwidgets.models.derivation import derivation
from vortexwidgets.models.vortex import Vortex
from vortexwidgets.record import page as record_page
from vortexwidgets.record import saving as record
from vortexwidgets.record.maths import font_rule, formulas, mathml
from vortexwidgets.survey.reading import example_survey
from vortexwidgets.survey.samples import DroppedRow
from vortexwidgets.survey.survey import Survey
from vortexwidgets.uncertainty import Contribution, Estimate

HOSTILE = '<script>alert("x")</script><img src=x onerror=alert(1)>&amp;'


@dataclasses.dataclass(frozen=True)
class Note:
    """A class of the tests with one field of each kind."""

    number: float
    text: str
    pair: tuple[float, float]
    count: int = 0
    parts: tuple[Contribution, ...] = ()
    _kept_for_itself: float = 0.0


DROPPED = DroppedRow(0, "a value is missing")
CLASSES = {"Note": Note, "Contribution": Contribution, "Estimate": Estimate}

# JSON -----------------------------------------------------------------------------------------------------------------

plain = st.none() | st.booleans() | st.integers() | st.floats() | st.text()
values = st.recursive(
    plain,
    lambda inner: (
        st.lists(inner, max_size=4)
        | st.lists(inner, max_size=4).map(tuple)
        | st.dictionaries(st.text(max_size=5) | st.integers(0, 99), inner, max_size=4)
    ),
    max_leaves=12,
)


@given(values)
def test_every_value_comes_back_the_same(value):
    text = record.to_json(value)
    back = record.from_json(text, {})
    assert record.to_json(back) == text
    assert repr(back) == repr(value)  # the same kinds and the same digits, NaN and -0.0 included


@pytest.mark.parametrize(
    "array",
    [
        np.array([0.1, math.nan, -math.inf, 5e-324]),
        np.zeros((2, 0, 3)),
        np.arange(6).reshape(2, 3),
        np.array([True, False]),
    ],
)
def test_arrays_come_back_with_their_shape_and_kind(array):
    back = record.from_json(record.to_json(array), {})
    assert back.dtype == array.dtype
    np.testing.assert_array_equal(back, array)


def test_dataclasses_come_back_without_what_they_keep_for_themselves():
    note = Note(math.nan, "é", (1.0, -math.inf), 3, (Contribution("gain", 0.1),), _kept_for_itself=7.0)
    back = record.from_json(record.to_json(note), CLASSES)
    assert record.encode(back) == record.encode(note)
    assert back._kept_for_itself == 0.0
    assert back.parts == note.parts


@pytest.mark.parametrize("key", MODELS)
def test_models_go_by_their_key(key):
    assert record.decode(record.encode(MODELS[key]), {}) is MODELS[key]


@pytest.mark.parametrize(
    "vortex",
    [
        Vortex("vatistas", circulation=0.36, core_radius=0.005, exponent=1.7, centre=(0.1, -0.2)),
        Vortex("taylor", swirl_scale=3.0, core_radius=0.1),
        Vortex("free", circulation=-2.0),
        Vortex("forced", rotation_rate=3.0),
    ],
)
def test_vortices_come_back_equal(vortex):
    assert record.from_json(record.to_json(vortex), REGISTRY) == vortex


def test_what_a_record_cannot_hold_is_refused():
    with pytest.raises(TypeError, match="cannot hold a function"):
        record.encode(print.__class__ and (lambda: None))
    with pytest.raises(TypeError, match="complex128"):
        record.encode(np.array([1j]))


def content(encoded: object, **changes: object) -> str:
    document = {"format": "vortexwidgets record", "format_version": 1, "content": encoded, **changes}
    return json.dumps(document)


NOTE = {"class": "Note", "fields": {"number": 1.0, "text": "a", "pair": [1.0, 2.0]}}

NEGATIVE = {"class": "Contribution", "fields": {"name": "a", "uncertainty": -1.0}}


def note(**fields: object) -> dict[str, object]:
    return {"class": "Note", "fields": {**NOTE["fields"], **fields}}


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("", "not JSON"),
        ("{'a': 1}", "not JSON: .* in line 1"),
        ("[1, 2]", "not a record of this package"),
        ('{"format": "something else"}', "not a record of this package"),
        (content(1.0, format_version=99), "reads up to version 1. Update vortexwidgets"),
        (content(1.0, format_version="1"), "format version '1'"),
        ('{"format": "vortexwidgets record", "format_version": 1}', "no content"),
        (content(1.0).replace("1.0", "NaN"), "bare NaN"),
        (content(1.0).replace('"content"', '"content": 1, "content"'), "one field twice"),
        (content({"class": "Popen", "fields": {"args": "ls"}}), "'Popen' at record, which is not one of the classes"),
        (content({"class": ["Note"], "fields": {}}), "not one of the classes"),
        (content({"class": "Note", "fields": []}), "nothing that a record holds"),
        (content(note(extra=1)), "has no field 'extra'"),
        (content(note(_kept_for_itself=1.0)), "has no field '_kept_for_itself'"),
        (content({"class": "Note", "fields": {"number": 1.0}}), "field 'text' of Note is missing"),
        (content(note(number="1.0")), "damaged at record.number: '1.0' cannot be the number of a Note"),
        (content(note(number=True)), "cannot be the number"),
        (content(note(text=None)), "cannot be the text"),
        (content(note(pair=[1.0])), "cannot be the pair"),
        (content(note(count=1.5)), "cannot be the count"),
        (content(note(parts=[NOTE])), "cannot be the parts"),
        (content(note(parts=[NEGATIVE])), "must not be negative"),
        (content({"model": "no such model"}), "not in this catalogue"),
        (content({"float": "1e999"}), "nothing that a record holds"),
        (content({"array": "float64", "shape": [3], "values": [1.0]}), "shape \\[3\\] has 1 values"),
        (content({"array": "object", "shape": [1], "values": ["x"]}), "is no array"),
        (content({"array": "float64", "shape": [1], "values": ["x"]}), "holds something else"),
        (content({"array": "int64", "shape": [1], "values": [1.5]}), "holds something else"),
        (content({"mapping": [["a"]]}), "nothing that a record holds"),
        (content({"mapping": [[None, 1]]}), "nothing that a record holds"),
        (content({"unknown": 1}), "damaged at record"),
        ('{"format": "vortexwidgets record", "format_version": 1, "content": ' + "[" * 100_000, "deeper|not JSON"),
        (content(0).replace("0}", "[" * 900 + "]" * 900 + "}"), "deeper"),
    ],
)  # fmt: skip
def test_a_text_that_is_no_record_is_answered_with_one_sentence(text, sentence):
    with pytest.raises(ValueError, match=sentence) as caught:
        record.from_json(text, CLASSES)
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 400


def test_files_that_are_no_record_are_named(tmp_path):
    binary, other = tmp_path / "picture.json", tmp_path / "other.json"
    binary.write_bytes(b"\x89PNG\xff\xfe")
    other.write_text("{}", encoding="utf-8")
    with pytest.raises(ValueError, match=r"picture\.json is not text \(byte 0\)"):
        record.load_json(binary, CLASSES)
    with pytest.raises(ValueError, match=r"other\.json: The JSON is not a record"):
        record.load_json(other, CLASSES)
    with pytest.raises(FileNotFoundError):
        record.load_json(tmp_path / "none.json", CLASSES)


def test_a_write_that_fails_leaves_the_old_file_and_nothing_else(tmp_path, monkeypatch):
    target = tmp_path / "record.json"
    record.save_json((1.0, 2.0), target)
    before = target.read_bytes()

    def fail(_: int) -> None:
        raise OSError("no space left")

    monkeypatch.setattr("os.fsync", fail)
    with pytest.raises(OSError, match="no space"):
        record.save_json((3.0,), target)
    assert target.read_bytes() == before
    assert list(tmp_path.iterdir()) == [target]


# The appraisal --------------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def appraisal() -> Appraisal:
    survey = example_survey("wing-tip").with_facts(title=f"Wing tip {HOSTILE}", wander=0.0005)
    columns = (*survey.provenance.columns, f"extra {HOSTILE} -> not used")
    survey = dataclasses.replace(survey, provenance=dataclasses.replace(survey.provenance, columns=columns))
    return appraise(survey.without([3], reason=HOSTILE))


@pytest.fixture(scope="module")
def page(appraisal) -> str:
    return record.page(appraisal)


class Reader(HTMLParser):
    """Reads a page the way a browser does: elements, texts by element, attributes."""

    EMPTY = ("meta", "link", "img", "br", "source", "hr", "input")

    def __init__(self, text: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.texts: list[tuple[str, str]] = []
        self.unbalanced: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))
        if tag not in self.EMPTY:
            self.open.append(tag)

    def handle_endtag(self, tag):
        if not self.open or self.open.pop() != tag:
            self.unbalanced.append(tag)

    def handle_data(self, data):
        if data.strip() and self.open:
            self.texts.append((self.open[-1], " ".join(data.split())))

    def all(self, tag: str) -> list[dict[str, str | None]]:
        return [attributes for name, attributes in self.elements if name == tag]


def test_the_json_record_loads_back_to_an_equal_appraisal(appraisal, tmp_path):
    path = appraisal.save(tmp_path / "record.json")
    loaded = load_appraisal(path)
    assert loaded == appraisal
    assert loaded.answer == appraisal.answer
    assert loaded.summary() == appraisal.summary()
    assert loaded.to_json() == path.read_text(encoding="utf-8")
    json.loads(path.read_text(encoding="utf-8"), parse_constant=lambda name: pytest.fail(f"a bare {name}"))


def test_a_loaded_appraisal_makes_the_same_page(appraisal, page):
    assert record.page(Appraisal.from_json(appraisal.to_json())) == page


@pytest.mark.parametrize("cut", [0.1, 0.5, 0.9, 0.999])
def test_half_a_record_is_refused(appraisal, cut):
    text = appraisal.to_json()
    with pytest.raises(ValueError, match="not JSON"):
        Appraisal.from_json(text[: int(cut * len(text))])


def test_a_record_of_something_else_is_no_appraisal():
    with pytest.raises(ValueError, match="holds a Estimate, not an appraisal"):
        Appraisal.from_json(record.to_json(Estimate(1.0, 0.1)))


def test_the_first_line_of_the_page_is_the_answer(appraisal, page):
    body = [(tag, text) for tag, text in Reader(page).texts if tag not in ("title", "style")]
    assert body[0] == ("h1", " ".join(appraisal.answer.split()))


def test_the_page_is_well_formed_and_says_its_language(page):
    reader = Reader(page)
    assert page.startswith("<!DOCTYPE html>")
    assert not reader.unbalanced
    assert not reader.open
    assert reader.all("html") == [{"lang": "en"}]
    assert {"charset": "utf-8"} in reader.all("meta")
    assert len(reader.all("h1")) == 1
    headings = [int(tag[1]) for tag, _ in reader.elements if re.fullmatch("h[1-6]", tag)]
    assert all(later - earlier <= 1 for earlier, later in itertools.pairwise(headings))
    ids = [attributes["id"] for _, attributes in reader.elements if "id" in attributes]
    assert len(ids) == len(set(ids))
    targets = [attributes["href"] for attributes in reader.all("a")]
    assert targets
    assert all(target.startswith("#") and target[1:] in ids for target in targets)


def test_text_of_strangers_is_escaped(page):
    reader = Reader(page)
    assert not reader.all("script")
    assert not any(name.startswith("on") for _, attributes in reader.elements for name in attributes)
    assert page.count("&lt;script&gt;") >= 3  # title, column and reason are shown as they were written
    assert {attributes["src"][:15] for attributes in reader.all("img")} == {"data:image/png;"}


def test_the_page_asks_for_nothing_from_outside(page):
    assert re.findall(r"https?://[^\"' )]*", page.replace("http://www.w3.org/1998/Math/MathML", "")) == []
    assert re.findall(r'(?:src|srcset|href)="(?!data:|#)[^"]*"', page) == []
    assert re.findall(r"url\((?!\"data:)", page) == []
    assert "@import" not in page
    assert not Reader(page).all("link")


def test_the_page_is_small_enough_to_send(page):
    assert len(page.encode()) < 800_000


def test_every_figure_has_words_and_every_table_a_header(page):
    reader = Reader(page)
    pictures = reader.all("img")
    assert len(pictures) >= 5
    assert all(len(attributes["alt"]) > 30 and attributes["width"] and attributes["height"] for attributes in pictures)
    assert len(reader.all("figcaption")) == len(pictures) == len(reader.all("source"))
    assert all(attributes.get("scope") in ("row", "col") for attributes in reader.all("th"))


def test_pictures_are_pictures(page):
    data = re.findall(r'"data:image/png;base64,([^"]+)"', page)
    assert all(base64.b64decode(part).startswith(b"\x89PNG\r\n") for part in data)


def section(page: str, name: str) -> str:
    found = re.search(rf'<section id="{name}">(.*?)</section>\s*(?=<section id=|</main>)', page, re.S)
    assert found, name
    return " ".join(text for _, text in Reader(found[1]).texts)


def test_the_page_has_everything_that_a_reviewer_looks_for(appraisal, page):
    survey = appraisal.survey
    measured = section(page, "measured")
    assert survey.provenance.file in measured
    assert survey.provenance.sha256 in measured
    assert "position [mm] → " in measured
    assert "Rows dropped" in measured
    assert "set aside" in measured.lower()
    assert "wander" in section(page, "instrument")
    assert "velocity gain" in section(page, "instrument")
    reference = section(page, "reference")
    for word in ("ambient pressure", "density", "vapour pressure", "±", "IAPWS"):
        assert word in reference
    models = section(page, "models")
    for row in appraisal.models:
        assert " = ".join(row.names) in models
        assert row.reason in models
    assert appraisal.criterion in models
    core = section(page, "core")
    for drop in appraisal.core_drops:
        assert drop.name in core
    assert "beyond the last station" in core
    assert "towards the axis" in core
    for part in appraisal.core_pressure_drop.budget:
        if part.uncertainty > 0.0:
            assert part.name in section(page, "budget")
    consequences = section(page, "consequences")
    assert appraisal.consequences
    for item in appraisal.consequences:
        for text in (item.name, item.criterion.text, item.criterion.source, item.verdict, item.source, item.caution):
            assert " ".join(text.split()) in consequences
    assert "probability" in consequences
    derived = section(page, "derivation")
    for step in derivation(appraisal.models[0].key).steps:
        assert step.title in derived
    assert "largest relative difference" in derived
    for text in appraisal.assumptions:
        assert text in section(page, "limits")
    for text in appraisal.cautions:
        assert text in section(page, "result")
    assert appraisal.versions["vortexwidgets"] in section(page, "versions")
    assert appraisal.created[:10] in section(page, "versions")


def test_text_colours_reach_the_contrast_that_wcag_asks_for(page):
    light, dark = re.search(r":root\{(.*?)\}", page)[1], re.search(r"dark\)\{:root\{(.*?)\}", page)[1]
    for rules in (light, dark):
        colours = dict(re.findall(r"--([\w-]+):(#[0-9a-f]{3,6})", rules))
        full = {
            name: "#" + "".join(2 * c for c in code[1:]) if len(code) == 4 else code for name, code in colours.items()
        }
        for paper in ("paper", "card", "warn-card"):
            for ink in ("ink", "quiet", "accent", "met", "not-met", "open", "warn"):
                assert contrast(full[ink], full[paper]) >= 4.5, (ink, paper)  # W3C, WCAG 2.1, 1.4.3


def test_an_appraisal_without_an_answer_still_has_a_page():
    radius = np.linspace(0.002, 0.06, 40)
    swirl = 3.0 + np.sign(np.sin(900.0 * radius))  # no vortex looks like this
    survey = Survey.radial(radius=radius, swirl=swirl, uncertainty=0.01, fluid="water", temperature=288.15)
    poor = appraise(survey)
    assert math.isnan(poor.core_pressure_drop.value)
    text = record.page(poor)
    assert "No model fits" in text
    assert Appraisal.from_json(poor.to_json()) == poor


@pytest.mark.parametrize("name", ["pump-intake", "whirlwind"])
def test_the_other_examples_have_a_page_and_load_back(name, tmp_path):
    other = appraise(example_survey(name))
    path = other.save(tmp_path / "record.html")
    assert not Reader(path.read_text(encoding="utf-8")).unbalanced
    assert Appraisal.from_json(other.to_json()) == other


def test_a_planar_survey_has_a_page():
    vortex = Vortex("lamb-oseen", circulation=0.36, core_radius=0.005, centre=(0.001, 0.002))
    x = np.linspace(-0.03, 0.03, 17)
    survey = Survey.simulated(vortex, x=x, y=x, noise=0.1, seed=1, fluid="air", temperature=293.15)
    assert "Velocity vectors in the plane" in record.page(appraise(survey, models=["lamb-oseen", "kaufmann"]))


# Formulas -------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("latex", "parts"),
    [
        (r"a = 1,\quad b = 2,\qquad c", 3),
        (r"\frac{a \quad b}{c}", 1),
        (
            r"f = \begin{cases} a & \quad x \\ b & c \end{cases}, \quad \left(x \rightarrow \infty\right)",
            2,
        ),
        (r"\left(a \quad b\right)", 1),
        ("a", 1),
    ],
)
def test_a_formula_is_parted_only_between_its_statements(latex, parts):
    assert len(formulas(latex)) == parts
    assert all(part.startswith("<math") for part in formulas(latex))


@pytest.mark.parametrize("key", MODELS)
def test_every_formula_of_every_derivation_is_typeset(key):
    for step in derivation(key).steps:
        formula = mathml(step.equation)
        assert formula.startswith("<math "), step.equation
        words = html.unescape(re.sub(r"<[^>]+>", "", formula))
        assert not re.search(r"[\\&]|begin|operatorname", words), words  # nothing of LaTeX is left over


@pytest.mark.parametrize(
    "latex", [r"0 < \text{<b>bold</b>}", r"\text{a & b", r"\left( x", r"\text{</math><script>x</script>}"]
)
def test_what_cannot_be_typeset_is_shown_as_it_is_and_escaped(latex):
    shown = mathml(latex)
    assert "<b>" not in shown
    assert "<script" not in shown
    assert shown.count("</math>") <= 1


def test_the_font_comes_along_and_holds_the_signs_of_the_derivations():
    ttlib = pytest.importorskip("fontTools.ttLib")
    pytest.importorskip("brotli")
    import io

    data = base64.b64decode(re.search(r"base64,([^\"]+)", font_rule())[1])
    assert data.startswith(b"wOF2")
    assert len(data) < 80_000
    font = ttlib.TTFont(io.BytesIO(data))
    assert "MATH" in font  # without it roots and brackets do not grow
    held = set(font.getBestCmap())
    used = "".join(re.sub(r"<[^>]+>", "", mathml(step.equation)) for key in MODELS for step in derivation(key).steps)
    invisible = {chr(code) for code in (0x2061, 0x2062, 0x2063, 0x2064)}
    missing = {sign for sign in used if not sign.isspace() and sign not in invisible and ord(sign) not in held}
    assert missing == set()


# Limits ---------------------------------------------------------------------------------------------------------------


def test_a_survey_that_never_enters_the_core_shows_limits_and_no_profile_that_nobody_measured():
    # The core radius of this vortex is 25 mm; the nearest station is at 100 mm.
    vortex = Vortex("lamb-oseen", circulation=3.1, core_radius=0.025)
    radius = np.linspace(0.1, 0.5, 60)
    survey = Survey.simulated(vortex, radius=radius, noise=0.2, seed=2, fluid="water", temperature=288.15)
    limited = appraise(survey, models=["lamb-oseen"])
    assert limited.core_pressure_drop.bound == "lower"
    text = record.page(limited)
    assert "at least" in section(text, "result")
    assert "K in drop" not in section(text, "result")
    assert "There is no budget" in section(text, "budget")
    assert "Swirl, vorticity and pressure drop" not in text


def test_many_dropped_rows_with_one_reason_take_one_line(appraisal):
    rows = tuple(dataclasses.replace(DROPPED, row=row) for row in range(10, 400))
    provenance = dataclasses.replace(appraisal.survey.provenance, dropped=rows)
    aside = dict.fromkeys(range(3, 60), "outlier")
    survey = dataclasses.replace(appraisal.survey, provenance=provenance, set_aside=aside)
    text = record_page.content(dataclasses.replace(appraisal, survey=survey))
    assert len(text["dropped"]) == 1
    assert text["dropped"][0][0] == 390
    assert len(text["set_aside"]) == 1


def test_numbers_of_a_table_have_one_notation(appraisal):
    said = record_page.content(appraisal)
    for table in said["budgets"]:
        tails = {value.partition(".")[2] for _, value, _ in table["rows"]}
        assert len({(len(tail.split()[0]), tail.split()[-1]) for tail in tails}) == 1  # decimals and unit
    text = record.page(appraisal)
    numbers = "".join(re.findall(r"<td[^>]*>[^<]*</td>", text.replace(appraisal.survey.provenance.sha256, "")))
    assert not re.search(r"\d[eE][-+]?\d", numbers)
