"""Which links nobody settled, against every graph there is."""

from itertools import combinations, product

from hypothesis import given, settings
from hypothesis import strategies as st

from engine.network.equivalence import unsettled_links
from engine.order import Order

NAMES = "abcde"


def acyclic(links):
    left = set(NAMES)
    while left:
        free = {name for name in left if not any(target == name and source in left for source, target in links)}
        if not free:
            return False
        left -= free
    return True


def colliders(links):
    adjacent = {frozenset(link) for link in links}
    return {
        (frozenset((one, other)), target)
        for (one, target), (other, end) in combinations(links, 2)
        if target == end and frozenset((one, other)) not in adjacent
    }


def reversible(links, may_lead):
    """Links that some allowed acyclic graph with the same adjacencies and colliders has the other way round."""
    turned = set()
    same = colliders(links)
    for flips in product([False, True], repeat=len(links)):
        graph = [(t, s) if flip else (s, t) for (s, t), flip in zip(links, flips, strict=True)]
        if all(may_lead(s, t) for s, t in graph) and acyclic(graph) and colliders(graph) == same:
            turned |= {link for link, flip in zip(links, flips, strict=True) if flip}
    return frozenset(turned)


@st.composite
def graphs_in_orders(draw):
    """A graph of up to five columns, dense enough for every rule, and an order that allows it."""
    names = draw(st.permutations(NAMES))
    links = [pair for pair in combinations(names, 2) if draw(st.integers(0, 9)) < 7]
    stages: list[list[str]] = [[]]
    for name in names:
        if stages[-1] and draw(st.integers(0, 9)) < 1:
            stages.append([])
        stages[-1].append(name)
    insist = [link for link in links if draw(st.integers(0, 9)) < 1]
    back = [(target, source) for source, target in links if draw(st.integers(0, 9)) < 2]
    return links, Order(enumerate_stages(stages), insist=insist, rule_out=back)


def enumerate_stages(stages):
    return [(f"stage {place}", stage) for place, stage in enumerate(stages)]


@settings(max_examples=400, deadline=None)
@given(graphs_in_orders())
def test_a_link_is_unsettled_when_an_equivalent_allowed_graph_turns_it(case):
    links, order = case
    assert unsettled_links(links, order.may_lead) == reversible(links, order.may_lead)


def test_a_chain_is_unsettled_and_a_collider_is_settled():
    def anything(source, target):
        return True

    assert unsettled_links([("a", "b"), ("b", "c")], anything) == {("a", "b"), ("b", "c")}
    assert unsettled_links([("a", "b"), ("c", "b")], anything) == frozenset()
    assert unsettled_links([("a", "b"), ("c", "b"), ("b", "d")], anything) == frozenset()


def test_the_fourth_rule_is_needed_and_applied():
    """a - b, a - d, a - c with d -> c -> b known and b, d apart: a -> b (Meek 1995, figure of rule four)."""
    links = [("a", "b"), ("d", "a"), ("a", "c"), ("d", "c"), ("c", "b")]
    known = {("d", "c"), ("c", "b")}

    def may_lead(source, target):
        return (target, source) not in known

    left = unsettled_links(links, may_lead)
    assert ("a", "b") not in left
    assert left == reversible(links, may_lead)
    assert left == {("d", "a"), ("a", "c")}


def test_an_earlier_stage_settles_what_follows_from_it():
    order = Order([("Early", ["a"]), ("Late", ["b", "c"])])
    assert unsettled_links([("a", "b"), ("b", "c")], order.may_lead) == frozenset()
    order = Order([("All", ["a", "b", "c"])])
    assert unsettled_links([("a", "b"), ("b", "c")], order.may_lead) == {("a", "b"), ("b", "c")}
