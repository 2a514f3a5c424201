"""Coils that the stock can wind or buy, as text for the bench."""

from __future__ import annotations

from collections.abc import Sequence

from partpick.quantities import format_quantity
from partpick.report.text import clean, columns, figure, length, plural, quantity, signed_percent, wrapped
from partpick.result import CoilFigures


def windings_table(
    coils: Sequence[CoilFigures], *, inductance: float | None = None, at: float | None = None, top: int = 10
) -> str:
    """Return the first `top` coils in lines of at most 80 columns.

    Parameters
    ----------
    coils : sequence of CoilFigures
        Coils in the order to be shown.
    inductance : float or None
        The wanted inductance; adds how far each coil is from it. [H]
    at : float or None
        Where Q and resistance were computed. [Hz]
    top : int
        How many are shown.
    """
    if not coils:
        return "\n".join(wrapped("Nothing in stock gives such a coil.")) + "\n"
    shown = coils[:top]
    lines = [*wrapped(_heading(len(coils), len(shown), inductance, at)), ""]
    head = ["inductance"]
    head += ["off by"] if inductance is not None else []
    head += ["Q", "resistance"] if at is not None else []
    head += ["self-capacitance", "wire", "winding"]
    figures = columns([head, *(_row(coil, inductance, at) for coil in shown)])
    lines.append(figures[0])
    for coil, line in zip(shown, figures[1:], strict=True):
        lines.append(line)
        note = coil.extra.get("note")
        lines += wrapped(clean(f"{coil.label}; {note}" if note else coil.label), 4, 2)
    return "\n".join(lines) + "\n"


def _heading(found: int, shown: int, inductance: float | None, at: float | None) -> str:
    wanted = "" if inductance is None else f", nearest to {format_quantity(inductance, 'H', 4)} first"
    there = "" if at is None else f", figures at {format_quantity(at, 'Hz', 6)}"
    part = "" if shown == found else f" (the first {shown} are shown)"
    return f"{plural(found, 'coil')}{wanted}{there}{part}"


def _row(coil: CoilFigures, inductance: float | None, at: float | None) -> list[str]:
    row = [quantity(coil.inductance, "H", 4)]
    if inductance is not None:
        row.append(signed_percent(coil.inductance / inductance - 1))
    if at is not None:
        resistance = coil.extra.get("series_resistance_ohm")
        q = coil.extra.get("q")
        row.append(figure(float(q) if isinstance(q, (int, float)) else None))
        row.append(quantity(float(resistance) if isinstance(resistance, (int, float)) else None, "\u03a9"))
    return [
        *row,
        quantity(coil.self_capacitance, "F", 2),
        "" if coil.wire_length is None else length(coil.wire_length),
        "" if coil.winding_length is None else length(coil.winding_length),
    ]
