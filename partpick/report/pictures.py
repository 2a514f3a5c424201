"""Pictures that need matplotlib, the extra `plot`, as inline SVG: response of each tank, tuning of swept bands.

The same result gives the same bytes: no date, and names inside the picture from a fixed salt.
"""

from __future__ import annotations

import io
import re
import warnings
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, replace
from typing import Any

from partpick.report.dial import Dial, dials
from partpick.report.text import clean, cut
from partpick.result import BandFigures, Candidate, Result

LONGEST_NAME = 22
POINTS = 1201
INK = "#010203"  # replaced by the colour of the page's text
SHADES = ("#2f7ed8", "#d9660a", "#1f9d6b", "#b04fc4", "#c2413b", "#8a8d16", "#1797a6", "#7c6bd6")
HOW_TO_GET = "pip install 'partpick[plot]'"


@dataclass(frozen=True)
class Picture:
    """One picture of a sheet; without `drawing` it could not be made."""

    title: str
    drawing: str | None


def pictures(result: Result, candidate: Candidate) -> tuple[Picture, ...]:
    """Return the pictures of a candidate; each without its drawing where matplotlib is not installed."""
    fixed = [band for band in candidate.bands if band.resonance is not None and band.q is not None]
    charts = [dial for dial in dials(replace(result, candidates=(candidate,))) if len(dial.points) > 1]
    wanted: list[tuple[str, Callable[[], str]]] = []
    if fixed:
        wanted += [
            ("Response, all bands", lambda: _wide(fixed)),
            ("Response near resonance", lambda: _near(fixed)),
        ]
    if charts:
        wanted.append(("Tuning: frequency against setting", lambda: _tuning(charts)))
    if not wanted:
        return ()
    try:
        import matplotlib as library
    except ImportError:
        return tuple(Picture(title, None) for title, _ in wanted)
    with _quiet_style(library):
        return tuple(Picture(title, draw()) for title, draw in wanted)


@contextmanager
def _quiet_style(library: Any) -> Iterator[None]:
    settings = {
        "svg.hashsalt": "partpick",
        "svg.fonttype": "none",
        "font.family": "sans-serif",
        "font.size": 9,
        "text.color": INK,
        "axes.edgecolor": INK,
        "axes.labelcolor": INK,
        "xtick.color": INK,
        "ytick.color": INK,
        "axes.grid": True,
        "grid.alpha": 0.3,
        "grid.color": INK,
        "legend.frameon": False,
        "path.simplify": True,
    }
    with library.rc_context():
        library.rcdefaults()
        library.rcParams.update(settings)
        yield


def _response(band: BandFigures, frequency: Any) -> Any:
    """Return voltage under a constant current over that at resonance, with the load if one is stated. [dB]"""
    from partpick.physics.loading import rejection

    assert band.resonance is not None and band.q is not None
    load = band.extra.get("load")
    loaded = load.get("loaded_q") if isinstance(load, Mapping) else None
    return -rejection(frequency, band.resonance, band.q if loaded is None else loaded)


def _wide(bands: list[BandFigures]) -> str:
    import numpy as np
    from matplotlib.ticker import LogLocator

    def draw(axes: Any) -> None:
        own = [band.resonance for band in bands if band.resonance is not None]
        ends = np.log10(min(own) / 2), np.log10(max(own) * 2)
        for place, band in enumerate(bands):
            assert band.resonance is not None
            near = band.resonance * np.geomspace(0.9, 1.1, POINTS // 3)
            grid = np.sort(np.concatenate([np.logspace(*ends, POINTS), near]))
            axes.semilogx(grid / 1e6, _response(band, grid), color=SHADES[place % len(SHADES)], linewidth=1.2)
        axes.set(xlabel="MHz", ylabel="dB", ylim=(-70, 3))
        axes.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
        axes.xaxis.set_major_formatter(lambda value, place: f"{value:g}")
        axes.xaxis.set_minor_formatter(lambda value, place: "")

    return _picture(draw, "wide", [band.name for band in bands])


def _near(bands: list[BandFigures]) -> str:
    import numpy as np

    def draw(axes: Any) -> None:
        for place, band in enumerate(bands):
            assert band.resonance is not None and band.q is not None
            offset = np.linspace(-0.05, 0.05, POINTS)
            response = _response(band, band.resonance * (1 + offset))
            axes.plot(offset * 100, response, color=SHADES[place % len(SHADES)], linewidth=1.2)
        axes.set(xlabel="% off resonance", ylabel="dB", ylim=(-40, 2))

    return _picture(draw, "near", [band.name for band in bands])


def _tuning(charts: list[Dial]) -> str:
    from matplotlib.ticker import LogLocator, NullLocator

    def draw(axes: Any) -> None:
        for place, dial in enumerate(charts):
            settings = [point.setting for point in dial.points]
            frequencies = [point.frequency / 1e6 for point in dial.points]
            axes.plot(settings, frequencies, color=SHADES[place % len(SHADES)], linewidth=1.2)
        axes.set(xlabel=f"setting, {charts[0].unit}", ylabel="MHz")
        if len(charts) > 1:
            axes.set_yscale("log")
            axes.yaxis.set_major_locator(LogLocator(subs=(1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0)))
            axes.yaxis.set_major_formatter(lambda value, place: f"{value:g}")
            axes.yaxis.set_minor_locator(NullLocator())

    return _picture(draw, "tuning", [dial.band for dial in charts])


def _picture(draw: Any, salt: str, lines: list[str]) -> str:
    """Return an SVG to stand in a page, its names made different from those of any other picture."""
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    figure = Figure(figsize=(4.8, 3.2 + 0.2 * ((len(lines) + 1) // 2)), layout="constrained")
    FigureCanvasSVG(figure)
    axes = figure.subplots()
    figure.patch.set_alpha(0)
    axes.patch.set_alpha(0)
    draw(axes)
    names = [cut(clean(name), LONGEST_NAME) for name in lines]
    for row, name in zip(axes.lines, names, strict=True):
        row.set_label(name if not name.startswith("_") else "\u200a" + name)  # one underscore hides a label
    for told in figure.legend(loc="outside lower center", ncols=2).get_texts():
        told.set_parse_math(False)
    page = io.StringIO()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # a letter that its own font lacks: the reader's font has it
        figure.savefig(page, format="svg", metadata={"Date": None, "Creator": None, "Format": None, "Type": None})
    return _inline(page.getvalue(), salt)


def _inline(whole: str, salt: str) -> str:
    """Return the drawing without its head, in the page's colour, names led by the salt."""
    drawing = whole[whole.index("<svg") :]
    for element in ("metadata", "style"):  # neither links nor rules for the whole page
        drawing = re.sub(rf"<{element}[ >].*?</{element}>", "", drawing, flags=re.DOTALL)
    drawing = re.sub(r"font-family: [^;]*;", "", drawing)
    drawing = re.sub(r'\bid="', f'id="{salt}-', drawing)
    drawing = re.sub(r'(href="#|url\(#)', rf"\g<1>{salt}-", drawing)
    drawing = re.sub(r'<svg([^>]*?) width="[^"]*"', r'<svg class="picture"\1', drawing, count=1)
    drawing = re.sub(r'(<svg[^>]*?) height="[^"]*"', r"\1", drawing, count=1)
    return drawing.replace(INK, "currentColor").strip()
