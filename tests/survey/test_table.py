import numpy as np
import pytest

from vortexwidgets.survey.samples import SurveyError
from vortexwidgets.survey.table import LARGEST_FILE, numbers, parse_table, read_bytes

ROWS = [(-10.0, 1.5), (0.0, -0.25), (10.0, -2000.0)]


def columns(content: bytes | str):
    table = parse_table(content.encode() if isinstance(content, str) else content, "bench.csv")
    return table, [numbers(table, index) for index in range(2)]


@pytest.mark.parametrize(
    "content",
    [
        "position [mm],velocity [m/s]\n-10,1.5\n0,-0.25\n10,-2e3\n",
        "position [mm];velocity [m/s]\n-10;1,5\n0;-0,25\n10;-2e3\n",
        "position [mm]\tvelocity [m/s]\n-10\t1.5\n0\t-0.25\n10\t-2E+3\n",
        "position [mm]  velocity [m/s]\n-10  1.5\n 0  -0.25\n10  -2000\n",
        "position [mm] velocity [m/s]\n-10 1,5\n0 -0,25\n10 -2000,\n",
        "position_mm velocity_mps\n-10 1.5\n0 -.25\n10 -2000.\n",
        "position mm velocity m/s\n-10 1.5\n0 -.25\n10 -2000.\n",
        "\ufeffposition [mm],velocity [m/s]\r\n-10,1.5\r\n0,-0.25\r\n10,-2000\r\n",
        "position [mm],velocity [m/s]\r-10,1.5\r0,-0.25\r10,-2000",
        "position,velocity\nmm,m/s\n-10,1.5\n0,-0.25\n10,-2000\n",
        "position;velocity\n[mm];[m/s]\n-10;1,5\n0;-0,25\n10;-2000\n",
        '"position [mm]","velocity [m/s]"\n"-10","1.5"\n"0","-0.25"\n"10","-2000"\n',
        "# position [mm] velocity [m/s]\n-10 1.5\n0 -0.25\n10 -2000\n",
        "Run 7\noperator: somebody\n\nposition [mm],velocity [m/s]\n-10,1.5\n,\n0,-0.25\n10,-2000,\n",
        "% made by hand\nposition [mm],velocity [m/s]\n\u221210,1.5\n0,\u22120.25\n10,-2d3\n",
    ],
)
def test_all_common_forms_hold_the_same_numbers(content):
    _, values = columns(content)
    np.testing.assert_array_equal(np.transpose(values), ROWS)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
def test_encodings(encoding):
    content = "# title: Wirbel über Düse\nposition [mm],velocity [m/s]\n-10,1.5\n0,-0.25\n10,-2000\n".encode(encoding)
    table, values = columns(content)
    np.testing.assert_array_equal(np.transpose(values), ROWS)
    assert table.comments == ((1, "title: Wirbel über Düse"),)
    assert bool(table.notes) == (encoding in ("utf-16", "latin-1"))


def test_rows_keep_their_line_in_the_file():
    table, _ = columns("# a\n\nposition [mm],velocity [m/s]\n-10,1.5\n\n0,\n10,NaN\n")
    assert [row for row, _ in table.rows] == [4, 6, 7]
    assert np.isnan(numbers(table, 1)[1:]).all()


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "is empty"),
        (b"# only: this\n", "holds comments only"),
        (b"position [mm],velocity [m/s]\n", "has a header row but no numbers below it"),
        (b"1,2\n3,4\n5,6\n", "row 1: the numbers have no header row"),
        (b"a,b\n\x00\x01,3\n", "is not a text file"),
        (b"PK\x03\x04rest", "a zip archive or an Excel workbook; save the sheet as CSV"),
        (b'{"a": 1}', "is JSON"),
        (b"<html></html>", "is HTML or XML"),
        (b"position [mm],velocity [m/s]\n1,2\n3,4,5\n", "row 3: 3 cells under 2 headings"),
        (b"position [mm],velocity [m/s]\n1,5,2,5\n", "if these are decimal commas, separate the columns by ';'"),
        (b"position [mm],velocity [m/s]\n1,2\n3;4\n", "row 3: 1 cells under 2 headings .* by the same sign"),
        (b'position [mm],velocity [m/s]\n1,"2\n', "row 2: the quotation marks"),
        (b"position [mm],velocity [m/s]\n1,2\n3,fast\n", "row 3, column 'velocity .m/s.': 'fast' is not a number"),
        (b"position [mm],velocity [m/s]\n1,2\n3,inf\n", "'inf' is not finite"),
        (
            b"position [mm],velocity [m/s]\n1,2\n3,=A1*2\n",
            "'=A1.2' looks like a formula, and formulas are not evaluated",
        ),
        (b"position [mm];velocity [m/s]\n1;2\n3;1.234,5\n", "'1.234,5' has separators of thousands"),
        (b"position [mm];velocity [m/s]\n1;2,5\n3;1.5\n", "row 2 has a decimal comma and row 3 a decimal point"),
        (b"position [mm]," + b"x" * 30_000, "the line has 30014 characters"),
        (b",".join(b"c%d" % i for i in range(300)) + b"\n1,2\n", "has 300 columns, the limit is 200"),
        (b"\xff\xfea", "begins like UTF-16 text but is not"),
    ],
)
def test_refusals_name_row_column_value_and_remedy(content, message, tmp_path):
    path = tmp_path / "bench.csv"
    path.write_bytes(content)
    with pytest.raises(SurveyError, match=message) as caught:
        columns(read_bytes(path))
    assert "bench.csv" in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_folder_a_missing_file_and_a_huge_file_are_refused(tmp_path):
    with pytest.raises(SurveyError, match="is a folder, not a survey file"):
        read_bytes(tmp_path)
    with pytest.raises(SurveyError, match="there is no file"):
        read_bytes(tmp_path / "none.csv")
    with (tmp_path / "huge.csv").open("wb") as stream:
        stream.truncate(LARGEST_FILE + 1)
    with pytest.raises(SurveyError, match=r"huge.csv has 64 MB, the limit is 64 MB; average the survey"):
        read_bytes(tmp_path / "huge.csv")
