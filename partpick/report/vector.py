"""Lines, dots and words of an inline SVG; colours come from the style of the page."""

from __future__ import annotations

from collections.abc import Sequence

from partpick.report.html import text


def svg(width: float, height: float, lines: Sequence[str], title: str) -> str:
    """Return a drawing of its size, which shrinks with the page."""
    inner = "\n".join(lines)
    return (
        f'<svg class="drawing" viewBox="0 0 {number(width)} {number(height)}" width="{number(width)}" role="img">'
        f"<title>{text(title)}</title>\n{inner}\n</svg>"
    )


def line(x1: float, y1: float, x2: float, y2: float, kind: str = "wire") -> str:
    """Return a straight line."""
    return f'<path class="{kind}" d="M{number(x1)} {number(y1)}L{number(x2)} {number(y2)}"/>'


def circle(x: float, y: float, radius: float = 3.0, kind: str = "wire") -> str:
    """Return a circle."""
    return f'<circle class="{kind}" cx="{number(x)}" cy="{number(y)}" r="{number(radius)}"/>'


def box(x: float, y: float, width: float, height: float, kind: str) -> str:
    """Return a filled rectangle."""
    size = f'width="{number(width)}" height="{number(height)}"'
    return f'<rect class="{kind}" x="{number(x)}" y="{number(y)}" {size}/>'


def words(x: float, y: float, said: str, kind: str = "", anchor: str = "start") -> str:
    """Return a text at its foot."""
    style = f' class="{kind}"' if kind else ""
    return f'<text{style} x="{number(x)}" y="{number(y)}" text-anchor="{anchor}">{text(said)}</text>'


def number(value: float) -> str:
    """Return a coordinate without needless digits."""
    return f"{value:.1f}".removesuffix(".0")
