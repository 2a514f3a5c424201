"""A plan, from a TOML file or from options, to a `Request`.

Both come as the same nested tables and are read by the keys of `plankeys.py`. Every refusal is one line:
the file, the key, what was read, what is wrong with it and what is accepted.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Mapping
from typing import Any, BinaryIO

from partpick import plankeys
from partpick.errors import RequestError
from partpick.plankeys import Key
from partpick.plantables import (
    BandDefaults,
    NameKey,
    TableReader,
    read_bands,
    read_capacitors,
    read_coil,
    read_further,
    read_limits,
    read_load,
    read_stray,
    read_trimmer,
    read_tuning,
)
from partpick.quantities import shown
from partpick.request import Request, Tuning

_LARGEST_FILE = 250_000  # bytes; a plan of 64 bands has about 20,000
_MOST_DOTS = 100  # in a line; the time to read a dotted key grows with the square of its parts
_REMOVABLE = ("trimmer", "tuning", "load")  # tables for which "none" may stand
_DEFAULT_STRAY = {"pair": 5e-12, "bands": 10e-12}  # F


def plan_key(path: str) -> str:
    """Return a key as a plan file has it: "limits.error", and "band 2: at" for "band.2.at"."""
    return re.sub(r"^band\.(\d+)(\.|$)", lambda match: f"band {match[1]}{': ' if match[2] else ''}", path)


def load_plan(
    path: str,
    *,
    by: str = "build",
    all_windings: bool = False,
    stdin: BinaryIO | None = None,
    change: Mapping[str, object] | None = None,
) -> Request:
    """Return the request of a plan file.

    Parameters
    ----------
    path : str
        Plan file, TOML in UTF-8; "-" reads standard input.
    by : str
        Order of the candidates, one of `plankeys.ORDERS`.
    all_windings : bool
        Whether every winding is listed.
    stdin : binary file
        Read for "-" in place of the standard input.
    change : mapping
        Keys to set beside what the file states, such as ``{"limits.q": 180, "stray.capacitance": "12 pF"}``; a
        key of all bands holds where a band does not state its own.

    Returns
    -------
    request : Request
        The job with every default filled in.

    Raises
    ------
    RequestError
        The file cannot be read, is no TOML, or holds something that is not understood.
    """
    source = "stdin" if path == "-" else "".join(c if c.isprintable() else "\ufffd" for c in path)
    tables = _changed(_parse(_read_bytes(path, source, stdin), source), change or {})
    return request_from_tables(tables, "bands", source=source, by=by, all_windings=all_windings)


def _changed(tables: dict[str, Any], change: Mapping[str, object]) -> dict[str, Any]:
    """Return the tables of a plan with some keys set anew, each named with its table: "limits.q"."""
    for path, value in change.items():
        *above, key = path.split(".")
        table = tables
        for name in above:
            table = table.setdefault(name, {})
            if not isinstance(table, dict):
                raise RequestError(f'"{path}" cannot be changed: "{name}" is no table of the plan')
        table[key] = value
    return tables


def _read_bytes(path: str, source: str, stdin: BinaryIO | None) -> bytes:
    try:
        if path == "-":
            data = (stdin or sys.stdin.buffer).read(_LARGEST_FILE + 1)
        else:
            with open(path, "rb") as file:
                data = file.read(_LARGEST_FILE + 1)
    except FileNotFoundError:
        raise RequestError(f"{source}: no such file; a plan file is wanted, or - for stdin") from None
    except IsADirectoryError:
        raise RequestError(f"{source}: is a folder; a plan file is wanted") from None
    except (OSError, ValueError) as problem:
        reason = problem.strerror if isinstance(problem, OSError) and problem.strerror else str(problem)
        raise RequestError(f"{source}: cannot be read: {reason}") from None
    if len(data) > _LARGEST_FILE:
        raise RequestError(f"{source}: longer than {_LARGEST_FILE} bytes; that is no plan")
    return data


def _parse(data: bytes, source: str) -> dict[str, Any]:
    import tomllib  # a single tank has no plan file

    try:
        text = data.decode("utf-8-sig")
        if any(line.count(".") > _MOST_DOTS for line in text.splitlines()):
            raise RecursionError
        return tomllib.loads(text)
    except UnicodeDecodeError as problem:
        raise RequestError(
            f"{source}: not UTF-8 text (byte {problem.start + 1}); save the plan as UTF-8"
        ) from None
    except RecursionError:
        raise RequestError(f"{source}: nested too deeply; a plan has tables of two levels") from None
    except tomllib.TOMLDecodeError as problem:
        reason = " ".join(str(problem).split())
        raise RequestError(f"{source}: not understood as TOML: {reason[:120]}") from None
    except (ValueError, OverflowError):  # a whole number of thousands of digits
        raise RequestError(f"{source}: a number in it is too long") from None


def request_from_tables(
    tables: Mapping[str, object],
    command: str,
    name_key: NameKey = plan_key,
    *,
    source: str = "",
    by: str = "build",
    all_windings: bool = False,
) -> Request:
    """Return the request that nested tables state; plan files and options both come here.

    Parameters
    ----------
    tables : mapping
        Tables as in a plan file; bands under "band", a list. A trimmer may be a text "3 pF..20 pF", a
        tuning element "variable capacitor:12 pF..150 pF". A band of `pair` may go without a name.
    command : str
        "pair" or "bands"; sets the default stray capacitance.
    name_key : callable
        Turns a path such as "limits.error" or "band.1.at" into the name that the user typed.
    source : str
        First word of every refusal, such as the file name; empty for none.
    by : str
        Order of the candidates, one of `plankeys.ORDERS`.
    all_windings : bool
        Whether every winding is listed.

    Returns
    -------
    request : Request
        The job with every default filled in.

    Raises
    ------
    RequestError
        Something is not understood or contradicts itself.
    """
    reader = TableReader(source, name_key)
    known = {
        **plankeys.TOP,
        **{name: Key(read=plankeys.as_given, none=name in _REMOVABLE) for name in plankeys.SECTIONS},
    }
    stated = reader.table(tables, known, "")
    raw_bands = stated.get("band", [])
    band_count = len(raw_bands) if isinstance(raw_bands, list) else 1
    capacitors = read_capacitors(reader, stated.get("capacitors", {}))
    limits = read_limits(reader, stated.get("limits", {}), capacitors.connect, band_count)
    coil = read_coil(reader, stated.get("coil", {}))
    stray = read_stray(reader, stated.get("stray", {}), _DEFAULT_STRAY[command])
    trimmer = read_trimmer(reader, stated.get("trimmer"), "trimmer")
    load = read_load(reader, stated.get("load"), "load")
    defaults = BandDefaults(stray.capacitance, trimmer, limits.q, coil.forms, load)
    request = Request(
        command=command,
        bands=read_bands(reader, raw_bands, command == "pair", defaults),
        by=by,
        all_windings=all_windings,
        limits=limits,
        coil=coil,
        capacitors=capacitors,
        stray=stray,
        trimmer=trimmer,
        tuning=read_tuning(reader, stated.get("tuning")),
        load=load,
        extra=read_further(reader, stated),
        **{name: stated[name] for name in plankeys.TOP if name in stated},
    )
    _check_bands(reader, request)
    _check_layout(reader, request)
    return request


def _check_bands(reader: TableReader, request: Request) -> None:
    """Refuse a plan without bands, a sweep without an element, and [cover] beside bands of its own."""
    cover = "cover" in dict(request.extra)
    if cover and request.bands:
        raise reader.fail("cover", "finds the bands itself; leave out every [[band]]")
    if "steps" in dict(request.extra):
        if request.bands or cover:
            raise reader.fail("steps", "makes its positions itself; leave out [cover] and every [[band]]")
        return
    if not request.bands and not cover:
        raise reader.fail("", "no band in the plan; add [[band]] with name and at")
    if request.tuning is None and cover:
        raise reader.fail("cover", f"needs {reader.name('tuning')}, which is not set")
    for number, band in enumerate(request.bands, 1):
        if band.swept and request.tuning is None:
            raise reader.fail(f"band.{number}", f"a range needs {reader.name('tuning')}, which is not set")
    if request.tuning is not None and request.tuning.moves_inductance:
        _check_moved(reader, request, request.tuning, cover)


def _check_moved(reader: TableReader, request: Request, tuning: Tuning, cover: bool) -> None:
    """Refuse what an element that moves the coil's inductance cannot go with."""
    swept = sum(band.swept for band in request.bands)
    if not swept and not cover:
        return
    if request.coil.taps:
        raise reader.fail("coil.taps", f"a {tuning.kind} goes with coils without taps")
    if request.coil.measured is not None:
        text = f"an inductance alone does not say what a {tuning.kind} makes of the coil; leave it out"
        raise reader.fail("coil.measured", text)
    if request.limits.alignable is not None:
        raise reader.fail("limits.alignable", f"is not planned with a {tuning.kind}, only with tuned capacitances")
    chosen = [band.trimmer for band in request.bands if band.trimmer is not None and band.trimmer.to_choose]
    if chosen or (cover and request.trimmer is not None and request.trimmer.to_choose):
        text = f"to choose one is planned only with tuned capacitances, not with a {tuning.kind}; state low and high"
        raise reader.fail("trimmer", text)
    coils = request.limits.inductors if cover else min(request.limits.inductors, swept)
    if coils > tuning.sections:
        many = "one coil" if tuning.sections == 1 else f"{tuning.sections} coils"
        raise reader.fail(
            "limits.inductors",
            f"read {request.limits.inductors}: the {tuning.kind} tunes {many}; as many as "
            f"{reader.name('tuning.sections')} says that move together",
        )


def _check_layout(reader: TableReader, request: Request) -> None:
    """Refuse what the command or the switching layout cannot have."""
    if request.by not in plankeys.ORDERS:
        raise reader.fail("by", f"read {shown(request.by)}: one of {', '.join(plankeys.ORDERS)} is wanted")
    if request.command == "pair" and request.limits.parts_per_band < 1:
        raise reader.fail("limits.parts_per_band", "read 0: a pair has at least one capacitor")
    if request.command == "pair" and request.limits.excess is not None and not any(b.swept for b in request.bands):
        raise reader.fail("limits.excess", "has no effect at one frequency; it limits a range such as 7.0MHz..7.3MHz")
    if request.switching == "shared" and not request.limits.parts and "steps" not in dict(request.extra):
        raise reader.fail("limits.parts", 'is missing; switching "shared" needs the size of the shared set')
    first_at: dict[float, int] = {}
    for number, band in enumerate(request.bands, 1):
        if request.switching == "shared" and band.swept:
            raise reader.fail(f"band.{number}", 'a range goes with switching "separate" or "stacked" only')
        if request.switching == "stacked" and band.at is not None:
            if band.at in first_at:
                other = f"the same frequency as band {first_at[band.at]}"
                raise reader.fail(f"band.{number}.at", f"{other}; stacked bands differ in frequency")
            first_at[band.at] = number
