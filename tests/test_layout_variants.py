"""Stacks and shared sets on sections, on several coils and swept, against plain enumeration."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest
from tiny.brute_force_layouts import ranking, shared_plans, stacked_plans
from tiny.random_layout import random_layout, random_swept_layout
from tiny.random_sections import random_sections, tapped_source

from partpick.progress import Quiet
from partpick.search.bands import Found, leading_figure
from partpick.search.choose import ORDERS
from partpick.search.problem import PLENTY, Problem
from partpick.search.shared import search_shared
from partpick.search.stacked import search_stacked
from partpick.search.taps import Sections

PLANS = {"stacked": stacked_plans, "shared": shared_plans}
SEARCHES = {"stacked": search_stacked, "shared": search_shared}
PIECES = ORDERS["error"].index("pieces")  # the front is ordered by error


@dataclass(frozen=True)
class Kind:
    """What one family of tiny problems allows."""

    layout: str
    coils: int = 1
    taps: bool = False
    swept: bool = False

    def __str__(self) -> str:
        words = [self.layout, f"{self.coils} coils" if self.coils > 1 else "", "taps" if self.taps else ""]
        return " ".join(word for word in [*words, "swept" if self.swept else ""] if word)

    def problem(self, seed: int) -> tuple[Problem, Sections | None]:
        """Return a problem, and sections where bands may use a tap, by the seed alone."""
        rng = np.random.default_rng(seed + 77)
        coupled, bands = bool(rng.random() < 0.5), int(rng.integers(2, 4))
        bands = max(bands, self.coils)
        if self.swept:
            swept = int(rng.integers(1, bands + 1))
            problem = random_swept_layout(seed, bands=bands, swept=swept, inductors=self.coils, coupled=coupled)
        else:
            plain = random_layout(seed, bands=bands, shared=self.layout == "shared", coupled=coupled)
            problem = replace(plain, inductors=self.coils)
        return problem, random_sections(problem, seed) if self.taps else None


KINDS = [
    Kind("stacked", taps=True),
    Kind("stacked", coils=2),
    Kind("stacked", coils=2, taps=True),
    Kind("stacked", coils=3),
    Kind("stacked", swept=True),
    Kind("stacked", swept=True, taps=True),
    Kind("stacked", swept=True, coils=2),
    Kind("stacked", swept=True, coils=2, taps=True),
    Kind("shared", taps=True),
    Kind("shared", coils=2),
    Kind("shared", coils=2, taps=True),
    Kind("shared", coils=3),
]


def found_in(kind: Kind, problem: Problem, sections: Sections | None) -> Found:
    source = None if sections is None else tapped_source(problem, sections)
    found = SEARCHES[kind.layout](problem, source, wanted=100, all_windings=False, monitor=Quiet())
    assert found.stopped_by is None
    return found


def agree(kind: Kind, seed: int) -> Found:
    problem, sections = kind.problem(seed)
    wanted, front = ranking(problem, PLANS[kind.layout], sections)
    found = found_in(kind, problem, sections)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(choice.key[PIECES], leading_figure(problem, choice)) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [lead for _, lead in got] == pytest.approx([lead for _, lead in front], abs=2e-12)
    return found


def used(kind: Kind, found: Found) -> bool:
    """Whether some plan makes use of all that its kind allows."""
    for choice in found.choices:
        taps = any(int(columns.tap[0]) for columns in choice.columns)
        if (taps or not kind.taps) and (len(choice.coils) > 1 or kind.coils == 1):
            return True
    return False


@pytest.mark.parametrize("kind", KINDS, ids=str)
def test_every_rank_and_the_front_equal_plain_enumeration(kind: Kind) -> None:
    """A section, a coil or a padder left out or misplaced would be a false "optimal"."""
    seeds = range(2 if kind.layout == "shared" else 24 if kind.swept and kind.coils == 1 else 4)
    made_use = sum(used(kind, agree(kind, seed)) for seed in seeds)
    assert made_use > 0, "the sample must hold plans that use what their kind allows"


@pytest.mark.slow
@pytest.mark.parametrize("kind", KINDS, ids=str)
def test_every_rank_and_the_front_equal_plain_enumeration_at_length(kind: Kind) -> None:
    """The same over more instances than the default suite has time for."""
    seeds = range(1000, 1060 if kind.layout == "shared" or kind.taps else 1150)
    made_use = sum(used(kind, agree(kind, seed)) for seed in seeds)
    assert made_use > 5


@pytest.mark.parametrize("kind", [KINDS[2], KINDS[4], KINDS[9]], ids=str)
def test_one_coil_or_section_more_never_makes_the_first_plan_worse(kind: Kind) -> None:
    """Every plan without them is a plan with them allowed; more in stock likewise."""
    compared = 0
    for seed in range(4 if kind.layout == "shared" else 18):
        problem, sections = kind.problem(seed)
        richer = replace(problem, part_stock=problem.part_stock * 0 + PLENTY)
        first = found_in(kind, problem, sections).choices
        fewer = found_in(kind, replace(problem, inductors=1), None).choices
        more = found_in(kind, richer, sections).choices
        if fewer:
            assert first and first[0].key[:-1] <= fewer[0].key[:-1]
        if first:
            assert more and more[0].key[:-1] <= first[0].key[:-1]
            compared += 1
    assert compared > 1


@pytest.mark.parametrize("kind", [KINDS[3], KINDS[7], KINDS[11]], ids=str)
def test_a_time_limit_is_never_reported_as_nothing_fits(kind: Kind) -> None:
    """An empty answer without `stopped_by` says that no plan exists."""
    problem, sections = kind.problem(3)
    source = None if sections is None else tapped_source(problem, sections)
    monitor = Quiet(time_limit=0.0)
    found = SEARCHES[kind.layout](problem, source, wanted=1, all_windings=False, monitor=monitor)
    assert found.stopped_by == "time limit" and not found.settled


def test_a_stack_with_a_series_padder_counts_it_and_keeps_it_to_its_band() -> None:
    """The padder is in series with the tuning element at its own band alone; what is across the coil stays."""
    padders = 0
    kind = Kind("stacked", swept=True)
    for seed in range(30):
        problem, _ = kind.problem(seed)
        for choice in found_in(kind, problem, None).choices:
            own = [padder for columns in choice.columns if (padder := columns.series_padder(0)) is not None]
            pieces = sum(len(added) for added in choice.added) + len(own) + len(choice.coils)  # type: ignore[attr-defined]
            assert choice.key[ORDERS[problem.by].index("pieces")] == pieces
            padders += len(own)
    assert padders > 0


def test_too_many_coils_to_share_the_bands_are_never_called_complete(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where chains are left out the search says so, unless what it shows ranks before all of them."""
    monkeypatch.setattr("partpick.search.chains.MOST_CHAINS", 2)
    monkeypatch.setattr("partpick.search.set_rows.MOST_ROWS", 4)
    honest = owned_up = 0
    for layout in ("stacked", "shared"):
        kind = Kind(layout, coils=2)
        for seed in range(6):
            problem, _ = kind.problem(seed)
            search = SEARCHES[layout]
            found = search(problem, wanted=3, all_windings=False, monitor=Quiet(), front=False)
            best, _ = ranking(problem, PLANS[layout])
            if found.stopped_by is None:
                assert [choice.key for choice in found.choices] == best[:3]
                honest += bool(best)
            else:
                assert found.stopped_by == "work limit" and not found.settled
                owned_up += 1
    assert honest and owned_up
