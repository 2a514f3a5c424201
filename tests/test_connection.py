"""Connections as trees: what is drawn and simulated is what was picked."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.connection import Connection, Parallel, Part, Series, parse_connection, references_of, without
from partpick.errors import InternalError

names = st.from_regex(r"(C|T|CT|L)[0-9]{0,3}", fullmatch=True)
trees: st.SearchStrategy[Connection] = st.recursive(
    names.map(Part),
    lambda inner: st.one_of(
        st.lists(inner, min_size=2, max_size=3).map(lambda branches: Parallel(tuple(branches))),
        st.lists(inner, min_size=2, max_size=3).map(lambda branches: Series(tuple(branches))),
    ),
    max_leaves=6,
)


def written(tree: Connection) -> str:
    """Return a tree as text, every branch in brackets of its own."""
    if isinstance(tree, Part):
        return tree.reference
    sign = " | " if isinstance(tree, Parallel) else " + "
    return sign.join(f"({written(branch)})" for branch in tree.branches)


@given(trees)
def test_a_tree_survives_being_written_and_read(tree: Connection) -> None:
    """A misread bracket would put another capacitance into drawing and deck."""
    assert parse_connection(written(tree)) == tree


def test_brackets_bind_before_series_and_series_before_parallel() -> None:
    """The three mixed forms of the contract."""
    c1, c2, c3, tuning = (Part(name) for name in ("C1", "C2", "C3", "T"))
    assert parse_connection("C1 | (C2 + C3)") == Parallel((c1, Series((c2, c3))))
    assert parse_connection("C1 + (C2 | C3)") == Series((c1, Parallel((c2, c3))))
    assert parse_connection("(T + C3) | C1") == Parallel((Series((tuning, c3)), c1))
    assert parse_connection("") is None


def test_the_tuning_branch_is_told_from_the_rest() -> None:
    """Leads and switch are in series with the padders across the coil, not with the tuning element."""
    tree = parse_connection("(T + C3) | C1 | C2")
    assert tree is not None
    tuning, across = without(tree, "T")
    assert list(references_of(tuning)) == ["T", "C3"] and list(references_of(across)) == ["C1", "C2"]


@pytest.mark.parametrize("text", ["C1 |", "| C1", "(C1", "C1)", "C1 C2", "C1 & C2", "()"])
def test_what_is_no_connection_is_an_internal_error(text: str) -> None:
    """A connection is our own text; a wrong one must not be drawn as something else."""
    with pytest.raises(InternalError):
        parse_connection(text)
