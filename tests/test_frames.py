"""Results as DataFrames: the examples run, and figures are those of the result."""

from __future__ import annotations

import doctest

import handmade

from partpick import frames


def test_the_examples_of_the_documentation_run() -> None:
    """An example that has stopped working is worse than none."""
    done = doctest.testmod(frames)
    assert done.attempted >= 10 and done.failed == 0


def test_every_band_and_piece_has_a_row_in_rank_order() -> None:
    """A notebook groups by rank and expects nothing to be missing."""
    result = handmade.result(
        handmade.two_bands(1), handmade.two_bands(2), request=handmade.request("beacon", "weather")
    )
    bands, parts, ranked = frames.bands(result), frames.parts(result), frames.candidates(result)
    assert list(ranked["rank"]) == [1, 2] and list(bands["rank"]) == [1, 1, 2, 2]
    assert list(bands["name"]) == ["beacon", "weather"] * 2
    assert list(parts.loc[parts["rank"] == 1, "reference"]) == ["C1", "C2", "C3", "C4", "C5", "L1"]
    own = handmade.two_bands().bands
    assert list(bands["resonance_hz"][:2]) == [band.resonance for band in own]
    assert list(bands["capacitors"][:2]) == ["C1 C2", "C3 C4 C5"]
    assert list(parts["bands"][5:6]) == ["beacon; weather"]


def test_nothing_that_fits_is_an_empty_frame_with_its_columns() -> None:
    """A notebook that filters by a column must not fail because nothing fits."""
    nothing = handmade.nothing()
    for frame, column in (
        (frames.candidates(nothing), "worst_error_ppm"),
        (frames.front(nothing), "piece_count"),
        (frames.bands(nothing), "resonance_hz"),
        (frames.parts(nothing), "value_f"),
    ):
        assert len(frame) == 0 and column in frame.columns
