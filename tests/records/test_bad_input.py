"""Every file that is no table of records gets a sentence that says what, where, and what to do."""

import io

import pytest

from engine.records import read_frame, read_table
from engine.refusal import Refusal
from tests.records.files import delimited, read, spreadsheet

PICTURE = b"\x89PNG\r\n\x1a\n" + bytes(200)
FILES = [
    ("empty", "a.csv", b"", "is empty"),
    ("only a mark", "a.csv", b"\xef\xbb\xbf", "is empty"),
    ("only blank lines", "a.csv", b"\n\r\n  \n", "is empty"),
    ("a picture", "a.csv", PICTURE, "is a picture \\(PNG\\), not a table of text"),
    ("a packed file", "a.csv", spreadsheet(One=[["a"], [1]]), "is a spreadsheet or another packed file"),
    ("bytes", "a.csv", b"a,b\n1,\x00\n", "is not a file of text"),
    ("cut UTF-16", "a.csv", "a,b\n".encode("utf-16")[:-1], "is not a file of text"),
    ("no encoding", "a.csv", b"a,b\n1,x\n2,\x81\n", "neither UTF-8 nor Windows-1252 on line 3"),
    ("no header", "a.csv", b"1,2\n3,4\n5,6\n", "holds numbers, not names of columns"),
    ("only a header", "a.csv", b"a,b\n", "has a header but no records"),
    ("one record", "a.csv", b"a,b\n1,2\n", "has one record only"),
    ("one column", "a.csv", b"a\n1\n2\n", "has one column only"),
    ("all blank", "a.csv", b"a,b\n,\n , \n", "every cell under them is blank"),
    ("a name twice", "a.csv", b"a,b,a\n1,2,3\n1,2,3\n", "Two columns are called “a”: columns 1 and 3"),
    ("a name missing", "a.csv", b"a,,c\n1,2,3\n1,2,3\n", "Column 2 of “a.csv” has no name"),
    ("a separator at the end of the header", "a.csv", b"a,b,\n1,2,\n3,4,\n", "Column 3 of “a.csv” has no name"),
    (
        "separators at the ends of lines",
        "a.csv",
        b"a,b\n1,2,\n3,4,\n",
        "2 of 3 lines do not fit .*: line 2 has 3 cells",
    ),
    ("a quotation mark left open", "a.csv", b'a,b\n1,2\n3,"4\n5,6\n', "on line 3 and never closes it"),
    ("an unknown ending", "a.pdf", b"%PDF", "an ending that is not known"),
    ("no ending", "a", b"a,b\n1,2\n", "an ending that is not known"),
    ("no spreadsheet", "a.xlsx", b"a,b\n1,2\n3,4\n", "is not a spreadsheet that can be opened"),
    ("an empty spreadsheet", "a.xlsx", spreadsheet(One=[]), "is empty"),
    ("a spreadsheet of one row", "a.xlsx", spreadsheet(One=[["a", "b"], [1, 2]]), "has one record only"),
    ("no Parquet file", "a.parquet", b"PAR1abc", "is not a Parquet file"),
]


@pytest.mark.parametrize(("name", "content", "says"), [each[1:] for each in FILES], ids=[each[0] for each in FILES])
def test_a_file_that_is_no_table_is_refused_with_a_place_and_an_act(name, content, says):
    with pytest.raises(Refusal, match=says) as refused:
        read_frame(io.BytesIO(content), name)
    assert refused.value.where and refused.value.do
    assert refused.value.message[-1] == refused.value.do[-1] == "."


@pytest.mark.parametrize("ends", ["\n", "\r\n", "\r"])
def test_ragged_lines_are_named_as_an_editor_counts_them(ends):
    rows = [["a", "b"], ["1", f"two{ends}lines"], ["3", "4", "5"], ["6"], ["7", "8"]]
    with pytest.raises(Refusal, match="2 of 5 lines do not fit") as refused:
        read(delimited(rows, ends=ends))
    assert "line 4 has 3 cells, line 5 has 1 cell" in refused.value.message and refused.value.where == "line 4"


@pytest.mark.parametrize(
    ("right", "wrong", "says"),
    [(8, 1, "1 of 10 lines does not fit"), (6, 6, "6 of 13 lines do not fit .* and 1 more line does not fit")],
)
def test_one_ragged_line_is_told_in_the_singular(right, wrong, says):
    with pytest.raises(Refusal, match=says):
        read(delimited([["a", "b"], *[["1", "2"]] * right, *[["1", "2", "3"]] * wrong]))


def test_a_file_that_is_not_there_is_refused(tmp_path):
    with pytest.raises(Refusal, match=r"no file .*gone\.csv") as refused:
        read_frame(tmp_path / "gone.csv")
    assert refused.value.where and refused.value.do
    with pytest.raises(Refusal, match="cannot be opened"):
        (tmp_path / "folder.csv").mkdir()
        read_frame(tmp_path / "folder.csv")


def test_hostile_names_and_levels_are_read_as_they_are():
    names = ["select", "<script>alert(1)</script>", "a\nb", '"', "=SUM(A1)", "'; DROP TABLE studies; --"]
    rows = [[f"<b>{place}</b>" for place in range(6)], [f"&amp;{place}" for place in range(6)]] * 3
    table = read_table(io.BytesIO(delimited([names, *rows])), "visits.csv")
    assert list(table.columns) == names
    assert table.columns["select"].levels == ("&amp;0", "<b>0</b>")


def test_formulas_without_results_are_refused_and_with_results_are_read():
    from tests.records.files import changed_part

    rows = [["a", "b"], [1, 2], [3, "=A3*2"]]
    with pytest.raises(Refusal, match="formula in B3 of the sheet “One” has no stored result"):
        read(spreadsheet(One=rows), "a.xlsx")

    def solved(part):
        assert b"<f>A3*2</f><v/>" in part or b"<f>A3*2</f><v />" in part or b"<f>A3*2</f><v></v>" in part
        for empty in (b"<v/>", b"<v />", b"<v></v>"):
            part = part.replace(b"<f>A3*2</f>" + empty, b"<f>A3*2</f><v>6</v>")
        return part

    frame, said = read(changed_part(spreadsheet(One=rows), "xl/worksheets/sheet1.xml", solved), "a.xlsx")
    assert frame["b"].tolist() == [2, 6] and said == ()


def test_a_parquet_file_is_read_with_its_names_checked(tmp_path):
    import pandas as pd

    frame = pd.DataFrame({"a": ["007", None, "x"], "b": [1.5, 2, None]})
    frame.to_parquet(tmp_path / "a.parquet")
    found, _ = read_frame(tmp_path / "a.parquet")
    assert found["a"].tolist()[0] == "007" and found["b"].tolist()[:2] == [1.5, 2]
    pd.DataFrame({"a": [[1], [2]], "b": [1, 2]}).to_parquet(tmp_path / "b.parquet")
    with pytest.raises(Refusal, match="“a” holds lists"):
        read_frame(tmp_path / "b.parquet")
