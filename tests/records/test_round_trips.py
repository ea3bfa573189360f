"""What the csv module writes is read back cell by cell, in every separator and encoding."""

import string

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records import read_table
from engine.records.parsing import MISSING
from tests.records.files import cells_of, delimited, read

ENCODINGS = ("utf-8", "utf-8-sig", "cp1252", "utf-16")
HOSTILE = (
    "<script>alert(1)</script>",
    "select",
    "DROP TABLE",
    "a;b",
    'say "x"',
    "=1+1",
    "a\tb",
    "one\ntwo",
    "{{x}}",
    "'",
)
LETTERS = string.ascii_letters + "äßçøÉ€“” <>&;,|\t\"'\n"


words = st.text(LETTERS, max_size=12).filter(lambda text: text.strip() not in MISSING)


@st.composite
def tables(draw):
    width = draw(st.integers(2, 5))
    names = draw(
        st.lists(
            st.one_of(st.sampled_from(HOSTILE), st.text(LETTERS, min_size=1, max_size=9)),
            min_size=width,
            max_size=width,
            unique_by=str.strip,
        ).filter(lambda names: all(name.strip() for name in names))
    )
    rows = draw(st.lists(st.lists(words, min_size=width, max_size=width), min_size=1, max_size=12))
    return names, [*rows, ["plain"] * width]  # so that one separator only parts every line alike


@given(tables(), st.sampled_from(",;\t|"), st.sampled_from(ENCODINGS), st.sampled_from(["\r\n", "\n", "\r"]))
def test_every_cell_comes_back_trimmed_whatever_the_separator_encoding_and_line_ends(table, separator, encoding, ends):
    names, rows = table
    expected = [[cell.strip() or None for cell in row] for row in rows]
    expected = [row for row in expected if any(row)]
    if len(expected) < 2:
        return
    frame, _ = read(delimited([names, *rows], separator, ends, encoding))
    assert list(frame.columns) == [name.strip() for name in names]
    assert cells_of(frame) == expected


@given(
    st.lists(st.tuples(st.floats(-1e12, 1e12), st.integers(-(10**15) + 1, 10**15 - 1)), min_size=2, max_size=12),
    st.sampled_from(",;\t|"),
)
def test_numbers_come_back_to_the_last_digit(rows, separator):
    written = [["amount", "count"], *([repr(amount), str(count)] for amount, count in rows)]
    frame, said = read(delimited(written, separator))
    assert cells_of(frame) == [[amount, float(count)] for amount, count in rows]
    assert said == ()


@given(
    st.lists(st.integers(-999_999_999, 999_999_999), min_size=2, max_size=12).filter(
        lambda all: any(n % 100 for n in all)
    ),
    st.sampled_from(";\t|,"),
    st.booleans(),
)
def test_decimal_commas_are_read_in_every_separator_and_it_is_said(hundredths, separator, points):
    texts = []
    for number in hundredths:
        whole, part = divmod(abs(number), 100)
        grouped = f"{whole:,}".replace(",", ".") if points else str(whole)
        texts.append(f"{'-' if number < 0 else ''}{grouped},{part:02}")
    frame, said = read(delimited([["amount", "word"], *([text, "w"] for text in texts)], separator))
    assert frame["amount"].tolist() == [number / 100 for number in hundredths]
    assert "The commas in “amount” were read as decimal points." in said


@pytest.mark.parametrize("ends", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("first", ["", "\ufeff", "sep=;\n", "\n\n"])
def test_a_mark_in_front_and_blank_lines_do_not_become_cells(first, ends):
    text = first.replace("\n", ends) + ends.join(["a;b", "", "1;x", "   ", "2;y", "", ""])
    frame, _ = read(text)
    assert cells_of(frame) == [[1.0, "x"], [2.0, "y"]] and list(frame.columns) == ["a", "b"]


def test_a_last_line_without_an_end_counts():
    assert cells_of(read("a,b\n1,x\n2,y")[0]) == [[1.0, "x"], [2.0, "y"]]


def test_windows_letters_are_read_and_the_first_is_named():
    frame, said = read("name,town\nJosé,Łódź\n".encode("cp1252", "replace") + "Zoë,Bern\n".encode("cp1252"))
    assert frame["name"].tolist() == ["José", "Zoë"]
    assert len(said) == 1 and "Windows-1252" in said[0] and "“é” on line 2" in said[0]


@pytest.mark.parametrize("name", ["x.csv", "x.tsv", "x.TXT", "x.tab"])
def test_the_separator_is_told_from_the_lines_not_from_the_ending(name):
    assert cells_of(read("a|b\n1|x\n2|y\n", name)[0]) == [[1.0, "x"], [2.0, "y"]]


def test_a_separator_inside_quoted_texts_and_decimal_commas_do_not_mislead():
    frame, _ = read('name;share\n"Doe, Jane";1,5\n"Roe, Ann";2,5\n"Poe, Eve, the third";0,25\n')
    assert cells_of(frame) == [["Doe, Jane", 1.5], ["Roe, Ann", 2.5], ["Poe, Eve, the third", 0.25]]


def test_a_file_read_by_path_is_called_by_its_name(tmp_path):
    path = tmp_path / "Evening school.csv"
    path.write_bytes(delimited([["a", "b"], *([str(i % 3), "xy"[i % 2]] for i in range(30))]))
    assert read_table(path).name == "Evening school.csv"
    assert read_table(str(path), name="mine.csv").name == "mine.csv"


def test_what_was_read_into_cells_is_said_with_counts_and_lines():
    rows = [["code", "town", "note", "share"], ["007", "NA", "a\nb", "45%"], ["8", "NA", "c", "7.5 %"]]
    rows += [["9", "Bern", "d", "100%"], ["", "", "", ""]]
    frame, said = read(delimited(rows, ends="\n"))
    assert cells_of(frame) == [["007", None, "a\nb", 45.0], ["8", None, "c", 7.5], ["9", "Bern", "d", 100.0]]
    assert said == (
        "“code” is kept as text, because it has zeros in front, such as “007”.",
        "“NA” in 2 cells of “town” was read as blank.",
        "“share” was read as a number of per cent.",
        "1 row without a single value was left out.",
    )


def test_the_line_of_an_odd_cell_is_right_after_a_quoted_line_break():
    rows = [["code", "note"], ["1", "a\nb\nc"], ["2", "d"], ["3", "e"], ["many", "f"]]
    assert "line 7 holds “many”" in read(delimited(rows, ends="\n"))[1][0]
