"""From a file of any kind to a frame or a table, or to a sentence that says what is wrong with it and where."""

import io

import numpy as np
import pandas as pd
import pytest

from engine.records import Table, read_frame, read_table
from engine.refusal import Refusal

CSV = "age;shift;passed\n" + "".join(
    f"{20 + row % 30},5;{'days' if row % 3 else 'nights'};{'yes' if row % 2 else 'no'}\n" for row in range(60)
)


def refused(content, name="t.csv"):
    with pytest.raises(Refusal) as found:
        read_frame(io.BytesIO(content), name)
    assert found.value.message and found.value.where and found.value.do
    return found.value


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (b"", "is empty"),
        (b"\xef\xbb\xbf", "is empty"),
        (b" \n\n", "is empty"),
        (b"a,b\n", "a header but no records"),
        (b"a,b\n1,2\n", "one record only"),
        (b"a\n1\n2\n", "one column only"),
        (b"a,b\n,\n ,\n,\n", "every cell under them is blank"),
        (b"a,b\n1,2,3\n4\n5,6\n", "2 of 4 lines do not fit its own header, which names 2 columns: line 2 has 3 cells"),
        (b"a,b,a\n1,2,3\n4,5,6\n", "Two columns are called “a”"),
        (b"\x89PNG\r\n\x1a\n" + bytes(300), "is a picture (PNG)"),
        (b"\xff\xd8\xff\xe0\x00\x10JFIF" + bytes(300), "is a picture (JPEG)"),
    ],
)
def test_a_file_that_is_no_table_gets_a_sentence(content, said):
    assert said in refused(content).message


@pytest.mark.parametrize(
    ("content", "name", "said"),
    [
        (b"a,b\n1,2\n3,4\n", "t.doc", "an ending that is not known"),
        (b"a,b\n1,2\n3,4\n", "t.xlsx", "not a spreadsheet that can be opened"),
        (b"a,b\n1,2\n3,4\n", "t.parquet", "not a Parquet file that can be opened"),
        (b"PK\x03\x04" + bytes(90), "t.csv", "is a spreadsheet or another packed file"),
    ],
)
def test_an_ending_that_does_not_fit_is_said(content, name, said):
    assert said in refused(content, name).message


@pytest.mark.parametrize("ending", [".csv", ".parquet"])
def test_a_table_of_more_columns_than_anybody_puts_in_order_is_refused(ending):
    def table(columns):
        frame = pd.DataFrame({f"c{place}": ["x", "y"] for place in range(columns)})
        content = io.BytesIO()
        frame.to_csv(content, index=False) if ending == ".csv" else frame.to_parquet(content)
        return content.getvalue()

    assert "has 501 columns, more than the 500 that can be brought" in refused(table(501), f"wide{ending}").message
    assert read_frame(io.BytesIO(table(500)), f"wide{ending}")[0].shape == (2, 500)


def test_a_path_that_leads_nowhere_is_said(tmp_path):
    with pytest.raises(Refusal, match="There is no file"):
        read_frame(tmp_path / "t.csv")
    (tmp_path / "folder.csv").mkdir()
    with pytest.raises(Refusal, match="cannot be opened"):
        read_frame(tmp_path / "folder.csv")


def test_a_table_is_read_with_its_choices_and_what_was_said_of_the_file():
    table = read_table(io.BytesIO(CSV.encode()), "visits.csv", bands={"age": [30, 40]}, kinds={"shift": "left out"})
    assert table.rows == 60
    assert table.columns["age"].levels == ("under 30", "30 to under 40", "40 and over")
    assert table.columns["shift"].kind == "left out"
    assert table.warnings == ("The commas in “age” were read as decimal points.",)


def test_an_open_text_file_is_read_as_its_bytes_are():
    assert read_table(io.StringIO(CSV), "v.csv").digest == read_table(io.BytesIO(CSV.encode()), "v.csv").digest


def test_a_frame_kept_as_parquet_makes_the_same_table(tmp_path):
    frame, _ = read_frame(io.BytesIO(CSV.encode()), "visits.csv")
    frame.to_parquet(tmp_path / "visits.parquet", index=False)
    kept = pd.read_parquet(tmp_path / "visits.parquet")
    assert Table.from_frame(kept).digest == Table.from_frame(frame).digest
    again, said = read_frame(tmp_path / "visits.parquet")
    assert Table.from_frame(again).digest == Table.from_frame(frame).digest and said == ()


def test_parquet_of_other_programs_is_read_by_its_values(tmp_path):
    days = pd.Series(pd.date_range("2024-01-01", periods=3))
    frame = pd.DataFrame({"n": [1, 2, 3], "w": ["a", None, "b"], "f": [True, False, True], "d": days})
    frame.to_parquet(tmp_path / "t.parquet")
    found, _ = read_frame(tmp_path / "t.parquet")
    table = Table.from_frame(found)
    assert table.columns["n"].kind == "number"
    assert table.columns["w"].levels == ("a", "b", "blank")
    assert table.columns["f"].levels == ("False", "True")
    assert table.columns["d"].kind == "left out" and "dates" in table.columns["d"].why


def test_columns_of_lists_are_refused_by_name(tmp_path):
    pd.DataFrame({"a": [[1], [2]], "b": [1, 2]}).to_parquet(tmp_path / "t.parquet")
    with pytest.raises(Refusal, match="“a” holds lists"):
        read_frame(tmp_path / "t.parquet")


def test_hostile_names_and_levels_are_only_names():
    names = ["<script>alert(1)</script>", "select", "'; DROP TABLE studies; --", "{{ 7 * 7 }}"]
    rows = [["<b>", "=1+1", "a'b", "&amp;"], ["@x", "-", "..", "%00"]] * 10
    text = "\n".join("|".join(row) for row in [names, *rows])
    table = read_table(io.BytesIO(text.encode()), "t.csv")
    assert list(table.columns) == names
    assert table.columns[names[0]].levels == ("<b>", "@x")
    assert np.array_equal(table.matches("select", "=1+1"), [row[1] == "=1+1" for row in rows])
