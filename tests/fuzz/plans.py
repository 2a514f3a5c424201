"""Whole plans of every layout and element on a small drawer: solved, looked at twice, and written in every form.

python tests/fuzz/plans.py 5000
"""

from __future__ import annotations

import json
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from random import Random
from typing import Any

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent.parent))

from workbench import write_drawer

import partpick
from partpick.errors import InternalError, PartpickError
from partpick.parts import Catalogue
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.rendering import renderers
from partpick.report.dial import check_dial

LIMIT = 4.0  # s that a search may take
SLOW = 60.0  # s that a whole run may take on a busy machine
PAIR_SHARE = 0.2
Table = dict[str, Any]


def plan(random: Random) -> tuple[str, Table]:
    """Return a command and a plan for it: of sensible size, its figures anywhere."""
    command = "pair" if random.random() < PAIR_SHARE else "bands"
    count = 1 if command == "pair" else random.randint(1, 4)
    made: Table = {"band": [_band(random, place, command) for place in range(count)]}
    if command == "bands" and random.random() < 0.5:
        made["switching"] = random.choice(("separate", "stacked", "shared"))
    for name, fill, share in (
        ("limits", _limits, 0.8),
        ("coil", _coil, 0.5),
        ("capacitors", _capacitors, 0.4),
        ("stray", _stray, 0.5),
        ("trimmer", _trimmer, 0.25),
        ("tuning", _tuning, 0.9),
        ("load", _load, 0.2),
        ("drive", _drive, 0.2),
        ("temperature", _temperature, 0.15),
        ("oscillator", _oscillator, 0.08),
        ("receiver", _receiver, 0.05),
        ("spread", _spread, 0.3),
        ("cover", _cover, 0.03),
    ):
        if name == "tuning" and not any("from" in band for band in made["band"]):
            continue
        if command == "pair" and name == "cover":
            continue
        if random.random() < share:
            made[name] = fill(random)
    if random.random() < 0.8:  # three values of capacitors hit nothing closely
        made.setdefault("limits", {}).setdefault("error", f"{random.uniform(2, 30):.1f} %")
    return command, made


def _some(random: Random, share: float, keys: dict[str, Callable[[], Any]]) -> Table:
    return {name: make() for name, make in keys.items() if random.random() < share}


def _frequency(random: Random) -> float:
    return 10 ** (random.uniform(6.45, 7.2) if random.random() < 0.85 else random.uniform(5.5, 7.9))


def _band(random: Random, place: int, command: str) -> Table:
    low = _frequency(random)
    band: Table = {"name": f"band {place}"} if command == "bands" else {}
    if random.random() < 0.25:
        return {**band, "from": low, "to": low * random.uniform(1.01, 2.5)}
    own = _some(random, 0.1, {
        "stray": lambda: f"{random.uniform(0, 20):.2f} pF",
        "q": lambda: random.choice(("none", random.uniform(5, 120))),
        "trimmer": lambda: _trimmer(random),
        "load": lambda: _load(random),
    }) if command == "bands" else {}  # fmt: skip
    return {**band, "at": low, **own}


def _limits(random: Random) -> Table:
    share = random.choice((0.1, 0.3))
    return _some(random, share, {
        "error": lambda: random.choice(("none", f"{10 ** random.uniform(-1, 1.5):.3f} %")),
        "parts_per_band": lambda: random.randint(0, 3),
        "parts": lambda: random.randint(0, 6),
        "values": lambda: random.randint(0, 4),
        "inductors": lambda: random.randint(1, 3),
        "q": lambda: random.uniform(10, 100),
        "drift": lambda: f"{random.uniform(5, 300):.1f} ppm",
        "price": lambda: random.uniform(0, 9),
        "excess": lambda: f"{random.uniform(1, 300):.1f} %",
        "margin": lambda: f"{random.uniform(0, 6):.1f} %",
        "alignable": lambda: random.choice(("worst case", "90 %", "none")),
    })  # fmt: skip


def _coil(random: Random) -> Table:
    return _some(random, 0.25, {
        "forms": lambda: random.sample(["solenoid", "ring core", "bought"], random.randint(1, 3)),
        "taps": lambda: random.random() < 0.5,
        "inductance": lambda: ["0.5 µH", f"{random.uniform(0.6, 30):.2f} µH"],
        "reactance": lambda: [f"{random.uniform(5, 60):.1f} ohm", "2 kohm"],
        "self_resonance": lambda: random.choice(("none", 1.5, 4)),
        "proportions": lambda: random.choice(("none", [0.3, 3.0])),
        "measured": lambda: f"{random.uniform(0.2, 20):.3f} µH",
    })  # fmt: skip


def _capacitors(random: Random) -> Table:
    return _some(random, 0.4, {
        "connect": lambda: random.choice(("parallel", "any")),
        "series": lambda: random.choice(("E6", "E12", "E24")),
        "from": lambda: "10 pF",
        "to": lambda: f"{random.uniform(20, 500):.1f} pF",
        "grades": lambda: [random.choice(("C0G", "N150"))],
    })  # fmt: skip


def _stray(random: Random) -> Table:
    return _some(random, 0.4, {
        "capacitance": lambda: f"{random.uniform(0, 25):.1f} pF",
        "tolerance": lambda: f"{random.uniform(0, 60):.0f} %",
        "share": lambda: random.choice(("none", "15 %", "40 %")),
        "inductance": lambda: f"{random.uniform(0, 30):.1f} nH",
    })  # fmt: skip


def _trimmer(random: Random) -> Table:
    return {"low": f"{random.uniform(1, 8):.2f} pF", "high": f"{random.uniform(9, 60):.1f} pF"}


def _tuning(random: Random) -> Table:
    kinds: tuple[Table, ...] = (
        {"kind": "variable capacitor", "low": "12 pF", "high": f"{random.uniform(40, 400):.0f} pF"},
        {"kind": "varactor", "zero_bias": "500 pF", "grading": 0.7, "from": "1 V", "to": "9 V"},
        {"kind": "sliding core", "diameter": "18 mm", "length": "25 mm", "permeability": 20, "travel": "25 mm"},
        {"kind": "moving contact", "continuous": random.random() < 0.5},
        {"kind": "variometer", "rotor": "14 mm", "from": 0, "to": 180},
    )
    return random.choice((kinds[0], kinds[0], *kinds))


def _load(random: Random) -> Table:
    return _some(random, 0.5, {
        "resistance": lambda: f"{10 ** random.uniform(1, 5):.3g} ohm",
        "loaded_q": lambda: random.uniform(3, 60),
        "offset": lambda: f"{random.uniform(5, 900):.1f} kHz",
        "connection": lambda: random.choice(("across", "tap", "link", "divider")),
    })  # fmt: skip


def _drive(random: Random) -> Table:
    what = random.choice(("power", "voltage", "current"))
    return {what: {"power": "5 W", "voltage": "60 V", "current": "0.2 A"}[what], "class": random.choice("ABC")}


def _temperature(random: Random) -> Table:
    return {"from": -10, "to": 40, **_some(random, 0.5, {"measured_drift": lambda: "-18 ppm"})}


def _oscillator(random: Random) -> Table:
    return {"circuit": random.choice(("colpitts", "clapp", "hartley")), "transconductance": "5 mS"}


def _receiver(random: Random) -> Table:
    return {"intermediate": "455 kHz", "side": random.choice(("above", "below"))}


def _spread(random: Random) -> Table:
    return {"builds": random.choice((100, 2000))}


def _cover(random: Random) -> Table:
    low = _frequency(random)
    return {"from": low, "to": low * random.uniform(1.5, 6)}


def run_one(command: str, tables: Table, catalogue: Catalogue, by: str) -> str:
    """Solve one plan and write every form of it; return what came of it in a word."""
    try:
        request = request_from_tables(tables, command, by=by)
    except PartpickError as error:
        assert len(str(error).splitlines()) == 1
        return "refused"
    try:
        result = partpick.solve(request, catalogue, top=3, monitor=Quiet(LIMIT))
        dial = None
        if any(band.swept for band in request.bands) and request.tuning is not None:
            check_dial("-", request)
            dial = "-"
    except InternalError:
        raise
    except PartpickError as error:
        assert len(str(error).splitlines()) == 1
        return "refused"
    for name, render in renderers(result, 1 if result.candidates else None, None, dial).items():
        if (name == "dial" and dial is None) or (name == "tracking" and "receiver" not in tables):
            continue
        told = render()
        assert told.endswith("\n") or told.endswith("\r\n"), name
        if name == "json":
            json.loads(told, parse_constant=_no_constant)
        if name == "table":
            assert max(map(len, told.splitlines())) <= 80, told
    return result.proof.status


def _no_constant(name: str) -> float:
    raise AssertionError(f"{name} is no JSON number")


def run(count: int, seed: int, folder: Path) -> Counter[str]:
    """Solve `count` random plans; return how they ended."""
    random = Random(seed)
    catalogue = partpick.load_catalogue(write_drawer(folder))
    outcomes: Counter[str] = Counter()
    for place in range(count):
        command, tables = plan(random)
        by = random.choice(("build", "build", "error", "price"))
        began = time.monotonic()
        try:
            outcomes[run_one(command, tables, catalogue, by)] += 1
        except Exception as error:
            raise AssertionError(
                f"plan {place} of seed {seed} ({command}, by {by}): {json.dumps(tables)} ended in "
                f"{type(error).__name__}: {error}"
            ) from error
        assert time.monotonic() - began < SLOW, (seed, place, tables)
    return outcomes


def main() -> None:
    """Run by hand: how many, and the seed."""
    given = [int(each) for each in sys.argv[1:]]
    count, seed = (given + [200, 1][len(given) :])[:2]
    with tempfile.TemporaryDirectory() as name:
        outcomes = run(count, seed, Path(name) / "drawer")
    print(", ".join(f"{what} {times}" for what, times in sorted(outcomes.items())))


if __name__ == "__main__":
    main()
