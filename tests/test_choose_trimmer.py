"""Trimmers that a plan asks for without saying which: against plain enumeration, from plan to bill."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from tiny.brute_force import ranking
from tiny.brute_force_alignment import with_tolerances
from tiny.brute_force_trimmers import Piece, columns_with_trimmers, in_stock
from tiny.random_problem import random_problem, random_swept_problem

from partpick.catalogue import load_catalogue
from partpick.errors import CatalogueError, RequestError
from partpick.objective import MOST_TRIM, with_trimmer
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.report.bom import bom_csv
from partpick.report.result_json import result_json
from partpick.report.sheet import sheet
from partpick.report.table import result_table
from partpick.request import CHOOSE, Band, Request, Trimmer
from partpick.result import Result
from partpick.search.bands import search_bands
from partpick.search.columns import ColumnSource
from partpick.search.problem import NEVER, PLENTY, Problem
from partpick.search.trimmers import TrimmerSource
from partpick.solving import solve

BENCH_DRAWER = """\
name,low,high,tempco_ppm_per_k,tempco_tolerance,q,voltage,quantity,unit_price,label,source
small,2 pF,8 pF,-200,300 ppm,400,100 V,5,0.30,,invented stock
middling,4 pF,20 pF,-200,300 ppm,400,100 V,1,0.40,,invented stock
wide,6 pF,40 pF,50,50 ppm,1500,250 V,2,1.10,,invented stock
"""


# ---------------------------------------------------------------- the search


def pieces_for(seed: int, count: int) -> list[Piece]:
    """Return trimmers by rising range, by the seed alone."""
    rng = np.random.default_rng(seed + 50_000)
    lows = rng.choice([2, 4], count) * 1e-12
    spans = np.sort(rng.choice([4, 6, 10, 18, 30, 45], count, replace=False)) * 1e-12
    return [
        Piece(
            low=float(low),
            high=float(low + span),
            loss=1 / float(rng.choice([300, 1000])),
            tempco=float(rng.choice([-200e-6, 50e-6])),
            tempco_spread=float(rng.choice([0.0, 300e-6])),
            price=int(rng.choice([10, 30, NEVER], p=[0.45, 0.45, 0.1])),
            stock=int(rng.choice([1, PLENTY])),
        )
        for low, span in zip(lows, spans, strict=True)
    ]


def drawn(seed: int, bands: int, swept: int, inductors: int) -> tuple[Problem, np.ndarray, list[Piece]]:
    """Return a random problem, which of its bands choose, and what there is to choose from."""
    shape = {"bands": bands, "inductors": inductors, "coupled": seed % 2 == 0}
    plain = random_swept_problem(seed, swept=swept, **shape) if swept else random_problem(seed, **shape)
    rng = np.random.default_rng(seed + 60_000)
    pieces = pieces_for(seed, int(rng.integers(2, 5)))
    choosing = rng.random(bands) < 0.7
    choosing[0] = True
    problem = with_tolerances(plain, seed, trimmed=0.5) if seed % 3 else plain
    problem = replace(
        problem,
        error_limit=np.where(choosing, np.inf, np.minimum(problem.error_limit, 0.1)),
        aligned=choosing if seed % 2 else np.ones(bands, dtype=np.bool_),
        trim_share=np.where(choosing, MOST_TRIM, np.inf),
        trimmer_stock=np.array([piece.stock for piece in pieces]),
        most_parts=min(problem.most_parts, 2 if bands == 1 else 1),
    )
    return problem, choosing, pieces


def searched(problem: Problem, choosing: np.ndarray, pieces: list[Piece]) -> Any:
    """Run the search with every trimmer."""
    bands = tuple(Band(name=str(b), at=1e6, trimmer=CHOOSE if own else None) for b, own in enumerate(choosing))
    request = Request(command="bands", bands=bands)
    problems = [
        with_trimmer(
            request,
            problem,
            Trimmer(
                low=p.low, high=p.high, q=1 / p.loss, tempco=p.tempco, tempco_tolerance=p.tempco_spread, name=str(n)
            ),
            others=n == 0,
        )
        for n, p in enumerate(pieces)
    ]
    price = np.array([piece.price for piece in pieces])
    source = TrimmerSource([ColumnSource(each) for each in problems], choosing, price)
    return search_bands(problems[0], source, wanted=50, all_windings=False, monitor=Quiet())


WAYS = {"one band": (1, 0, 1), "two bands": (2, 0, 1), "two coils": (2, 0, 2), "swept": (1, 1, 1), "mixed": (2, 1, 2)}


def equal_to_a_trial_of_every_trimmer(way: str, seeds: Iterable[int]) -> int:
    """Compare the search with plain enumeration; return how many of the problems had an answer."""
    bands, swept, inductors = WAYS[way]
    answered = 0
    for seed in seeds:
        problem, choosing, pieces = drawn(seed, bands, swept, inductors)
        found = searched(problem, choosing, pieces)
        make = columns_with_trimmers(choosing, pieces, MOST_TRIM)
        wanted, front = ranking(problem, make, lambda columns, own=pieces: in_stock(own, columns))
        assert [choice.key for choice in found.choices] == wanted, f"{way}, seed {seed}"
        shown = [sum(int(c.pieces[0]) for c in choice.columns) + len(choice.coils) for choice in found.front]
        assert shown == [count for count, _ in front], f"{way}, seed {seed}"
        answered += bool(wanted)
    return answered


@pytest.mark.parametrize("way", WAYS)
def test_the_trimmers_equal_a_trial_of_every_one(way: str) -> None:
    """Each band for itself, stock and price counted, aligned or not."""
    assert equal_to_a_trial_of_every_trimmer(way, range(24)) > 0


@pytest.mark.slow
@pytest.mark.parametrize("way", WAYS)
def test_the_trimmers_equal_a_trial_of_every_one_at_length(way: str) -> None:
    """The same over many problems."""
    assert equal_to_a_trial_of_every_trimmer(way, range(100, 400)) > 15


# ---------------------------------------------------------------- from plan to bill


def drawer_with(tmp_path: Path, text: str = BENCH_DRAWER) -> Path:
    (tmp_path / "trimmers.csv").write_text(text, encoding="utf-8")
    return tmp_path


def planned(tmp_path: Path, **changes: Any) -> Result:
    tables: dict[str, Any] = {
        "trimmer": "choose",
        "coil": {"measured": "2 \u00b5H", "self_capacitance": "1 pF"},
        "capacitors": {"grades": ["mica"]},
        "band": [{"name": "coast", "at": "5.2 MHz"}, {"name": "sea", "at": "7.1 MHz"}],
        **changes,
    }
    return solve(request_from_tables(tables, "bands"), load_catalogue(drawer_with(tmp_path)), top=2)


def trimmers_of(result: Result) -> list[Any]:
    return [part for part in result.candidates[0].parts if part.kind == "trimmer"]


def test_a_chosen_trimmer_is_on_table_bill_json_and_sheet(tmp_path: Path) -> None:
    """Under its own kind, with its price and source; it is no piece."""
    result = planned(tmp_path)
    candidate, (first, *_) = result.candidates[0], trimmers_of(result)
    assert candidate.piece_count == candidate.part_count + candidate.inductor_count
    assert first.unit_price in (0.30, 0.40, 1.10) and first.source == "invented stock"
    assert first.description in ("small", "middling", "wide")
    told = json.loads(result_json(result))
    assert told["request"]["trimmer"] == {"choose": True, "alignable": 0.99}
    assert [part["kind"] for part in told["candidates"][0]["parts"]].count("trimmer") == 2
    bill = csv.DictReader(io.StringIO(bom_csv(result)))
    rows = [row for row in bill if row["kind"] == "trimmer" and row["rank"] == "1"]
    assert sum(int(row["quantity"]) for row in rows) == 2
    assert all(row["unit_price"] and row["description"] for row in rows)
    assert first.description in result_table(result) and first.description in sheet(result)


def test_the_chosen_trimmers_align_as_many_builds_as_wanted(tmp_path: Path) -> None:
    """Without a limit 99 of 100, at least nearly so: the search takes the normal law; with one, that many."""
    for limits, least in (({}, 0.96), ({"alignable": "worst case"}, 0.9999)):
        result = planned(tmp_path, limits=limits)
        figures = result.candidates[0].extra["alignment"]
        assert isinstance(figures, dict) and figures["share_over_full_travel"] >= least


def test_no_more_trimmers_are_taken_than_there_are(tmp_path: Path) -> None:
    """One is middling, two are wide: for two units none is middling and one of the two bands is wide."""
    taken = [part.description for part in trimmers_of(planned(tmp_path))]
    assert taken.count("middling") <= 1 and taken.count("wide") <= 2
    two = planned(tmp_path, units=2)
    assert not two.candidates or [part.description for part in trimmers_of(two)].count("wide") < 2
    one = planned(tmp_path, units=2, band=[{"name": "coast", "at": "5.2 MHz"}])
    assert {part.description for part in trimmers_of(one)} <= {"small", "wide"}


def test_a_price_limit_counts_the_trimmer(tmp_path: Path) -> None:
    """Capacitors and coil cost nothing that is known, so the plan's price is unknown; with prices it counts."""
    (tmp_path / "capacitors.csv").write_text(
        "value,series,from,to,grade,tolerance,tempco_ppm_per_k,q,unit_price\n,E12,10 pF,1 nF,mica,1 %,35,1500,0.20\n",
        encoding="utf-8",
    )
    result = planned(tmp_path)
    dear = result.candidates[0]
    assert dear.price == pytest.approx(sum(part.unit_price or 0.0 for part in dear.parts))
    cheap = planned(tmp_path, limits={"price": 1.0})
    assert not cheap.candidates or (cheap.candidates[0].price or 9.0) <= 1.0


@pytest.mark.parametrize("stated", ["choose", {}, "Choose"])
def test_each_way_to_ask_means_the_same(stated: object) -> None:
    """In the plan or in a band."""
    tables = {"band": [{"name": "coast", "at": "5.2 MHz", "trimmer": stated}]}
    assert request_from_tables(tables, "bands").bands[0].trimmer == CHOOSE


@pytest.mark.parametrize(
    ("tables", "said"),
    [
        ({"trimmer": "any"}, "choose"),
        ({"trimmer": {"low": "3 pF"}}, "trimmer.high: is missing"),
        ({"trimmer": {"tempco": "50 ppm"}}, "trimmer.tempco: goes with low and high"),
    ],
)
def test_half_a_trimmer_is_refused(tables: dict[str, object], said: str) -> None:
    """Which key, and what would be accepted."""
    with pytest.raises(RequestError, match=said):
        request_from_tables({**tables, "band": [{"name": "coast", "at": "5.2 MHz"}]}, "bands")


@pytest.mark.parametrize(
    ("row", "column"),
    [
        ("tiny,8 pF,2 pF,,,,,,,,", "high"),
        ("tiny,2 pF,8 pF,,,-5,,,,,", "q"),
        ("tiny,,8 pF,,,,,,,,", "low"),
        ("small,2 pF,8 pF,,,,,,,,", "name"),
    ],
)
def test_a_bad_row_names_file_row_and_column(tmp_path: Path, row: str, column: str) -> None:
    """As in every file of a drawer."""
    with pytest.raises(CatalogueError, match=rf"trimmers\.csv.*row 5.*{column}"):
        load_catalogue(drawer_with(tmp_path, BENCH_DRAWER + row + "\n"))


def test_a_file_without_trimmers_in_stock_is_told(tmp_path: Path) -> None:
    """An empty drawer is the user's doing, so it is an error, not a plan that does not fit."""
    only = BENCH_DRAWER.splitlines()[0] + "\nnone left,2 pF,8 pF,,,,,0,,,\n"
    request = request_from_tables({"trimmer": "choose", "band": [{"name": "coast", "at": "5.2 MHz"}]}, "bands")
    with pytest.raises(RequestError, match=r"trimmers\.csv has none"):
        solve(request, load_catalogue(drawer_with(tmp_path, only)))


def test_a_receiver_says_that_it_does_not_choose() -> None:
    """By name, with what would be accepted."""
    tables = {
        "trimmer": "choose",
        "receiver": {"intermediate": "455 kHz"},
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "365 pF", "sections": 2},
        "band": [{"name": "medium wave", "from": "530 kHz", "to": "1.6 MHz"}],
    }
    with pytest.raises(RequestError, match="state low and high"):
        solve(request_from_tables(tables, "bands"), load_catalogue(None))


def test_an_element_that_moves_inductance_says_that_no_trimmer_is_chosen() -> None:
    """What its tolerance does to both ends is not known to the search."""
    tables = {
        "trimmer": "choose",
        "tuning": {
            "kind": "sliding core", "diameter": "6 mm", "length": "15 mm", "permeability": 20, "travel": "15 mm",
        },
        "band": [{"name": "coast", "from": "3.5 MHz", "to": "3.8 MHz"}],
    }  # fmt: skip
    with pytest.raises(RequestError, match="state low and high"):
        request_from_tables(tables, "bands")


def test_a_layout_of_shared_capacitors_says_that_it_does_not_choose() -> None:
    """By name, with what would be accepted."""
    tables = {
        "trimmer": "choose",
        "switching": "stacked",
        "band": [{"name": "coast", "at": "5.2 MHz"}, {"name": "sea", "at": "7.1 MHz"}],
    }
    with pytest.raises(RequestError, match="state low and high"):
        solve(request_from_tables(tables, "bands"), load_catalogue(None))
