"""Links between two columns are those on a path that meets no column twice."""

from itertools import combinations

from hypothesis import given, settings
from hypothesis import strategies as st

from engine.doubting.direction import between
from tests import plainly

NAMES = "abcdef"


@settings(max_examples=200, deadline=None)
@given(st.sets(st.sampled_from(list(combinations(NAMES, 2))), max_size=10), st.permutations(NAMES))
def test_links_between_two_columns_are_those_on_any_simple_path(links, names):
    start, end = names[:2]
    expected = {link for path in plainly.open_paths(links, start, end) for link in path}
    assert between(sorted(links), start, end) == expected
