"""Bytes become text, or a sentence that says what they are instead."""

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.decoding import utf_8
from engine.refusal import Refusal

words = st.text(st.characters(exclude_categories=["Cs", "Cc"]), min_size=1)
western = st.text(st.characters(codec="cp1252", exclude_categories=["Cc"]), min_size=1)


@given(words)
def test_utf_8_and_utf_16_are_told_from_their_bytes(text):
    for encoded in (text.encode(), b"\xef\xbb\xbf" + text.encode(), b"\xff\xfe" + text.encode("utf-16-le")):
        assert utf_8(encoded, "t.csv") == (
            text.removeprefix("\ufeff").encode() if encoded == text.encode() else text.encode(),
            (),
        )


@given(western)
def test_what_is_no_utf_8_is_read_as_windows_1252_and_this_is_said(text):
    encoded = f"a;b\nü{text} ".encode("cp1252")  # ü and a space are no UTF-8, unless the text makes them so
    try:
        encoded.decode()
    except UnicodeDecodeError:
        found, (said,) = utf_8(encoded, "t.csv")
        assert found.decode() == f"a;b\nü{text} "
        assert "Windows-1252" in said and "line 2" in said


def test_the_end_mark_of_old_systems_is_no_text():
    assert utf_8(b"a,b\n1,2\n\x1a", "t.csv") == (b"a,b\n1,2\n", ())


@pytest.mark.parametrize(
    ("content", "what"),
    [
        (b"\x89PNG\r\n\x1a\n" + bytes(50), "a picture (PNG)"),
        (b"\xff\xd8\xff\xe0" + bytes(50), "a picture (JPEG)"),
        (b"GIF89a" + bytes(50), "a picture (GIF)"),
        (b"BM" + bytes(60), "a picture (BMP)"),
        (b"%PDF-1.7\n", "a PDF document"),
        (b"PK\x03\x04", "a spreadsheet or another packed file"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old spreadsheet (.xls)"),
        (b"\x1f\x8b\x08", "a packed file (gzip)"),
    ],
)
def test_what_is_another_kind_of_file_is_named(content, what):
    with pytest.raises(Refusal, match=re.escape(f"“holiday.csv” is {what}")) as refused:
        utf_8(content, "holiday.csv")
    assert refused.value.where == "holiday.csv" and "CSV" in refused.value.do


@pytest.mark.parametrize("content", [b"a,b\n1,\x00\n", b"\xff\xfe\x00\xd8", bytes(range(1, 9)) * 20, b"\xff\xfea"])
def test_what_is_no_text_is_refused(content):
    with pytest.raises(Refusal, match="is not a file of text"):
        utf_8(content, "t.csv")


def test_a_name_that_starts_like_a_picture_is_a_name():
    assert utf_8(b"BMI,age\n20,30\n", "t.csv") == (b"BMI,age\n20,30\n", ())


def test_a_byte_that_is_no_letter_anywhere_is_refused_with_its_line():
    with pytest.raises(Refusal, match="line 3") as refused:
        utf_8(b"a,b\n1,2\n\x81,4\n", "t.csv")
    assert refused.value.where == "line 3"
