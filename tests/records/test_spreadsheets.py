"""Spreadsheets: the first sheet with cells is read; what would swallow the machine is refused before it is opened."""

import datetime
import io
import zipfile

import openpyxl
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.reading import read_frame
from engine.records.spreadsheets import sheet_cells
from engine.refusal import Refusal


def book(*sheets):
    made = openpyxl.Workbook()
    made.remove(made.active)
    for place, rows in enumerate(sheets):
        sheet = made.create_sheet(f"sheet {place + 1}")
        for row in rows:
            sheet.append(row)
    file = io.BytesIO()
    made.save(file)
    return file.getvalue()


def packed(parts):
    file = io.BytesIO()
    with zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as made:
        for name, content in parts.items():
            made.writestr(name, content)
    return file.getvalue()


def frame(content, name="t.xlsx"):
    return read_frame(io.BytesIO(content), name)


TOP = [["age", "town"], [20, "Tern"], [31, "Wick"]]

texts = st.text(st.characters(codec="utf-8", exclude_categories=["Cs", "Cc"]), min_size=1).map(str.strip)


@given(
    st.lists(
        st.tuples(
            st.floats(allow_nan=False, allow_infinity=False, width=32) | st.integers(-(10**9), 10**9),
            texts.filter(lambda text: text and not text[0].isdigit() and text[0] not in "=+-−.N#n"),
        ),
        min_size=2,
        max_size=8,
    )
)
def test_every_cell_written_is_the_cell_read(rows):
    found, said = frame(book([["n", "w"], *rows]))
    assert found["n"].tolist() == pytest.approx([number for number, _ in rows], rel=1e-14)  # written with 16 digits
    assert found["w"].tolist() == [word for _, word in rows]
    assert said == ()


def test_cells_keep_what_they_show():
    day, moment = datetime.date(2024, 3, 1), datetime.datetime(2024, 3, 1, 12, 30)
    found, _ = frame(book([["a", "b", "c", "d"], ["007", True, day, 1.0], ["7", False, moment, "x"]]))
    assert found["a"].tolist() == ["007", "7"]
    assert found["b"].tolist() == ["TRUE", "FALSE"]
    assert found["c"].tolist() == ["2024-03-01", "2024-03-01 12:30:00"]
    assert found["d"].tolist() == ["1", "x"]


def test_the_first_sheet_with_cells_is_read_and_the_others_are_said():
    found, said = frame(book([], TOP, [["other"], [1]], []))
    assert list(found) == ["age", "town"]
    assert said == ("Only the sheet “sheet 2” was read, not “sheet 3”.",)


def test_empty_rows_and_columns_around_the_table_do_not_matter_and_a_row_knows_its_number():
    sheet = sheet_cells(book([[], ["a", "b", None], [], ["x", 1, None], [None, None], ["y", 2]]), "t.xlsx")
    assert sheet.columns["a"].to_pylist() == [None, "x", None, "y"]
    assert [sheet.line(row) for row in (1, 3)] == ["row 4", "row 6"]


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (book([]), "is empty"),
        (book([["a", None, "b"], [1, 2, 3], [1, 2, 3]]), "Column 2 of “t.xlsx” has no name"),
        (book([["a", " a"], [1, 2], [1, 2]]), "Two columns are called “a”"),
        (book([["a", "b"], [1, 2], [1, 2, 3]]), "Row 3 of the sheet “sheet 1” has 3 cells"),
        (book([["a"], [1], [2]]), "one column only"),
        (book([["a", "b"], [1, 2]]), "one record only"),
        (book([["a", "b"]]), "a header but no records"),
        (book([["a", "b"], ["  ", " "], [" ", " "]]), "a header but no records"),
        (b"a,b\n1,2\n", "is not a spreadsheet that can be opened"),
        (b"PK\x03\x04" + bytes(40), "is not a spreadsheet that can be opened"),
        (packed({"letter.txt": "hello"}), "is not a spreadsheet that can be opened"),
        (book(TOP)[:-200], "is not a spreadsheet that can be opened"),
        (b"\xd0\xcf\x11\xe0" + bytes(40), "an old spreadsheet"),
    ],
)
def test_what_cannot_be_read_is_refused_in_words(content, said):
    with pytest.raises(Refusal, match=said) as refused:
        frame(content)
    assert refused.value.where and refused.value.do


def test_a_small_file_that_unpacks_to_a_huge_one_is_refused_before_it_is_opened(monkeypatch):
    monkeypatch.setattr(openpyxl, "load_workbook", lambda *_, **__: pytest.fail("it was opened"))
    for parts in ({"xl/sheet.xml": bytes(60_000_000)}, {f"part{place}": "" for place in range(2_001)}):
        with pytest.raises(Refusal, match=r"would unpack to .* too much for a table"):
            frame(packed(parts))


def test_a_sheet_that_claims_a_huge_size_is_read_by_its_cells():
    content = book(TOP)
    with zipfile.ZipFile(io.BytesIO(content)) as made:
        parts = {name: made.read(name) for name in made.namelist()}
    sheet = parts["xl/worksheets/sheet1.xml"]
    parts["xl/worksheets/sheet1.xml"] = sheet.replace(b'ref="A1:B3"', b'ref="A1:XFD1048576"')
    assert parts["xl/worksheets/sheet1.xml"] != sheet
    assert frame(packed(parts))[0]["age"].tolist() == [20, 31]


def test_entities_in_a_sheet_are_not_expanded():
    with zipfile.ZipFile(io.BytesIO(book(TOP))) as made:
        parts = {name: made.read(name) for name in made.namelist()}
    bomb = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;">]>'
    parts["xl/workbook.xml"] = bomb + parts["xl/workbook.xml"].split(b"?>", 1)[-1]
    with pytest.raises(Refusal, match="is not a spreadsheet that can be opened"):
        frame(packed(parts))


def test_a_spreadsheet_with_damaged_bytes_is_refused():
    content = bytearray(book(TOP))
    with zipfile.ZipFile(io.BytesIO(bytes(content))) as made:
        start = made.getinfo("xl/worksheets/sheet1.xml").header_offset
    for place in range(start + 60, start + 120):
        damaged = bytes(content[:place]) + bytes([content[place] ^ 255]) + bytes(content[place + 1 :])
        with pytest.raises(Refusal, match="is not a spreadsheet that can be opened"):
            frame(damaged)
