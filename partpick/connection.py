"""A connection such as "C1 | (C2 + C3)" as a tree: `|` in parallel, `+` in series, brackets bind first."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from partpick.errors import InternalError

_TOKENS = re.compile(r"\s*([A-Za-z]+[0-9]*|[()|+])")


@dataclass(frozen=True)
class Part:
    """One part by its reference."""

    reference: str


@dataclass(frozen=True)
class Parallel:
    """Branches side by side."""

    branches: tuple[Connection, ...]


@dataclass(frozen=True)
class Series:
    """Branches one after the other."""

    branches: tuple[Connection, ...]


Connection = Part | Parallel | Series


def parse_connection(text: str) -> Connection | None:
    """Return the tree of a connection; None where there is no part.

    Raises
    ------
    InternalError
        The text is no connection.
    """
    tokens = [found[1] for found in _TOKENS.finditer(text)]
    if "".join(tokens) != "".join(text.split()):
        raise InternalError(f"internal error: {text!r} is no connection")
    if not tokens:
        return None
    tree, rest = _parallel(tokens)
    if rest:
        raise InternalError(f"internal error: {text!r} is no connection")
    return tree


def references_of(tree: Connection | None) -> Iterator[str]:
    """Return the references of all parts, from left to right."""
    if isinstance(tree, Part):
        yield tree.reference
    elif tree is not None:
        for branch in tree.branches:
            yield from references_of(branch)


def without(tree: Connection, reference: str) -> tuple[Connection | None, Connection | None]:
    """Return a parallel connection in two: the branch that holds a part, and all the others; None where empty."""
    branches = tree.branches if isinstance(tree, Parallel) else (tree,)
    holds = [branch for branch in branches if reference in references_of(branch)]
    others = [branch for branch in branches if branch not in holds]
    return _joined(holds), _joined(others)


def _joined(branches: list[Connection]) -> Connection | None:
    if not branches:
        return None
    return branches[0] if len(branches) == 1 else Parallel(tuple(branches))


def _parallel(tokens: list[str]) -> tuple[Connection, list[str]]:
    first, rest = _series(tokens)
    branches = [first]
    while rest and rest[0] == "|":
        branch, rest = _series(rest[1:])
        branches.append(branch)
    return (branches[0] if len(branches) == 1 else Parallel(tuple(branches))), rest


def _series(tokens: list[str]) -> tuple[Connection, list[str]]:
    first, rest = _leaf(tokens)
    branches = [first]
    while rest and rest[0] == "+":
        branch, rest = _leaf(rest[1:])
        branches.append(branch)
    return (branches[0] if len(branches) == 1 else Series(tuple(branches))), rest


def _leaf(tokens: list[str]) -> tuple[Connection, list[str]]:
    if tokens and tokens[0] == "(":
        inner, rest = _parallel(tokens[1:])
        if not rest or rest[0] != ")":
            raise InternalError("internal error: a bracket of a connection is left open")
        return inner, rest[1:]
    if not tokens or tokens[0] in ")|+":
        raise InternalError("internal error: a part is missing from a connection")
    return Part(tokens[0]), tokens[1:]
