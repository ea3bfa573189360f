"""Text files: the separator is found, every line fits the header, and what does not fit is named with its line."""

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records import delimited
from engine.records.delimited import separator, text_cells
from engine.refusal import Refusal

MARKS = [",", ";", "\t", "|"]
cells = st.text(st.characters(exclude_categories=["Cs", "Cc"]) | st.sampled_from(',;|"\n\r\t'), max_size=6)
names = st.lists(st.text("abcXYZ <>'&", min_size=1, max_size=5), min_size=2, max_size=4, unique_by=str.strip).filter(
    lambda names: all(name.strip() for name in names)
)


def written(rows, mark, line_end="\n", quoting=csv.QUOTE_MINIMAL):
    file = io.StringIO(newline="")
    csv.writer(file, delimiter=mark, lineterminator=line_end, quoting=quoting).writerows(rows)
    return file.getvalue()


def read_plainly(text, mark):
    """Column by column, with the csv module alone; lines without a mark on them left out."""
    rows = [row for row in csv.reader(io.StringIO(text, newline=""), delimiter=mark)]
    rows = [row for row in rows if row and (len(row) > 1 or row[0].strip())]
    return {name.strip(): [row[place] for row in rows[1:]] for place, name in enumerate(rows[0])}


def found(text, name="t.csv"):
    return {column: cells.to_pylist() for column, cells in text_cells(text.encode(), name).columns.items()}


@given(
    st.data(),
    names,
    st.sampled_from(MARKS),
    st.sampled_from([("\r\n", csv.QUOTE_MINIMAL), ("\n", csv.QUOTE_ALL), ("\r", csv.QUOTE_ALL)]),
)
def test_every_cell_written_is_the_cell_read(data, header, mark, style):
    row = st.lists(cells, min_size=len(header), max_size=len(header))
    rows = data.draw(st.lists(row, min_size=1, max_size=6))
    text = f"sep={mark}\n" + written([header, *rows], mark, *style)
    assert found(text) == {name.strip(): [row[place] for row in rows] for place, name in enumerate(header)}


@given(names, st.integers(2, 8), st.sampled_from(MARKS))
def test_the_separator_is_found_where_cells_hold_none(header, rows, mark):
    text = written([header, *([f"w{row}{place}" for place in range(len(header))] for row in range(rows))], mark)
    assert separator(text, "t.csv") == mark


@given(st.text('ab,;\t|"\n\r ', max_size=60))
def test_any_text_is_read_as_the_csv_module_reads_it_or_refused(text):
    try:
        texts = text_cells(text.encode(), "t.csv")
    except Refusal as refused:
        assert refused.message.endswith((".", "”")) and refused.where
        return
    body = text.split("\n", 1)[1] if text.lower().startswith("sep=") else text
    assert {name: cells.to_pylist() for name, cells in texts.columns.items()} == read_plainly(body, texts.separator)


@pytest.mark.parametrize(
    ("text", "mark"),
    [
        ("height, cm;weight, kg\n170,5;60,2\n180,5;70,1\n", ";"),
        ("name,note\nx,a;b\ny,c\nz,d;e;f\n", ","),
        ('a,b\n"1;2","3;4"\n5,6\n', ","),
        ("a|b\n1,5|2,5\n2,5|1\n", "|"),
        ("a\tb\n1,5\t2;5\n2,5\t1\n", "\t"),
        ("a;b\n1,2;3\n", ";"),
    ],
)
def test_a_separator_inside_cells_does_not_mislead(text, mark):
    assert separator(text, "t.csv") == mark


def test_lines_that_do_not_fit_are_named_with_their_cells():
    text = 'a,b\n1,"2\n2"\n\n3,4,5\n6\n' + "7,8\n" * 20
    with pytest.raises(Refusal, match=r"2 of 24 lines do not fit.*: line 5 has 3 cells, line 6 has 1 cell") as refused:
        found(text)
    assert refused.value.where == "line 5"
    assert "commas" in refused.value.do


def test_only_the_first_of_many_lines_are_named():
    text = "a;b\n" + "1;2\n" * 60 + "1;2;3\n" * 50
    with pytest.raises(Refusal, match="line 66 has 3 cells and 45 more lines do not fit"):
        found(text)


def test_a_title_above_the_header_is_pointed_at():
    with pytest.raises(Refusal, match="names 1 column: line 3 has 3 cells") as refused:
        found("Report of the spring\n\na,b,c\n1,2,3\n4,5,6\n")
    assert "title" in refused.value.do


@pytest.mark.parametrize("rest", ["3,4\n5,6\n", '3,"4"\n5,6\n', ""])
def test_a_quotation_mark_that_is_never_closed_is_named_with_its_line(rest):
    with pytest.raises(Refusal, match="on line 3 and never closes it") as refused:
        found(f'a,b\n1,2\n1,"2\n{rest}' if '"' not in rest else 'a,b\n1,2\n1,"2\n3,4\n')
    assert refused.value.where == "line 3"


def test_a_quotation_mark_inside_a_word_is_a_letter():
    assert found('a,b\n5" pipe,x\n6,"y"\n') == {"a": ['5" pipe', "6"], "b": ["x", "y"]}


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("\n \r\n", "is empty"),
        ("a\n1\n2\n", "one column only"),
        ("a,\n1,2\n", "Column 2 of “t.csv” has no name"),
        (",,a\n1,2,3\n", "Column 1 of “t.csv” has no name, nor do 1 more"),
        ("a,b,a\n1,2,3\n", "Two columns are called “a”: columns 1 and 3"),
        ("a, a \n1,2\n", "Two columns are called “a”"),
        ("1,2.5\n3,4\n", "holds numbers, not names"),
    ],
)
def test_a_header_that_is_none_is_refused(text, said):
    with pytest.raises(Refusal, match=said) as refused:
        found(text)
    assert refused.value.where and refused.value.do


def test_names_are_only_names():
    header = ["select", "<script>alert(1)</script>", "'; DROP TABLE studies; --", "=1+1", "année", "a b"]
    assert list(found(written([header, ["x"] * 6, ["y"] * 6], ","))) == header


@pytest.mark.parametrize(
    ("text", "lines"),
    [
        ("a,b\n1,2\n3,4\n", ["line 2", "line 3"]),
        ("\n\na,b\n1,2\n\n3,4\n", ["line 4", "line 6"]),
        ('a,b\n1,"2\n\n2"\n3,4\n', ["line 2", "line 5"]),
        ('"a\nb",c\r\n1,2\r\n   \r\n3,4\r\n', ["line 3", "line 5"]),
        ("sep=;\na;b\n1;2\n3;4", ["line 3", "line 4"]),
        ("a,b\r1,2\r\r3,4\r", ["line 2", "line 4"]),
    ],
)
def test_a_row_knows_its_line(text, lines):
    texts = text_cells(text.encode(), "t.csv")
    assert [texts.line(row) for row in range(2)] == lines


def test_a_file_longer_than_the_part_looked_at_first_is_read_whole(monkeypatch):
    monkeypatch.setattr(delimited, "HEAD", 50)
    text = "a;b\n" + "".join(f"{row};é{row}\n" for row in range(300))
    assert found(text) == read_plainly(text, ";")


def test_a_header_with_no_records_has_empty_columns():
    assert found("a,b\n") == {"a": [], "b": []}
