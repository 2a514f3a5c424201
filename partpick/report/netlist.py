"""The tanks of the best candidate as a deck for ngspice: each band with its losses, driven and measured.

Run it with `ngspice -b FILE`. The peak of |v| over a driving current lies at 1/(2 pi sqrt(LC)) within about
1/(4 Q^4), so that it can be held against the printed resonance.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, field

from partpick.connection import Connection, Part, Series, parse_connection, without
from partpick.quantities import format_quantity
from partpick.report.oscillator import oscillator_of
from partpick.report.text import clean
from partpick.request import Request
from partpick.result import BandFigures, Candidate, PartLine, Result

SPAN = 0.05  # of the resonance, swept to either side
POINTS = 4001  # a step is 25 ppm of the resonance


def netlist(result: Result) -> str:
    """Return a deck with every band of the first candidate, or one that says that nothing fits."""
    title = _comment(result.request.title or "tuned circuits")
    lines = [f"* {title}", "* Run: ngspice -b FILE. SI units; losses in series, taken at each band's frequency."]
    if not result.candidates:
        return "\n".join([*lines, "* Nothing fits: there is no tank to simulate.", ".end"]) + "\n"
    tanks = list(_tanks(result.request, result.candidates[0]))
    lines += ["* Strays are taken without loss; a trimmer stands at the middle of its range."]
    if any(band.load is not None for band in result.request.bands) or result.request.load is not None:
        lines += ["* Loads are left out but those on a capacitive divider, which belong to its resonance."]
    lines += [".options rshunt=1e12"]  # a way to ground for a node between two capacitors
    for tank in tanks:
        lines += tank.lines
    lines += [".control", "set numdgt=10"]
    for tank in tanks:
        lines += _measure(tank)
    lines += ["quit", ".endc", ".end"]
    return "\n".join(lines) + "\n"


@dataclass(kw_only=True)
class _Tank:
    """One tank under way: its element lines, and a counter that keeps node names apart."""

    node: str  # hot end
    expected: float  # Hz
    lines: list[str] = field(default_factory=list)
    inner: int = 0

    device: dict[str, float] = field(default_factory=dict)  # F, across the halves of an oscillator's divider
    load: tuple[str, float] | None = None  # ohm, across which capacitor of a divider

    def new_node(self) -> str:
        self.inner += 1
        return f"{self.node}_{self.inner}"


def _tanks(request: Request, candidate: Candidate) -> Iterator[_Tank]:
    count = 0
    for band in candidate.bands:
        for frequency, element, words in _points(band):
            count += 1
            tank = _Tank(node=f"t{count}", expected=frequency, device=_device(band), load=_load(request, band))
            inductance, own = _at_end(band, frequency)
            tank.lines += ["*", f"* {tank.node}: {_comment(band.name)}{words}, {format_quantity(frequency, 'Hz', 7)}"]
            tank.lines.append(f"I{tank.node} 0 {tank.node} DC 0 AC 1")
            _coil(tank, band, inductance)
            _network(tank, request, candidate, band, element)
            _plain(tank, "strays", band.stray)
            _plain(tank, "self", own)
            if band.trimmer is not None:
                trimmer = next((p for p in candidate.parts if p.kind == "trimmer" and band.name in p.bands), None)
                _capacitor(tank, "trimmer", band.trimmer, trimmer, tank.node, "0")
            yield tank


def _points(band: BandFigures) -> list[tuple[float, float | None, str]]:
    """Return frequency, tuning capacitance and words of each tank of a band: one, or both ends of its range."""
    if band.resonance is not None:
        return [(band.resonance, None, "")]
    points: list[tuple[float, float | None, str]] = []
    for key, element, words in (
        ("tuned_low_hz", "tuning_high_f", " tuned to its low end"),
        ("tuned_high_hz", "tuning_low_f", " tuned to its high end"),
    ):
        frequency, own = band.extra.get(key), band.extra.get(element)
        if isinstance(frequency, (int, float)):  # no capacitance where the coil itself is tuned
            points.append((float(frequency), float(own) if isinstance(own, (int, float)) else None, words))
    return points


def _at_end(band: BandFigures, frequency: float) -> tuple[float, float]:
    """Return inductance and self-capacitance of a band's coil where it is tuned to its low end, or else. [H, F]"""
    if frequency != band.extra.get("tuned_low_hz"):
        return band.inductance, band.self_capacitance
    inductance = band.extra.get("inductance_low_h", band.inductance)
    own = band.extra.get("self_capacitance_low_f", band.self_capacitance)
    assert isinstance(inductance, float) and isinstance(own, float)
    return inductance, own


def _coil(tank: _Tank, band: BandFigures, inductance: float) -> None:
    middle = tank.new_node()
    tap = "" if band.tap_turns is None else f", tapped at turn {band.tap_turns}"
    if band.coil_q is None:
        tank.lines.append(f"* loss of {band.coil}{tap} is unknown: none is taken, so the peak is too high")
        tank.lines.append(f"L{tank.node} {tank.node} 0 {inductance!r}")
        return
    resistance = 2 * math.pi * tank.expected * inductance / band.coil_q
    tank.lines.append(f"* {band.coil}{tap}, Q {band.coil_q:.4g}")
    tank.lines.append(f"L{tank.node} {tank.node} {middle} {inductance!r}")
    tank.lines.append(f"RL{tank.node} {middle} 0 {resistance!r}")


def _network(tank: _Tank, request: Request, candidate: Candidate, band: BandFigures, element: float | None) -> None:
    """Add the capacitors of a band; leads are in series with all but the tuning element and its padder."""
    tree = parse_connection(band.connection)
    if tree is None:
        return
    parts = {part.reference: part for part in candidate.parts}
    tuning, across = without(tree, "T")
    if tuning is not None and element is not None:
        _branch(tank, parts, tuning, tank.node, "0", element)
    if across is None:
        return
    low = "0"
    if request.stray.inductance:
        low = tank.new_node()
        tank.lines.append(f"Lleads{tank.node} {low} 0 {request.stray.inductance!r}")
    _branch(tank, parts, across, tank.node, low, None)


def _branch(
    tank: _Tank, parts: dict[str, PartLine], tree: Connection, high: str, low: str, element: float | None
) -> None:
    if isinstance(tree, Part):
        part = parts.get(tree.reference)
        value = element if tree.reference == "T" and element is not None else part.value if part else None
        assert value is not None, f"{tree.reference} has no value"
        _capacitor(tank, tree.reference, value, part, high, low)
        if tank.load is not None and tank.load[0] == tree.reference:
            tank.lines.append(f"* the load across {tree.reference}")
            tank.lines.append(f"Rload{tank.node} {high} {low} {tank.load[1]!r}")
        if beside := tank.device.get(tree.reference):
            tank.lines.append(f"* the device across {tree.reference}")
            tank.lines.append(f"Cdevice{tree.reference}{tank.node} {high} {low} {beside!r}")
    elif isinstance(tree, Series):
        nodes = [high, *(tank.new_node() for _ in tree.branches[1:]), low]
        for branch, above, below in zip(tree.branches, nodes, nodes[1:], strict=False):
            _branch(tank, parts, branch, above, below, element)
    else:
        for branch in tree.branches:
            _branch(tank, parts, branch, high, low, element)


def _capacitor(tank: _Tank, name: str, value: float, part: PartLine | None, high: str, low: str) -> None:
    """Add a capacitor with its series inductance and the resistance that its Q stands for."""
    inductance = part.series_inductance if part else None
    q = part.q if part else None
    if part and part.q_below is not None and tank.expected > part.q_below:
        q = None
    label = f"{name}{tank.node}"
    told = f"* {name}: loss is unknown, none is taken" if q is None else f"* {name}: Q {q:.4g}"
    tank.lines.append(told)
    behind = tank.new_node() if q is not None or inductance else low
    tank.lines.append(f"C{label} {high} {behind} {value!r}")
    if inductance:
        after = tank.new_node() if q is not None else low
        tank.lines.append(f"L{label} {behind} {after} {inductance!r}")
        behind = after
    if q is not None:
        reactance = 1 / (2 * math.pi * tank.expected * value)
        tank.lines.append(f"R{label} {behind} {low} {reactance / q!r}")


def _device(band: BandFigures) -> dict[str, float]:
    """Return what of an oscillator's device is across which capacitor. [F]"""
    keys = oscillator_of(band)
    if keys is None or keys["output_capacitor"] is None:
        return {}
    return {
        keys["output_capacitor"]: float(keys["output_capacitance_f"]),
        keys["control_capacitor"]: float(keys["input_capacitance_f"]),
    }


def _load(request: Request, band: BandFigures) -> tuple[str, float] | None:
    """Return the capacitor of a divider that a load is across, and the load. [ohm]"""
    told = band.extra.get("load")
    asked = next((each.load for each in request.bands if each.name == band.name), None)
    if not isinstance(told, dict) or not told["divider"] or asked is None or asked.resistance is None:
        return None
    return told["divider"][1], asked.resistance


def _plain(tank: _Tank, name: str, value: float) -> None:
    if value > 0:
        tank.lines.append(f"C{name}{tank.node} {tank.node} 0 {value!r}")


def _measure(tank: _Tank) -> list[str]:
    low, high = tank.expected * (1 - SPAN), tank.expected * (1 + SPAN)
    return [
        f"ac lin {POINTS} {low!r} {high!r}",
        f"let size = mag(v({tank.node}))",
        f"echo {tank.node} printed_hz = {tank.expected!r}",
        f"meas ac {tank.node}_peak_hz MAX_AT size",
        f"meas ac {tank.node}_peak_ohm MAX size",
    ]


def _comment(text: str) -> str:
    """Return a name in plain ASCII on one line: a simulator reads no more."""
    return clean(text).encode("ascii", "replace").decode()
