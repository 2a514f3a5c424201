"""A ladder of relays in words: what is always in circuit, which relays each position closes, what tolerances do."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from partpick.quantities import format_quantity
from partpick.report import html
from partpick.report.text import columns, plural, quantity, signed_shift, wrapped
from partpick.result import Candidate

HEAD = ("step", "wanted", "reached", "off by", "relays closed")


def ladder_of(candidate: Candidate) -> Mapping[str, Any] | None:
    """Return the JSON key `ladder` of a candidate, None where it is none."""
    ladder = candidate.extra.get("ladder")
    return ladder if isinstance(ladder, Mapping) else None


def ladder_lines(candidate: Candidate) -> list[str]:
    """Return a ladder as lines of the table; empty where the candidate is none."""
    if ladder_of(candidate) is None:
        return []
    lines = [line for said in ladder_in_words(candidate) for line in wrapped(said, 2, 2)]
    for line in columns([list(HEAD), *ladder_rows(candidate)], (4,)):
        lines += wrapped(line, 2, 2) if len(line) > 78 else [f"  {line}".rstrip()]
    return lines


def ladder_rows(candidate: Candidate) -> list[list[str]]:
    """Return one row a position: number, wanted and reached frequency, by how much it is off, relays closed."""
    steps = candidate.extra["steps"]
    assert isinstance(steps, list)
    return [
        [
            str(step["position"]),
            quantity(step["target_hz"], "Hz", 6),
            quantity(step["frequency_hz"], "Hz", 6),
            signed_shift(step["off_hz"]),
            " ".join(step["closed"]) or "none",
        ]
        for step in steps
    ]


def ladder_in_words(candidate: Candidate) -> list[str]:
    """Return what a ladder is and what it is worth, in sentences."""
    ladder = ladder_of(candidate)
    assert ladder is not None
    labels = {part.reference: part.label for part in candidate.parts}
    fixed = ", ".join(f"{reference} {labels[reference]}" for reference in ladder["always_in_circuit"]) or "nothing"
    relays = ", ".join(f"{each['contact'] or 'wired'} {labels[each['capacitor']]}" for each in ladder["relays"])
    count = len(candidate.bands) - 1
    said = [
        f"{plural(count, 'step')} of {format_quantity(ladder['step_hz'], 'Hz', 4)} with "
        f"{plural(len(ladder['relays']), 'relay')}; the largest gap between neighbours is "
        f"{format_quantity(ladder['largest_gap_hz'], 'Hz', 4)}.",
        f"Always in circuit: {fixed}. Each relay adds its capacitor: {relays or 'none'}.",
        f"All open: {quantity(ladder['open_hz'], 'Hz', 5)}; all closed: {quantity(ladder['all_closed_hz'], 'Hz', 5)}.",
    ]
    return said + _tolerance(ladder, labels)


def _tolerance(ladder: Mapping[str, Any], labels: Mapping[str, str]) -> list[str]:
    drowned = ladder["drowned"]
    if not drowned:
        return ["Whatever the parts are within tolerance, no change of relays is off by more than a step."]
    told = "; ".join(
        f"{labels[each['capacitor']]} by {format_quantity(each['moves_hz'], 'Hz', 2)}" for each in drowned
    )
    return [
        f"Where these take over from the smaller ones, tolerances add up to more than a step: {told}. As built, "
        "steps may leave gaps or change places there. Measure and match these values, or take closer ones; smaller "
        "capacitors and more relays gain nothing before that."
    ]


def ladder_section(candidate: Candidate) -> str:
    """Return the relay table of a build sheet, empty where the candidate is no ladder."""
    if ladder_of(candidate) is None:
        return ""
    said = "".join(html.paragraph(text) for text in ladder_in_words(candidate))
    return said + html.table([word.capitalize() for word in HEAD], ladder_rows(candidate), figures=(0, 1, 2, 3))
