"""A tiny invented drawer and a way to run the command line, for tests that look from outside."""

from __future__ import annotations

import contextlib
import csv
import io
import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from partpick.cli import main

Row = Mapping[str, object]

CAPACITORS = (
    {"value": "47 pF", "grade": "C0G", "tolerance": "5 %", "tempco_ppm_per_k": 0, "tempco_tolerance": "30 ppm",
     "q": 1000, "unit_price": "0.10"},
    {"value": "100 pF", "grade": "C0G", "tolerance": "5 %", "tempco_ppm_per_k": 0, "tempco_tolerance": "30 ppm",
     "q": 1000, "unit_price": "0.12"},
    {"value": "220 pF", "grade": "N150", "tolerance": "5 %", "tempco_ppm_per_k": -150,
     "tempco_tolerance": "30 ppm", "q": 700, "unit_price": "0.15"},
)  # fmt: skip
INDUCTORS = (
    {"value": "1 µH", "tolerance": "5 %", "tempco_ppm_per_k": 100, "q": 60, "self_capacitance": "1 pF",
     "unit_price": "1.00", "label": "choke A"},
    {"value": "4.7 µH", "tolerance": "5 %", "tempco_ppm_per_k": 100, "q": 80, "self_capacitance": "2 pF",
     "unit_price": "1.50", "label": "choke B"},
)  # fmt: skip
FORMERS = (
    {"name": "tube A", "support": "tube", "diameter": "20 mm", "winding_length": "25 mm", "tolerance": "1 %",
     "tempco_ppm_per_k": 50, "tempco_tolerance": "20 ppm", "unit_price": "0.80"},
)  # fmt: skip
WIRES = ({"name": "wire A", "bare_diameter": "1 mm", "overall_diameter": "1.07 mm", "price_per_m": "0.05"},)
NO_CORES = "name,shape,outer_diameter,inner_diameter,height,material,al\n"


def table(rows: Iterable[Row]) -> str:
    """Return rows as a CSV text, every column that any of them has."""
    rows = list(rows)
    columns = list(dict.fromkeys(name for row in rows for name in row))
    text = io.StringIO()
    writer = csv.DictWriter(text, columns, restval="")
    writer.writeheader()
    writer.writerows(rows)
    return text.getvalue()


def write_drawer(
    folder: Path,
    *,
    capacitors: Iterable[Row] = CAPACITORS,
    inductors: Iterable[Row] = INDUCTORS,
    formers: Iterable[Row] = FORMERS,
    wires: Iterable[Row] = WIRES,
) -> Path:
    """Write a drawer that holds nothing but these rows; a kind without rows has its header only."""
    folder.mkdir(exist_ok=True)
    kinds = {"capacitors": capacitors, "inductors": inductors, "formers": formers, "wires": wires}
    headers = {
        "capacitors": "value\n",
        "inductors": "value\n",
        "formers": "name,diameter,winding_length\n",
        "wires": "name,bare_diameter,overall_diameter\n",
    }
    for kind, rows in kinds.items():
        rows = list(rows)
        (folder / f"{kind}.csv").write_text(table(rows) if rows else headers[kind], encoding="utf-8")
    (folder / "cores.csv").write_text(NO_CORES)
    return folder


@dataclass(frozen=True)
class Run:
    """What one run of the command line left behind."""

    code: int
    out: str
    err: str

    @property
    def json(self) -> Any:
        """What stands on stdout, read as JSON; NaN and Infinity are no JSON."""
        return read_json(self.out)


def read_json(text: str) -> Any:
    def refuse(constant: str) -> None:
        raise AssertionError(f"{constant} in the JSON")

    return json.loads(text, parse_constant=refuse)


def run(*arguments: object) -> Run:
    """Run the command line in this process."""
    out, err = io.TextIOWrapper(io.BytesIO(), "utf-8", newline=""), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        code = main([str(argument) for argument in arguments])
    out.flush()
    return Run(code, out.buffer.getvalue().decode(), err.getvalue())  # type: ignore[attr-defined]


def ranked(*arguments: object) -> list[dict[str, Any]]:
    """Return the candidates of a run that must find some."""
    done = run(*arguments, "--json", "-")
    assert done.code == 0, done.err or done.json["ruled_out_by"]
    return list(done.json["candidates"])


def capacitors_of(candidate: Mapping[str, Any]) -> list[tuple[float, str]]:
    """Return (value, grade) of a candidate's capacitors, smallest first."""
    return sorted((p["value_f"], p["grade"]) for p in candidate["parts"] if p["kind"] == "capacitor")


def plan(path: Path, bands: Sequence[tuple[str, str]], head: str = "") -> Path:
    """Write a plan of one-frequency bands."""
    tables = [f'[[band]]\nname = "{name}"\nat = "{at}"\n' for name, at in bands]
    path.write_text("\n".join([head, *tables]), encoding="utf-8")
    return path
