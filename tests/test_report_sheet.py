"""The build sheet: complete in itself, every name escaped, the same bytes each time, nothing clipped."""

from __future__ import annotations

import html
import json
import re
import shutil
import subprocess
import sys
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import handmade
import pytest

from partpick import load_catalogue, load_plan, solve
from partpick.quantities import parse_frequency
from partpick.report.cautions import ALWAYS
from partpick.report.pictures import pictures
from partpick.report.sheet import sheet
from partpick.result import Candidate, Result

VOID = {"meta", "br", "img", "link", "input", "hr"}
EVIL = "<script>alert('1')</script>\"&'x\x07"
SPREAD = {"error_5_percent": -0.021, "error_95_percent": 0.02, "error_least": -0.04, "error_most": 0.035}


class Page(HTMLParser):
    """Collects what a page holds, and fails on a tag that is not closed."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text: list[str] = []
        self._open: list[str] = []
        self.feed(page)
        self.close()
        assert self._open == [], self._open

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self._open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self._open and self._open.pop() == tag, tag

    def handle_data(self, data: str) -> None:
        self.text.append(data)

    @property
    def words(self) -> str:
        """All text with single blanks."""
        return " ".join(" ".join(self.text).split())


def plan(candidate: Candidate | None = None, **changes: Any) -> Result:
    """Return the answer of two bands; the first candidate is changed as given."""
    first = candidate or handmade.two_bands()
    first = replace(first, bands=tuple(replace(band, extra={"spread": SPREAD}) for band in first.bands))
    return handmade.result(first, request=handmade.request("beacon", "weather", **changes))


def test_a_sheet_holds_all_that_is_needed_to_wind_and_solder() -> None:
    """Whoever stands at the bench has this page and nothing else."""
    words = Page(sheet(plan())).words
    for wanted in (
        "14 turns of 0.5 mm on 20 mm former",  # what to wind
        "1.24 m, both ends included",  # wire with tails
        "7.8 mm long",
        "4.05 \u00b5H",
        "100 pF C0G",  # what to buy
        "C1 C3",  # equal parts in one row
        "C3 100 pF | (C4 270 pF + C5 270 pF)",  # the switch table
        "S2",
        "7.1 MHz",
        "Proven",
    ):
        assert wanted in words, wanted


def test_a_coil_dips_where_its_inductance_and_the_test_capacitor_say() -> None:
    """1/(2 pi sqrt(4.05 uH (100 pF + 1.2 pF))) is 7.861 MHz, worked by hand."""
    row = re.search(r"L1 100 pF ([0-9.]+ MHz) ([0-9.]+ MHz) to ([0-9.]+ MHz)", Page(sheet(plan())).words)
    assert row is not None
    dip, low, high = (parse_frequency(found) for found in row.groups())
    assert dip == pytest.approx(7.861e6, rel=2e-4)
    # 2 % of inductance and 1 % of the test capacitor move the dip by half of each
    assert low == pytest.approx(dip * (1 - 0.015), rel=1e-3) and high == pytest.approx(dip * (1 + 0.015), rel=1e-3)


def test_nothing_is_fetched() -> None:
    """A workshop has no network, and a page that calls home tells where it is read."""
    page = sheet(plan())
    for tag, attributes in Page(page).tags:
        assert tag not in ("script", "link", "iframe", "object", "embed", "img", "base", "form"), tag
        for name, value in attributes.items():
            assert not name.startswith("on"), name
            if name in ("src", "href", "xlink:href", "action", "data"):
                assert value is not None and value.startswith("#"), value
    assert "@import" not in page
    assert all(reference.startswith("#") for reference in re.findall(r"url\(([^)]*)\)", page))


def test_every_name_is_escaped() -> None:
    """Plans and drawers come from other people: a name is text, never a tag."""
    own = handmade.two_bands()
    own = replace(
        own,
        bands=tuple(replace(band, name=band.name + EVIL, contacts=(EVIL,)) for band in own.bands),
        coils=(handmade.coil(label=EVIL, former=EVIL, wire=EVIL),),
        parts=tuple(replace(part, description=EVIL, label=EVIL, wire=EVIL, source=EVIL) for part in own.parts),
        warnings=(EVIL,),
    )
    page = sheet(replace(plan(own, title=EVIL), warnings=(EVIL,)))
    assert "script" not in {tag for tag, _ in Page(page).tags}
    assert "\x07" not in page
    assert html.escape("<script>") in page


def test_a_load_and_its_damping_resistor_are_on_the_sheet() -> None:
    """A resistor that is not bought leaves the bandwidth where it was."""
    own = handmade.candidate()
    loaded = {"load": {"loaded_q": 12.3, "damping_resistor_ohm": 2200.0}}
    words = Page(sheet(handmade.result(replace(own, bands=(replace(own.bands[0], extra=loaded),))))).words
    assert "12.3" in words and "2.2 kΩ across" in words


def test_a_page_that_nothing_fits_says_why() -> None:
    """The file comes all the same, with the limit that rules everything out."""
    words = Page(sheet(handmade.nothing())).words
    assert "Nothing fits" in words and "0.83 %" in words and "Circuit" not in words


@pytest.mark.parametrize("result", [plan(), handmade.nothing(), plan(by="error", units=30)])
def test_cautions_stand_on_every_sheet(result: Result) -> None:
    """No plan and no option takes them away."""
    words = Page(sheet(result)).words
    for caution in ALWAYS:
        assert caution in words
    for word in ("licence", "discharge", "touch", "qualified", "Class 2", "eye protection"):
        assert word in words


def test_the_same_result_gives_the_same_bytes() -> None:
    """No date, no random name: also between two processes, whose hashes of text differ."""
    code = "import handmade, test_report_sheet as t; import sys; sys.stdout.write(t.sheet(t.plan()))"
    runs = [
        subprocess.run(
            [sys.executable, "-c", code],
            capture_output=True,
            check=True,
            cwd=Path(__file__).parent,
            env={"PYTHONPATH": str(Path(__file__).parent.parent), "PYTHONHASHSEED": seed, "PYTHONIOENCODING": "utf-8"},
        ).stdout
        for seed in ("1", "2")
    ]
    assert runs[0] == runs[1] and len(runs[0]) > 5000


def test_without_the_extra_the_sheet_says_which_pictures_are_missing(monkeypatch: pytest.MonkeyPatch) -> None:
    """The base install has no matplotlib; the sheet is to be complete without."""
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    words = Page(sheet(plan())).words
    assert "Missing: response, all bands and response near resonance" in words
    assert "pip install 'partpick[plot]'" in words


def test_pictures_bring_neither_rules_nor_equal_names_into_the_page() -> None:
    """Two pictures stand in one page: a name that both use would draw one with the other's shapes."""
    pytest.importorskip("matplotlib")
    named = replace(handmade.two_bands(), bands=(handmade.band("$\\frac{a}{b} <i>", 7.1e6, 118e-12, ["C1", "C2"]),))
    drawn = [picture.drawing or "" for picture in pictures(plan(named), named)]
    assert len(drawn) == 2 and all("<svg" in drawing for drawing in drawn)
    names = [set(re.findall(r'id="([^"]*)"', drawing)) for drawing in drawn]
    assert names[0] and not names[0] & names[1]
    assert not any("<style" in drawing or "<metadata" in drawing or "<i>" in drawing for drawing in drawn)
    assert "frac{a}{b}" in drawn[0]


def test_a_trimmer_and_a_series_padder_are_drawn() -> None:
    """What is in circuit is in the drawing: trimmer across, padder in series with the tuning element."""
    trimmer = handmade.capacitor("CT1", 11.5e-12, "3 pF to 20 pF", kind="trimmer", bands=("weather",))
    tuning = handmade.capacitor("T", 150e-12, "12 pF to 150 pF", kind="tuning", bands=("weather",))
    swept = replace(handmade.swept_band(), trimmer=11.5e-12)
    own = handmade.candidate(
        bands=(swept,),
        worst_error=None,
        worst_excess=1.0,
        parts=(handmade.capacitor("C1"), handmade.coil_part(), trimmer, tuning),
    )
    page = sheet(handmade.result(own))
    drawing = page[page.index("<figure>") : page.index("</figure>")]
    for label in ("T 12 pF\u2013150 pF", "C1 100 pF", "CT1 3 pF\u201320 pF"):
        assert f">{label}</text>" in drawing


def test_the_sheet_of_a_receiver_tells_how_it_tracks() -> None:
    """Its front is led by the tracking error in hertz, not by a share of anything."""
    entry = {
        "band": "medium wave", "intermediate_hz": 455e3, "side": "above", "worst_error_hz": 5090.0, "limit_hz": 8e3,
        "worst_at_hz": 6.1e5, "unrounded_error_hz": 3.9e3, "rounding_cost_hz": 1190.0,
    }  # fmt: skip
    own = handmade.candidate(extra={"tracking": [entry], "worst_tracking_hz": 5090.0})
    more = handmade.candidate(None, piece_count=5, extra={"tracking": [entry], "worst_tracking_hz": 4800.0})
    words = Page(sheet(handmade.result(own, front=(own, more)))).words
    assert "Tracking The oscillator 455 kHz above the signal" in words
    assert "medium wave 5.09 kHz 610 kHz 8 kHz 3.9 kHz +1.19 kHz" in words.replace("\u00a0", " ")
    assert "5 pieces 4.8 kHz" in words and "least tracking error each" in words and "noise" not in words


# ---------------------------------------------------------------- in a browser

_MEASURE = """
<script>
const page = PAGE, out = [];
for (const width of [360, 688]) {
  const frame = document.createElement("iframe");
  frame.style.cssText = `border: 0; width: ${width}px; height: 900px`;
  frame.srcdoc = page;
  frame.onload = () => {
    const inside = frame.contentDocument, found = [];
    for (const each of inside.body.querySelectorAll("*"))
      if (each.getBoundingClientRect().right > width + 0.5 && !each.closest("defs, clipPath"))
        found.push(each.outerHTML.slice(0, 80));
    for (const text of inside.querySelectorAll("svg.drawing text")) {
      const box = text.getBBox(), room = text.ownerSVGElement.viewBox.baseVal;
      if (box.x < -0.5 || box.x + box.width > room.width + 0.5) found.push("drawn over the edge: " + text.textContent);
    }
    out.push({ width: inside.documentElement.clientWidth, found });
    if (out.length == 2) document.body.textContent = "MEASURED" + JSON.stringify(out) + "DONE";
  };
  document.body.append(frame);
}
</script>
"""


def _browser(profile: Path) -> list[str]:
    return [
        "chromium", "--headless", "--no-sandbox", "--disable-gpu", "--no-first-run",
        "--disable-background-networking", "--hide-scrollbars", f"--user-data-dir={profile}",
    ]  # fmt: skip


def _clipped(page: str, folder: Path) -> dict[int, list[str]]:
    """Return what reaches beyond the page at each width, as a browser lays it out."""
    script = _MEASURE.replace("PAGE", json.dumps(page).replace("</", "<\\/"))
    (folder / "measure.html").write_text(
        f'<!DOCTYPE html><meta charset="utf-8"><body>{script}</body>', encoding="utf-8"
    )
    dom = subprocess.run(
        [*_browser(folder / "profile"), "--virtual-time-budget=5000", "--dump-dom", (folder / "measure.html").as_uri()],
        capture_output=True,
        text=True,
        timeout=120,
        check=True,
    ).stdout
    found = re.search(r"MEASURED(.*)DONE", dom, re.DOTALL)
    assert found is not None, dom[:500]
    return {each["width"]: each["found"] for each in json.loads(html.unescape(found[1]))}


@pytest.mark.slow
@pytest.mark.skipif(shutil.which("chromium") is None, reason="chromium is not installed")
def test_nothing_is_clipped_on_a_phone_or_on_paper(tmp_path: Path) -> None:
    """No element and no word of a drawing reaches beyond 360 px, nor beyond A4 less its margins; it prints."""
    swept = handmade.swept_band()
    long = "Weatherforecastreceiverwithoutanyblank " * 2
    own = handmade.two_bands()
    load = {"load": {"loaded_q": 37.2, "damping_resistor_ohm": 12e3}}
    own = replace(
        own,
        bands=(
            *(replace(band, name=long, contacts=("S1", "S12"), extra={**band.extra, **load}) for band in own.bands),
            replace(swept, bandwidth=234e3, drift=-120e-6, extra={**swept.extra, **load}),
        ),
    )
    page = sheet(plan(own, title=long))
    assert _clipped(page, tmp_path) == {360: [], 688: []}
    (tmp_path / "sheet.html").write_text(page, encoding="utf-8")
    paper = tmp_path / "sheet.pdf"
    subprocess.run(
        [*_browser(tmp_path / "profile"), f"--print-to-pdf={paper}", (tmp_path / "sheet.html").as_uri()],
        capture_output=True,
        timeout=120,
        check=True,
    )
    assert paper.read_bytes().startswith(b"%PDF")


@pytest.mark.slow
@pytest.mark.skipif(shutil.which("chromium") is None, reason="chromium is not installed")
@pytest.mark.parametrize("name", ["preselector", "oscillator", "eight_bands", "beacon", "receiver"])
def test_nothing_of_a_shipped_plan_is_clipped(name: str, tmp_path: Path) -> None:
    """Real plans have wider tables, longer labels and taller drawings than made up ones."""
    shipped = Path(__file__).parent.parent / "data" / "plans" / f"skerry_point_{name}.toml"
    page = sheet(solve(load_plan(str(shipped)), load_catalogue(None), top=1))
    assert _clipped(page, tmp_path) == {360: [], 688: []}
