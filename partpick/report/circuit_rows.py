"""Rows of a coil's circuit: what stands across it, behind which contact, at which bands.

Where each band has its own capacitors a row is a band. In a stack or a shared set the same capacitors serve
several bands, so there a row is a contact with what it adds.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from partpick.connection import Connection, Parallel, Part, parse_connection, references_of
from partpick.quantities import format_quantity
from partpick.report.text import cut
from partpick.result import BandFigures, Candidate

LONGEST_NAME = 34
MOST_NAMES = 3  # of bands over one row


@dataclass(frozen=True)
class Row:
    """One row of the drawing; without contacts it is wired in, without a tree there is nothing in it."""

    title: str
    contacts: tuple[str, ...]
    tree: Connection | None


def rows_of(candidate: Candidate, reference: str) -> list[Row]:
    """Return the rows of a coil's circuit, from the hot end of the coil on."""
    bands = [band for band in candidate.bands if band.coil == reference]
    if shares_capacitors(candidate) and len(bands) > 1:
        return _by_contact(candidate, bands)
    return [Row(_name(band), band.contacts, _across(band, candidate)) for band in bands]


def shares_capacitors(candidate: Candidate) -> bool:
    """Return whether one capacitor serves several bands: a stack or a shared set behind a switch."""
    switch = candidate.extra.get("switch")
    return isinstance(switch, Mapping) and switch["kind"] != "single pole"


# ---------------------------------------------------------------- one row a band


def _name(band: BandFigures) -> str:
    tap = "" if band.tap_turns is None else f", from tap at turn {band.tap_turns}"
    target = "" if band.target is None else f" {format_quantity(band.target, 'Hz', 6)}"
    name = "" if target.strip() == band.name else cut(band.name, LONGEST_NAME)
    return f"{name}{target}{tap}".strip()


def _across(band: BandFigures, candidate: Candidate) -> Connection | None:
    """Return all that the band puts across the coil: its capacitors and its trimmer."""
    branches = [*_branches(parse_connection(band.connection)), *_trimmers(band, candidate)]
    return _together(branches)


def _trimmers(band: BandFigures, candidate: Candidate) -> list[Connection]:
    trimmers = [part for part in candidate.parts if part.kind == "trimmer" and band.name in part.bands]
    return [Part(trimmers[0].reference)] if trimmers and band.trimmer is not None else []


def _branches(tree: Connection | None) -> tuple[Connection, ...]:
    return tree.branches if isinstance(tree, Parallel) else (tree,) if tree else ()


def _together(branches: Sequence[Connection]) -> Connection | None:
    if len(branches) < 2:
        return branches[0] if branches else None
    return Parallel(tuple(branches))


# ---------------------------------------------------------------- one row a contact


def _by_contact(candidate: Candidate, bands: Sequence[BandFigures]) -> list[Row]:
    """Return what is wired in, then each contact with what it adds, then the trimmers."""
    served: dict[Connection, list[BandFigures]] = {}
    for band in bands:
        for branch in (*_branches(parse_connection(band.connection)), *_trimmers(band, candidate)):
            served.setdefault(branch, []).append(band)
    alike: dict[tuple[str, ...], list[Connection]] = {}
    for branch, at in served.items():
        alike.setdefault((_pole(branch), *(band.name for band in at)), []).append(branch)
    taps = {band.name: f" from tap {band.tap_turns}" for band in bands if band.tap_turns is not None}
    rows = []
    for (pole, *names), branches in alike.items():
        contacts = _contacts(candidate, pole, names)
        each: list[tuple[tuple[str, ...], Connection]]
        if len(contacts) == len(branches) and pole == "capacitors":  # each capacitor of a set has its own
            each = [((contact,), branch) for contact, branch in zip(contacts, branches, strict=True)]
        else:
            together = _together(branches)
            each = [] if together is None else [(tuple(contacts), together)]
        rows += [Row(_title(names, len(bands), taps), own, tree) for own, tree in each]
    order = {"capacitors": 0, "tuning element": 1, "trimmers": 2}
    rows.sort(key=lambda row: (bool(row.contacts), order[_pole(row.tree)]))
    return rows + [Row(_name(band), (), None) for band in bands if _across(band, candidate) is None]


def _pole(tree: Connection | None) -> str:
    inside = list(references_of(tree))
    if "T" in inside:
        return "tuning element"
    return "trimmers" if inside and all(reference.startswith("CT") for reference in inside) else "capacitors"


def _contacts(candidate: Candidate, pole: str, names: Sequence[str]) -> list[str]:
    """Return the contacts of a pole that close at just these bands, or at parts of them."""
    switch: Any = candidate.extra["switch"]
    of_pole = [(str(each["contact"]), set(each["bands"])) for each in switch["closes"] if each["pole"] == pole]
    exact = [contact for contact, at in of_pole if at == set(names)]
    if exact or pole == "capacitors":  # what no contact adds is wired in
        return exact
    return [contact for contact, at in of_pole if at <= set(names)]


def _title(names: Sequence[str], count: int, taps: Mapping[str, str]) -> str:
    if len(names) == count and not taps:
        return "every band"
    if taps:  # each is told, however many: from where is what matters
        return ", ".join(f"{cut(name, LONGEST_NAME // 2)}{taps.get(name, '')}" for name in names)
    if len(names) > MOST_NAMES:
        return f"{cut(names[0], LONGEST_NAME // 2)} to {cut(names[-1], LONGEST_NAME // 2)}, {len(names)} bands"
    room = LONGEST_NAME // len(names)
    return ", ".join(cut(name, room) for name in names)
