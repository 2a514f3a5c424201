"""Results as pandas DataFrames, for notebooks: SI units, columns named as in the JSON result.

Examples
--------
>>> import partpick
>>> plan = {"band": [{"at": "7.1 MHz"}], "coil": {"measured": "4.05 uH", "self_capacitance": "1.2 pF"}}
>>> request = partpick.request_from_tables(plan, "pair")
>>> result = partpick.solve(request, partpick.load_catalogue(), top=1)
>>> partpick.frames.candidates(result)[["rank", "piece_count"]].values.tolist()
[[1, 3]]
>>> partpick.frames.bands(result)["target_hz"].tolist()
[7100000.0]
>>> partpick.frames.parts(result)["kind"].tolist()
['capacitor', 'capacitor', 'coil']

Another question is asked by other tables, of a plan file by ``load_plan(path, change={"limits.error": "0.01 %"})``.
(``dataclasses.replace`` on a request does not reach limits on Q, strays, trimmers and loads: each band has its own.)

>>> closer = partpick.request_from_tables({**plan, "limits": {"error": "0.01 %", "parts_per_band": 3}}, "pair")
>>> len(partpick.frames.candidates(partpick.solve(closer, partpick.load_catalogue(), top=1)))
1
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from partpick.report.result_json import result_entry
from partpick.result import Result

if TYPE_CHECKING:
    from pandas import DataFrame

# The columns that every frame has, also that of an empty result; further keys of a result follow them.
_CANDIDATES = (
    "rank", "on_front", "worst_error_ppm", "worst_excess", "part_count", "inductor_count", "piece_count",
    "value_count", "price", "alternatives",
)  # fmt: skip
_BANDS = (
    "rank", "name", "target_hz", "resonance_hz", "error_ppm", "inductance_h", "capacitance_f", "network_f",
    "stray_f", "self_capacitance_f", "trimmer_f", "coil", "contacts", "capacitors", "connection", "reactance_ohm",
    "q", "bandwidth_hz",
)  # fmt: skip
_PARTS = (
    "rank", "reference", "kind", "value_f", "value_h", "label", "grade", "tolerance", "tempco_per_k", "bands",
    "unit_price", "source",
)  # fmt: skip


def candidates(result: Result) -> DataFrame:
    """Return one row a candidate, in rank order; no row where nothing fits.

    Examples
    --------
    >>> from partpick.result import Proof, Result
    >>> from partpick.request import Band, Request
    >>> asked = Request(command="pair", bands=(Band(name="beacon", at=3.58e6),))
    >>> nothing = Result(request=asked, floor=1e-3, proof=Proof(status="unknown", searched=""),
    ...                  candidates=(), front=())
    >>> candidates(nothing).empty, "worst_error_ppm" in candidates(nothing)
    (True, True)
    """
    return _frame(_CANDIDATES, (_flat(entry) for entry in _entries(result, "candidates")))


def front(result: Result) -> DataFrame:
    """Return one row a step of the front: least error for each number of pieces; rank is NaN off the list."""
    return _frame(_CANDIDATES, (_flat(entry) for entry in _entries(result, "front")))


def bands(result: Result) -> DataFrame:
    """Return one row a band of each candidate, in rank and plan order; lists of names are joined by blanks."""
    return _frame(_BANDS, _of_each(result, "bands"))


def parts(result: Result) -> DataFrame:
    """Return one row a piece of each candidate: capacitors, coils, trimmers and the tuning element."""
    return _frame(_PARTS, _of_each(result, "parts"))


def _entries(result: Result, key: str) -> Sequence[Mapping[str, Any]]:
    found = result_entry(result)[key]
    assert isinstance(found, list)
    return found


def _of_each(result: Result, key: str) -> Iterable[dict[str, Any]]:
    for candidate in _entries(result, "candidates"):
        for entry in candidate[key]:
            yield {"rank": candidate["rank"], **_flat(entry)}


def _flat(entry: Mapping[str, Any]) -> dict[str, Any]:
    """Return an entry's figures; a list of names becomes one text, what is nested stays out."""
    flat = {}
    for key, value in entry.items():
        if not isinstance(value, (list, Mapping)):
            flat[key] = value
        elif isinstance(value, list) and key != "warnings" and all(isinstance(item, str) for item in value):
            flat[key] = "; ".join(value) if key == "bands" else " ".join(value)
    return flat


def _frame(columns: Sequence[str], rows: Iterable[dict[str, Any]]) -> DataFrame:
    import pandas

    every = list(rows)
    further = dict.fromkeys(key for row in every for key in row if key not in columns)
    return pandas.DataFrame(every, columns=[*columns, *further])
