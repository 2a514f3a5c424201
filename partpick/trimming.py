"""Trimmers that a plan asks for without saying which: those in stock, and the request with the ones chosen."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.errors import RequestError
from partpick.objective import with_trimmer
from partpick.parts import Catalogue, TrimmerPart
from partpick.request import Request, Trimmer
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.problem import NEVER, PLENTY, Problem
from partpick.search.trimmers import TrimmerSource


def trimmers_on_offer(request: Request, catalogue: Catalogue) -> tuple[Trimmer, ...]:
    """Return the trimmers to choose from, by rising range; none where no band asks.

    Raises
    ------
    RequestError
        A band asks, and none is in stock or the layout does not plan it.
    """
    if not any(band.trimmer is not None and band.trimmer.to_choose for band in request.bands):
        return ()
    if request.switching != "separate":
        raise RequestError(
            f'trimmer: to choose one is planned only with switching = "separate", not "{request.switching}"; '
            "state low and high"
        )
    if "receiver" in dict(request.extra):
        raise RequestError("trimmer: to choose one is not planned for the circuits of a receiver; state low and high")
    parts = [part for part in catalogue.trimmers if part.quantity is None or part.quantity >= request.units]
    if not parts:
        raise RequestError(f"trimmer: one is to be chosen, but trimmers.csv has none for {request.units} built")
    return tuple(sorted((_trimmer(part) for part in parts), key=_place))


def _trimmer(part: TrimmerPart) -> Trimmer:
    return Trimmer(
        low=part.low,
        high=part.high,
        tempco=part.tempco,
        tempco_tolerance=part.tempco_tolerance,
        q=part.q,
        name=part.name,
        unit_price=part.unit_price,
        quantity=part.quantity,
        voltage=part.voltage,
        source=part.source,
        notes=part.notes,
    )


def _place(trimmer: Trimmer) -> tuple[float, float, str]:
    price = float("inf") if trimmer.unit_price is None else trimmer.unit_price
    return round((trimmer.high - trimmer.low) * 1e18), price, trimmer.name or ""


def problem_with_trimmers(
    request: Request, problem: Problem, source: ColumnSource, trimmers: tuple[Trimmer, ...]
) -> tuple[Problem, ColumnSource]:
    """Return problem and columns with every trimmer on offer; as they are where none is to be chosen."""
    if not trimmers:
        return problem, source
    stock = [PLENTY if t.quantity is None else t.quantity // request.units for t in trimmers]
    price = [NEVER if t.unit_price is None else round(t.unit_price * 100) for t in trimmers]
    problem = replace(problem, trimmer_stock=np.array(stock, dtype=np.int64))
    problems = [
        with_trimmer(request, problem, trimmer, others=place == 0) for place, trimmer in enumerate(trimmers)
    ]
    choosing = np.array([band.trimmer is not None and band.trimmer.to_choose for band in request.bands])
    sources = [source.with_problem(each) for each in problems]
    return problems[0], TrimmerSource(sources, choosing, np.array(price, dtype=np.int64))


def with_chosen(request: Request, trimmers: tuple[Trimmer, ...], choice: Choice) -> Request:
    """Return the request with the trimmers that a choice took."""
    if not trimmers:
        return request
    bands = tuple(
        band if columns.trimmer[0] < 0 else replace(band, trimmer=trimmers[int(columns.trimmer[0])])
        for band, columns in zip(request.bands, choice.columns, strict=True)
    )
    return replace(request, bands=bands)
