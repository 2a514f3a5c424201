"""Where built units lie: builds against closed forms, propagation against a numerical Jacobian, corners."""

from __future__ import annotations

import itertools
import time
import tracemalloc
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from varying import on_one_coil, swept, without_strays
from workbench import CAPACITORS, plan, ranked, run, write_drawer

from partpick.built.settings import FIRST_BUILDS, SpreadSettings
from partpick.built.spread import BandSpread, SweptSpread, propagated, slopes, spread
from partpick.built.variation import CAPACITOR, NORMAL_PARTS, UNIFORM_PARTS, Variation
from partpick.request import Limits
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED

BUILDS = 200_000
SETTINGS = SpreadSettings(builds=BUILDS)
NETWORKS = {
    PARALLEL: [47e-12, 100e-12, 12e-12],
    SERIES: [220e-12, 330e-12, 470e-12],
    SHUNTED: [82e-12, 220e-12, 150e-12],
    CHAINED: [330e-12, 100e-12, 56e-12],
}


def log_slopes(variation: Variation) -> np.ndarray:
    """Central differences of ln f over each source, (S,)."""
    tank = variation.tanks[0]
    step = 1e-5 * np.eye(len(variation.sources))
    return np.log(tank.resonance(step) / tank.resonance(-step)) / 2e-5


@pytest.mark.parametrize("shape", NETWORKS)
@pytest.mark.parametrize(("inductance", "leads"), [(0.0, 0.0), (8e-9, 0.0), (8e-9, 12e-9)])
def test_propagation_follows_the_numerical_jacobian(shape: int, inductance: float, leads: float) -> None:
    """Every shape of network, with and without the inductance of capacitors and leads."""
    variation = on_one_coil([NETWORKS[shape]], shape=shape, leads=leads, series_inductances=(inductance,) * 3)
    tank = variation.tanks[0]
    assert slopes(variation, tank) == pytest.approx(log_slopes(variation), rel=1e-6, abs=1e-12)


@pytest.mark.parametrize("padder", [None, 220e-12])
def test_propagation_of_a_swept_band_follows_the_numerical_jacobian(padder: float | None) -> None:
    """At its upper end: tuning element and series padder among the sources."""
    variation = swept(on_one_coil([[27e-12]]), low=12e-12, high=150e-12, padder=padder, wanted=0.9)
    assert slopes(variation, variation.tanks[0]) == pytest.approx(log_slopes(variation), rel=1e-6, abs=1e-12)


def test_a_swept_band_is_right_where_both_ends_are_reached() -> None:
    """All spread in the coil: covered is L from (f_up/wanted)^2 to (f_low/wanted)^2 of nominal, a share of 2 a."""
    size, wanted = 0.10, 0.94
    exact = without_strays(on_one_coil([[27e-12]], coil_size=size, part_size=0.0))
    variation = swept(exact, low=12e-12, high=150e-12, size=0.0, wanted=wanted)
    upper = variation.tanks[0]
    lower = upper.low_end
    assert lower is not None
    nothing = np.zeros((len(variation.sources), 1))
    most = (float(upper.resonance(nothing)[0]) / upper.frequency) ** 2 - 1
    least = 1 - (float(lower.resonance(nothing)[0]) / lower.frequency) ** 2
    found = spread(variation, Limits(), SETTINGS, variation.draw(BUILDS, 1), counted=True)
    own = found.bands[0]
    assert isinstance(own, SweptSpread)
    assert own.covers == found.inside == pytest.approx((most + least) / (2 * size), abs=0.005)
    assert own.worst_low > own.low and own.worst_high < own.high


def test_two_uniform_tolerances_spread_as_their_closed_form() -> None:
    """(L/L0)(C/C0) of two uniform factors: mean square of 1/(x y) is the product of two one-line integrals."""
    coil, part = 0.2, 0.1
    variation = without_strays(on_one_coil([[100e-12]], coil_size=coil, part_size=part))
    tank = variation.tanks[0]
    ratio = (tank.resonance(variation.draw(BUILDS, 1)) / tank.frequency) ** 2
    expected = np.prod([np.log((1 + a) / (1 - a)) / (2 * a) for a in (coil, part)])  # E 1/(1 + u), u uniform
    square = np.prod([1 / (1 - a**2) for a in (coil, part)])  # E 1/(1 + u)^2
    deviation = np.sqrt(square - expected**2)
    assert ratio.mean() == pytest.approx(expected, abs=5 * deviation / BUILDS**0.5)
    assert ratio.std() == pytest.approx(deviation, rel=0.01)


def test_one_uniform_tolerance_gives_its_share_in_closed_form() -> None:
    """|f - f0| <= e f0 is L from L0/(1 + e)^2 to L0/(1 - e)^2, of the 2 a L0 that there are."""
    size, limit = 0.05, 0.005
    variation = without_strays(on_one_coil([[100e-12]], coil_size=size, part_size=0.0))
    found = spread(variation, Limits(error=limit), SETTINGS, variation.draw(BUILDS, 1), counted=True).bands[0]
    expected = ((1 - limit) ** -2 - (1 + limit) ** -2) / (2 * size)
    assert isinstance(found, BandSpread) and found.inside is not None
    assert found.inside == pytest.approx(expected, abs=5 * np.sqrt(expected / BUILDS))
    assert found.low == pytest.approx((1 + 0.9 * size) ** -0.5 - 1, rel=0.01)  # 5 % have L above
    assert found.high == pytest.approx((1 - 0.9 * size) ** -0.5 - 1, rel=0.01)


def test_normal_tolerances_spread_as_a_normal_sum() -> None:
    """Small normal deviations: ln f is normal with half the root of the sum of squares, 1.645 of it at 5 %."""
    variation = without_strays(on_one_coil([[100e-12]], coil_size=0.02, part_size=0.01))
    draws = variation.draw(BUILDS, 3, NORMAL_PARTS)
    settings = replace(SETTINGS, parts=NORMAL_PARTS)
    found = spread(variation, Limits(error=0.005), settings, draws, counted=True).bands[0]
    assert isinstance(found, BandSpread)
    sigma = 0.5 * np.hypot(0.01, 0.005)  # a tolerance is two standard deviations
    assert found.deviation == pytest.approx(sigma, rel=1e-9)
    assert (found.low, found.high) == pytest.approx((-1.645 * sigma, 1.645 * sigma), rel=0.02)


@pytest.mark.parametrize("parts", [UNIFORM_PARTS, NORMAL_PARTS])
@pytest.mark.parametrize("off", [0.0, 0.004, -0.01])
def test_propagated_ranges_agree_with_counted_ones(parts: str, off: float) -> None:
    """Two ways to one figure, also for a band that is off its target."""
    variation = on_one_coil([[47e-12, 12e-12]], coil_size=0.01, part_size=0.02, stray_size=0.05, off=off)
    draws = variation.draw(BUILDS, 7, parts)
    settings = replace(SETTINGS, parts=parts)
    (counted,) = spread(variation, Limits(error=0.005), settings, draws, counted=True).bands
    (first_order,) = spread(variation, Limits(error=0.005), settings, draws, counted=False).bands
    assert isinstance(counted, BandSpread) and isinstance(first_order, BandSpread)
    assert counted.counted and not first_order.counted
    assert counted.low == pytest.approx(first_order.low, abs=3e-4)
    assert counted.high == pytest.approx(first_order.high, abs=3e-4)
    assert counted.inside == pytest.approx(first_order.inside, abs=0.01)


@pytest.mark.parametrize("shape", NETWORKS)
def test_no_corner_is_worse_than_the_worst_case(shape: int) -> None:
    """All 2^6 corners of a band: the resonance falls with every part, so two of them are the ends."""
    variation = on_one_coil([NETWORKS[shape]], shape=shape)
    tank = variation.tanks[0]
    signs = np.array(list(itertools.product((-1.0, 1.0), repeat=len(variation.sources)))).T
    every = tank.resonance(signs * variation.sizes[:, None]) / tank.frequency - 1
    (found,) = spread(variation, Limits(), SETTINGS, variation.draw(1000, 1), counted=False).bands
    assert isinstance(found, BandSpread)
    assert (found.worst_low, found.worst_high) == pytest.approx((every.min(), every.max()), rel=1e-12)


def test_a_shared_coil_keeps_bands_together() -> None:
    """With all spread in one coil, every band is right in the same units; on parts alone, chances multiply."""
    together = without_strays(on_one_coil([[100e-12], [220e-12]], coil_size=0.05, part_size=0.0))
    apart = without_strays(on_one_coil([[100e-12], [220e-12]], coil_size=0.0, part_size=0.05))
    for variation, power in ((together, 1), (apart, 2)):
        found = spread(variation, Limits(error=0.01), SETTINGS, variation.draw(BUILDS, 1), counted=True)
        one = found.bands[0]
        assert isinstance(one, BandSpread) and one.inside is not None
        assert found.inside == pytest.approx(one.inside**power, abs=0.005)


def test_a_batch_widens_a_band_of_equal_capacitors() -> None:
    """Two equal capacitors of one batch err together: 0.05 instead of 0.05/sqrt(2) of their sum."""
    variation = without_strays(on_one_coil([[100e-12, 100e-12]], coil_size=0.0))
    tank = variation.tanks[0]
    alone, batch = (np.log(tank.resonance(variation.draw(BUILDS, 1, batch=rho))).std() for rho in (0.0, 1.0))
    assert batch / alone == pytest.approx(2**0.5, rel=0.01)
    normal = np.log(tank.resonance(variation.draw(BUILDS, 1, NORMAL_PARTS, batch=1.0))).std()
    assert normal == pytest.approx(0.5 * 0.05 / 2, rel=0.02)


def test_the_same_seed_gives_the_same_builds() -> None:
    """A result must not change by itself; another seed is another sample."""
    variation = on_one_coil([[100e-12]])
    for how in ({}, {"parts": NORMAL_PARTS}, {"batch": 0.5}):
        one, again, other = (variation.draw(500, seed, **how) for seed in (4, 4, 5))  # type: ignore[arg-type]
        assert (one == again).all() and (one != other).any()


def test_no_part_is_ever_less_than_nothing() -> None:
    """A tolerance of 100 % is read from a drawer; corners and normal tails keep the capacitance positive."""
    variation = on_one_coil([[100e-12, 47e-12]], part_size=1.0, shape=SERIES)
    tank = variation.tanks[0]
    for x in (variation.corners, variation.draw(20_000, 1, NORMAL_PARTS)):
        assert np.isfinite(tank.resonance(x)).all()


def test_sixteen_bands_are_counted_in_half_a_second() -> None:
    """100,000 builds of 16 bands with two capacitors each: at most 0.5 s and 200 MB."""
    variation = on_one_coil([[100e-12 + 10e-12 * band, 47e-12] for band in range(16)])
    tracemalloc.start()
    draws = variation.draw(100_000, 1)
    spread(variation, Limits(error=0.005), SETTINGS, draws, counted=True)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 200e6
    took = []
    for _ in range(3):  # the least of three: other work on the machine only adds
        began = time.process_time()
        spread(variation, Limits(error=0.005), SETTINGS, variation.draw(100_000, 1), counted=True)
        took.append(time.process_time() - began)
    assert min(took) < 0.5


def test_a_band_without_spread_is_right_or_wrong() -> None:
    """No tolerance: every unit is the nominal one."""
    for off, share in ((0.001, 1.0), (0.02, 0.0)):
        variation = on_one_coil([[100e-12]], coil_size=0.0, part_size=0.0, stray_size=0.0, off=off)
        tank = variation.tanks[0]
        assert propagated(variation, tank, UNIFORM_PARTS, 0.005)[3] == share
        assert propagated(variation, tank, NORMAL_PARTS, 0.005)[3] == share


# ---------------------------------------------------------------- from outside


@pytest.fixture
def drawer(tmp_path: Path) -> Path:
    return write_drawer(tmp_path / "drawer")


def test_every_candidate_tells_its_spread(drawer: Path) -> None:
    """The first is counted in many builds, the others come by propagation; ends hold the range."""
    found = ranked("pair", "7.1MHz", "--drawer", drawer, "--error", "8 %")
    assert len(found) > 1
    for candidate in found:
        own = candidate["bands"][0]["spread"]
        assert own["error_least"] < own["error_5_percent"] < own["error_95_percent"] < own["error_most"]
        assert own["method"] == ("counted" if candidate["rank"] == 1 else "propagated")
        assert 0.0 <= own["share_inside"] <= 1.0
    assert found[0]["spread"]["builds"] == FIRST_BUILDS


def test_a_swept_band_tells_the_share_that_covers(drawer: Path) -> None:
    """A default tolerance of the tuning element is told; a closer one lets more units cover."""
    job = ["pair", "7.0MHz..7.3MHz", "--drawer", drawer]
    shares = []
    for tuning in ("variable capacitor:low=5pF;high=60pF", "variable capacitor:low=5pF;high=60pF;tolerance=1%"):
        found = ranked(*job, "--tuning", tuning)[0]
        own = found["bands"][0]["spread"]
        assert own["tuned_low_most_hz"] >= own["tuned_low_95_percent_hz"]
        assert own["tuned_high_least_hz"] <= own["tuned_high_5_percent_hz"]
        told = any("tuning.tolerance not stated: 5 %" in text for text in found["warnings"])
        assert told == ("tolerance" not in tuning)
        shares.append(own["share_covering"])
    assert 0 < shares[0] <= shares[1] <= 1


def test_the_plan_says_how_builds_are_drawn(drawer: Path, tmp_path: Path) -> None:
    """[spread] sets number, seed, distribution and batch; a closer distribution lets more units in."""
    tables = [f'[limits]\nerror = "8 %"\n[spread]\nbuilds = 4000\nparts = "{how}"\n' for how in ("uniform", "normal")]
    found = [
        ranked("bands", plan(tmp_path / f"{i}.toml", [("beacon", "7.1 MHz")], head), "--drawer", drawer)[0]
        for i, head in enumerate(tables)
    ]
    assert [each["spread"]["builds"] for each in found] == [4000, 4000]
    assert found[0]["bands"][0]["spread"]["standard_deviation"] > found[1]["bands"][0]["spread"]["standard_deviation"]


def test_a_missing_tolerance_takes_the_default_of_the_grade_and_says_so(tmp_path: Path) -> None:
    """Never a silent zero: without a tolerance the spread is that of 5 %, and a warning names the default."""
    rows = [{k: v for k, v in row.items() if k != "tolerance"} for row in CAPACITORS]
    stated, missing = write_drawer(tmp_path / "stated"), write_drawer(tmp_path / "missing", capacitors=rows)
    one, other = (ranked("pair", "7.1MHz", "--drawer", d, "--error", "8 %")[0] for d in (stated, missing))
    assert one["bands"][0]["spread"] == other["bands"][0]["spread"]
    assert not any("tolerance" in text for text in one["warnings"])
    assert any("tolerance not stated" in text for text in other["warnings"])
    capacitor = next(each for each in other["sensitivity"] if each["kind"] == CAPACITOR)
    assert capacitor["tolerance"] == 0.05  # common practice, no source


def test_the_table_tells_what_built_units_do(drawer: Path) -> None:
    """On the bench the figures stand under the best candidate, in 80 columns."""
    out = run("pair", "7.1MHz", "--drawer", drawer, "--error", "8 %").out
    assert "9 of 10 units" in out and "Worth having closer" in out
    assert max(map(len, out.splitlines())) <= 80
