"""Lines, dots and words of an inline SVG; colours come from the style of the page."""

from __future__ import annotations

from collections.abc import Sequence

from partpick.report.html import text


def svg(width: float, height: float, lines: Sequence[str], title: str) -> str:
    inner = "\n".join(lines)
    return (
        f'<svg class="drawing" viewBox="0 0 {number(width)} {number(height)}" width="{number(width)}" role="img">'
        f"<title>{text(title)}</title>\n{inner}\n</svg>"
    )


def line(x1: float, y1: float, x2: float, y2: float, kind: str = "wire") -> str:
    return f'<path class="{kind}" d="M{number(x1)} {number(y1)}L{number(x2)} {number(y2)}"/>'


def circle(x: float, y: float) -> str:
    return f'<circle class="wire" cx="{number(x)}" cy="{number(y)}" r="3"/>'


def words(x: float, y: float, said: str, kind: str = "", anchor: str = "start") -> str:
    style = f' class="{kind}"' if kind else ""
    return f'<text{style} x="{number(x)}" y="{number(y)}" text-anchor="{anchor}">{text(said)}</text>'


def number(value: float) -> str:
    """Return a coordinate without needless digits."""
    return f"{value:.1f}".removesuffix(".0")
