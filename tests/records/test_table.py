"""A table: levels and codes from cells of any type, blanks as levels or dropped rows, and which rows match."""

import datetime
import decimal

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records import Table
from engine.refusal import Refusal

LEVELS = ("no", "select", "<script>", "blank", "10", "9")
categories = st.sampled_from([None, *LEVELS])
numbers = st.sampled_from([np.nan, -1.5, 0.0, 2.0, 3.0, 7.0, 40.0])
frames = (
    st.lists(st.tuples(categories, numbers, st.sampled_from(["x", "y"])), min_size=2, max_size=30)
    .map(lambda rows: pd.DataFrame(rows, columns=["kind", "amount", "other"]))
    .filter(lambda frame: frame["kind"].notna().any() and frame["amount"].notna().any())
)
BLANKS = st.sampled_from(["level", "drop row"])


def taken(frame, **choices):
    return Table.from_frame(frame, {"kind": "category", "amount": "number", "other": "category"}, **choices)


@given(frames, BLANKS, BLANKS)
def test_codes_name_each_cell_and_dropped_rows_are_counted(frame, kind, amount):
    blank = {"kind": frame["kind"].isna(), "amount": frame["amount"].isna()}
    dropping = [name for name, means in (("kind", kind), ("amount", amount)) if means == "drop row"]
    kept = ~np.logical_or.reduce([blank[name] for name in dropping] or [np.zeros(len(frame), bool)])
    if kept.sum() < 2 or any(blank[name][kept].all() for name in blank):
        with pytest.raises(Refusal):
            taken(frame, blanks={"kind": kind, "amount": amount})
        return
    table = taken(frame, blanks={"kind": kind, "amount": amount})
    assert table.kept.tolist() == list(kept) and table.rows == kept.sum() == table.weights.size
    assert dict(table.dropped) == {name: int(blank[name].sum()) for name in dropping if blank[name].any()}
    column = table.columns["kind"]
    assert column.blanks == blank["kind"].sum()
    assert column.has_blank == (kind == "level" and blank["kind"].any())
    named = [column.levels[code] for code in column.codes]
    for name, cell in zip(named, frame["kind"][kept], strict=True):
        assert name == (column.levels[-1] if pd.isna(cell) else cell)
    if column.has_blank:
        assert column.levels[-1] == ("blank (no value)" if (frame["kind"][kept] == "blank").any() else "blank")
    held = frame["amount"][kept].to_numpy()
    assert np.array_equal(table.columns["amount"].values, held, equal_nan=True)
    bands = len(table.columns["amount"].cuts) + 1
    assert (np.bincount(table.columns["amount"].codes, minlength=bands)[:bands] > 0).all()


@given(frames, st.sets(st.sampled_from(LEVELS), min_size=1), st.tuples(numbers, numbers))
def test_rows_match_as_pandas_selects_them(frame, wanted, ends):
    table = taken(frame)
    known = {level for level in wanted if (frame["kind"] == level).any() and level != "blank"}
    if known:
        assert table.matches("kind", known).tolist() == frame["kind"].isin(known).tolist()
        assert table.matches("kind", next(iter(known))).tolist() == (frame["kind"] == next(iter(known))).tolist()
    if frame["amount"].isna().any():
        assert table.matches("amount", "blank").tolist() == frame["amount"].isna().tolist()
    low, high = (None if np.isnan(end) else end for end in ends)
    if low is None or high is None or low < high:
        inside = frame["amount"].notna()
        inside &= True if low is None else frame["amount"] >= low
        inside &= True if high is None else frame["amount"] < high
        assert table.matches("amount", (low, high)).tolist() == inside.tolist()
        assert (table.matches("amount", (low, np.inf)) == table.matches("amount", (low, None))).all()


@given(frames, st.sampled_from(["kind", "amount"]))
def test_levels_part_the_rows(frame, name):
    table = taken(frame)
    matched = [table.matches(name, level) for level in table.columns[name].levels]
    assert (np.sum(matched, axis=0) == 1).all()


DAY = datetime.date(2026, 3, 1)
DTYPES = {
    "str": (pd.Series(["a", "b", None], dtype="str"), ("a", "b", "blank")),
    "object": (pd.Series(["b", None, "a"], dtype=object), ("a", "b", "blank")),
    "spaces": (pd.Series(["b", "  ", "a"], dtype=object), ("a", "b", "blank")),
    "category": (pd.Series(["b", None, "a"], dtype=pd.CategoricalDtype(["z", "b", " ", "a"])), ("a", "b", "blank")),
    "ordered": (pd.Series(["lo", "hi", None], dtype=pd.CategoricalDtype(["lo", "hi"], True)), ("lo", "hi", "blank")),
    "bool": (pd.Series([True, False, True]), ("False", "True")),
    "boolean": (pd.Series([True, None, False], dtype="boolean"), ("False", "True", "blank")),
    "bool objects": (pd.Series([True, None, False], dtype=object), ("False", "True", "blank")),
    "int": (pd.Series([3, 10, 10]), ("3", "10")),
    "uint8": (pd.Series([3, 10, 10], dtype="uint8"), ("3", "10")),
    "Int64": (pd.Series([3, None, 10], dtype="Int64"), ("3", "10", "blank")),
    "float32": (pd.Series([0.5, 10, np.nan], dtype="float32"), ("0.5", "10", "blank")),
    "numbers as objects": (pd.Series([2, 1.5, None], dtype=object), ("1.5", "2", "blank")),
    "decimals": (pd.Series([decimal.Decimal("1.5"), decimal.Decimal(2), None], dtype=object), ("1.5", "2", "blank")),
    "long whole numbers": (pd.Series([2**60, 2**60 + 1, 2**60]), (str(2**60), str(2**60 + 1))),
    "dates": (pd.Series([DAY, None, DAY], dtype=object), ("2026-03-01", "blank")),
    "datetimes": (pd.to_datetime(pd.Series(["2026-03-01", "2026-03-02", None])), ("2026-03-01", "2026-03-02", "blank")),
    "periods": (pd.Series(pd.period_range("2026-01", periods=3, freq="M")), ("2026-01", "2026-02", "2026-03")),
    "mixed": (pd.Series(["a", 2, 2.0], dtype=object), ("2", "a")),
    "lists": (pd.Series([[1], [2], [1]], dtype=object), ("[1]", "[2]")),
    "complex": (pd.Series([1j, 2j, 1j], dtype=object), ("1j", "2j")),
    "bands": (pd.cut(pd.Series([1, 9, 2]), [0, 5, 10]), ("(0, 5]", "(5, 10]")),
}


@pytest.mark.parametrize("name", DTYPES)
def test_every_type_of_pandas_column_becomes_levels(name):
    column, levels = DTYPES[name]
    table = Table.from_frame(pd.DataFrame({"x": column, "y": [1, 2, 3]}).set_axis([7, 7, 7]), {"x": "category"})
    assert table.columns["x"].levels == levels


@pytest.mark.parametrize("bad", [np.inf, -np.inf])
def test_an_infinite_number_is_refused_with_its_record(bad):
    with pytest.raises(Refusal, match="infinite in 1 of its cells; the first is record 2") as refused:
        Table.from_frame(pd.DataFrame({"x": [1.0, bad, 3.0], "y": [1, 2, 3]}))
    assert refused.value.where == "x"


def test_complex_numbers_are_refused():
    with pytest.raises(Refusal, match="complex"):
        Table.from_frame(pd.DataFrame({"x": [1j, 2j], "y": [1, 2]}))


def table(**choices):
    frame = pd.DataFrame(
        {
            "age": [20.0, 31, 45, np.nan, 52, 38],
            "town": list("abcabc"),
            "mood": ["low", "mid", "odd", "low", "mid", None],
        }
    )
    return Table.from_frame(frame, **choices)


def test_grades_stand_in_the_order_given_and_the_blank_comes_last():
    given = table(grades={"mood": ["odd", "low", "mid"]})
    assert given.columns["mood"].kind == "grade" and given.columns["mood"].levels == ("odd", "low", "mid", "blank")
    assert given.columns["mood"].codes.tolist() == [1, 2, 0, 1, 2, 3]


def test_grades_whose_order_nobody_told_say_so():
    unsure = table(kinds={"town": "grade"}).columns["town"]
    assert unsure.levels == ("a", "b", "c") and "Nothing tells the order" in unsure.warnings[0]


def test_bands_are_cut_where_the_user_says():
    age = table(bands={"age": [30, 50]}).columns["age"]
    assert age.kind == "number" and age.cuts == (30.0, 50.0)
    assert age.levels == ("under 30", "30 to under 50", "50 and over", "blank")
    assert age.codes.tolist() == [0, 1, 1, 3, 2, 1]


def test_levels_that_only_dropped_rows_hold_are_gone():
    left = table(kinds={"mood": "category"}, blanks={"mood": "drop row", "age": "drop row"})
    assert left.rows == 4 and dict(left.dropped) == {"age": 1, "mood": 1}
    assert left.columns["town"].levels == ("a", "b", "c") and left.columns["mood"].levels == ("low", "mid", "odd")
    gone = Table.from_frame(
        pd.DataFrame({"x": ["a", "b", "c", "a"], "y": [1.5, 2, np.nan, 3]}), blanks={"y": "drop row"}
    )
    assert gone.columns["x"].levels == ("a", "b")


def test_a_column_with_many_blanks_asks_what_they_mean_and_few_of_them_are_not_counted():
    assert "Under 10 are blank. Say what a blank means here." in table(kinds={"age": "number"}).columns["age"].warnings
    many = pd.DataFrame({"age": [None] * 25 + [20.0, 31] * 87 + [45.0], "town": ["a", "b"] * 100})
    assert "13% are blank. Say what a blank means here." in Table.from_frame(many).columns["age"].warnings


def test_a_choice_is_named_as_the_reason():
    chosen = table(kinds={"age": "number", "town": "left out"})
    assert (
        chosen.columns["age"].why == "You chose it. It holds numbers." and chosen.columns["town"].why == "You chose it."
    )


REFUSED = [
    ({"kinds": {"Age": "number"}}, "no column “Age”, which is named among the kinds"),
    ({"kinds": {"age": "amount"}}, "not a kind of column"),
    ({"kinds": {"age": "weight"}}, "blank in record 4"),
    ({"kinds": {"town": "weight"}}, "record 1 holds “a”"),
    ({"blanks": {"age": "fill"}}, "filled in yet"),
    ({"blanks": {"age": "zero"}}, "not a meaning of a blank"),
    ({"kinds": {"town": "number"}}, "record 1 holds “a”"),
    ({"bands": {"age": [50, 30]}}, "do not rise"),
    ({"bands": {"age": [30, 500]}}, "No record of “age” lies in the band “500 and over”"),
    ({"bands": {"age": list(range(60))}}, "at most 50"),
    ({"grades": {"mood": ["low", "mid"]}}, "leave out “odd”"),
    ({"grades": {"mood": ["low", "mid", "odd", "low"]}}, "given twice"),
    ({"grades": {"mood": ["low", "mid", "odd", "high"]}}, "has no “high”"),
]


@pytest.mark.parametrize(("choices", "says"), REFUSED)
def test_a_choice_that_the_cells_do_not_bear_is_refused(choices, says):
    with pytest.raises(Refusal, match=says) as refused:
        table(**choices)
    assert refused.value.where and refused.value.do


@pytest.mark.parametrize(
    ("frame", "says"),
    [
        (pd.DataFrame({"x": [1, 2]}), "too few columns"),
        (pd.DataFrame({"x": [1], "y": [2]}), "too few records"),
        (pd.DataFrame([[1, 2], [3, 4]], columns=["x", "x"]), "Two columns are called “x”"),
        (pd.DataFrame([[1, 2], [3, 4]]), "not a text"),
    ],
)
def test_a_frame_that_is_no_table_of_records_is_refused(frame, says):
    with pytest.raises(Refusal, match=says) as refused:
        Table.from_frame(frame)
    assert refused.value.where and refused.value.do


def test_dropping_every_row_is_refused():
    frame = pd.DataFrame({"x": ["a", None, "b"], "y": [None, "c", "d"]})
    with pytest.raises(Refusal, match="fewer than two records"):
        Table.from_frame(frame, {"x": "category", "y": "category"}, blanks={"x": "drop row", "y": "drop row"})


@pytest.mark.parametrize(
    ("column", "wanted", "says"),
    [
        ("weather", "dry", "no column “weather”"),
        ("same", "x", "is left out"),
        ("town", "d", "no level “d”"),
        ("town", (1, 2), "no level “1”"),
        ("age", ("under 20", "20 and over"), "no level “under 20”"),
        ("age", (3, 2), "holds no value"),
        ("age", {40, "none"}, "no level “none”"),
    ],
)
def test_what_cannot_be_matched_is_refused(column, wanted, says):
    frame = pd.DataFrame({"age": [20.0, 31, 45, 52.5], "town": list("abca"), "same": "x"})
    with pytest.raises(Refusal, match=says) as refused:
        Table.from_frame(frame, {"age": "number"}).matches(column, wanted)
    assert refused.value.where == column and refused.value.do


def test_coded_columns_stand_in_the_order_asked_for():
    coded = table(kinds={"age": "number"}).coded(["mood", "age"])
    assert coded.names == ("mood", "age") and coded.kinds[1] == "number"
    assert coded.codes.shape == (6, 2) and coded.codes.flags.f_contiguous and coded.codes.dtype == np.int32
    assert coded.has_blank == (True, True) and coded.weights.tolist() == [1.0] * 6
    assert coded.cuts[0] == () and len(coded.cuts[1]) == len(coded.levels[1]) - 2


ONE = pd.DataFrame({"x": ["a", "b", None, "a"], "y": [1.5, np.nan, 3.0, 2.0], "note": "same"})


def test_the_digest_is_that_of_the_cells_however_pandas_holds_them():
    digest = Table.from_frame(ONE).digest
    assert len(digest) == 64
    for other in (ONE.copy(), ONE.astype({"x": "category", "note": "category"}), ONE.astype({"x": "object"})):
        assert Table.from_frame(other).digest == digest


@pytest.mark.parametrize(
    ("column", "row", "value"), [("x", 0, "b"), ("x", 2, "a"), ("y", 1, 2.5), ("y", 0, 1.25), ("note", 0, None)]
)
def test_the_digest_changes_with_any_cell(column, row, value):
    other = ONE.copy()
    other.loc[row, column] = value
    kinds = {"x": "category", "y": "number", "note": "left out"}
    assert Table.from_frame(other, kinds).digest != Table.from_frame(ONE, kinds).digest


def test_the_digest_changes_with_the_choices_and_the_order_of_rows():
    digest = Table.from_frame(ONE, {"y": "number"}).digest
    for choices in ({"y": "left out"}, {"y": "category"}, {"x": "left out", "y": "number"}):
        assert Table.from_frame(ONE, choices).digest != digest
    assert Table.from_frame(ONE, bands={"y": [2]}).digest != digest
    assert Table.from_frame(ONE, {"y": "number"}, blanks={"y": "drop row"}).digest != digest
    assert Table.from_frame(ONE[::-1], {"y": "number"}).digest != digest


def test_more_than_fifty_levels_are_refused_however_they_are_chosen():
    frame = pd.DataFrame({"street": [f"street {n % 51}" for n in range(102)], "y": [1, 2] * 51})
    with pytest.raises(Refusal, match="“street” has 51 different values; at most 50 can be levels"):
        Table.from_frame(frame, {"street": "category"})
