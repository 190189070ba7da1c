"""What is usual, learnt from data that hold wrong entries; and who is wrong more often."""

from __future__ import annotations

import math

import numpy as np
import pytest

from generator import neighbours, reliability, spreads
from generator.neighbours import Sketch
from generator.outcome import CHECKS, YES_OR_NO, Outcome


def comparison(check: str, found: float, expected: float, group: str = "all") -> Outcome:
    return Outcome(check, group, ("a", "b"), np.asarray(found), np.asarray(expected), 0.0, "", "")


def test_one_in_ten_wrong_entries_does_not_widen_a_spread() -> None:
    rng = np.random.default_rng(7)
    sound = rng.normal(0.0, 1.0, 900)
    wrong = rng.choice([-50.0, 50.0], 100)
    assert spreads.robust([*sound, *wrong]).spread == pytest.approx(1.2, abs=0.15)
    assert spreads.robust(sound).spread == pytest.approx(1.0, abs=0.08)


def test_nothing_to_learn_from() -> None:
    assert spreads.robust([]) == spreads.Spread(0.0, 0.0, 0)
    assert spreads.robust([math.nan, math.inf]).count == 0


def test_groups_are_learnt_where_they_are_large_and_lean_where_they_are_small() -> None:
    rng = np.random.default_rng(3)
    far = rng.normal(0, 0.05, 15)
    found = [comparison("refraction", 1 + x, 1.0, "wide") for x in far]
    found += [comparison("refraction", 1 + x, 1.0, "narrow") for x in rng.normal(0, 0.01, 400)]
    found += [comparison("refraction", 1.0, 1.0, "few")] * 3
    learnt = spreads.learn([spreads.compared(found)])
    assert ("refraction", "few") not in learnt
    assert learnt["refraction", "narrow"].spread == pytest.approx(0.01, rel=0.25)
    assert 0.02 < learnt["refraction", "wide"].spread < spreads.robust(np.log1p(far)).spread
    assert learnt["refraction", spreads.ALL].count == 418


def test_bounds_are_not_learnt() -> None:
    learnt = spreads.learn([spreads.compared([comparison("order", 5.0, 0.0)] * 50)])
    assert learnt == {}
    usual = spreads.Spreads({}).of("order", "melting_point")
    assert usual.spread == CHECKS["order"].resolution


def test_a_spread_never_falls_below_what_is_worth_a_readers_time() -> None:
    same = spreads.spreads_for([spreads.compared([comparison("boiling-points", 80.0, 80.0)] * 500)])
    assert same.of("boiling-points", "all").spread >= CHECKS["boiling-points"].resolution * 0.94


def test_every_check_that_compares_numbers_has_a_limit_on_the_page() -> None:
    listed = {t.check for t in spreads.thresholds(spreads.spreads_for([]))}
    assert listed == {c.name for c in CHECKS.values() if c.unit != YES_OR_NO}
    for threshold in spreads.thresholds(spreads.spreads_for([])):
        assert threshold.limit == pytest.approx(spreads.LIMIT * threshold.spread)
        assert threshold.spread > 0, threshold


def test_outvoted_by_others_of_one_mind() -> None:
    values = [("a", 80.0), ("b", 80.5), ("c", 79.8), ("d", 120.0)]
    assert dict(reliability.outvoted("boiling_point", values)) == {"d": True}
    split = [("a", 80.0), ("b", 81.0), ("c", 120.0), ("d", 121.0)]
    assert dict(reliability.outvoted("boiling_point", split)) == {}
    assert dict(reliability.outvoted("boiling_point", values[:2])) == {}


def test_sources_that_are_outvoted_more_often_are_doubted_sooner() -> None:
    assert reliability.proneness("melting_point", "nist-webbook") > 0
    assert reliability.proneness("boiling_point", "yaws-boiling-points") < 0
    assert reliability.proneness("melting_point", "the laboratory") == 0.0


def _sketch(slug: str, size: float, remainder: float, figure: str = "", family: str = "") -> Sketch:
    figures = (("table", figure),) if figure else ()
    return Sketch(slug, "esters", size, {"boiling_point": remainder}, family, figures)


def test_a_series_says_what_its_members_have_in_common() -> None:
    members = [_sketch(f"m{i}", 2.0 + 0.1 * i, 0.050 + 0.001 * i) for i in range(6)]
    stray = _sketch("stray", 2.25, -0.3)
    shift, error = neighbours.series_of([*members, stray])["stray"]["boiling_point"]
    assert shift == pytest.approx(0.052, abs=0.002)
    assert error < 0.005
    assert neighbours.series_of(members[:3])["m0"] == {}  # two neighbours are none


def test_members_far_apart_say_nothing() -> None:
    members = [_sketch(f"m{i}", 2.0 + 0.01 * i, (-1) ** i * 0.2 + 0.001 * i) for i in range(8)]
    assert all(not shifts for shifts in neighbours.series_of(members).values())


def test_one_figure_for_unrelated_liquids_is_counted() -> None:
    families = ("esters", "ethers", "ketones", "ketones")
    found = neighbours.surroundings(
        [_sketch(f"s{i}", 1.0, 0.0, "2e-06", family) for i, family in enumerate(families)]
        + [_sketch("own", 1.0, 0.0, "3.1e-07", "esters")]
    )
    assert found["s0"].repeats == (3,)
    assert found["own"].repeats == (0,)
    related = [_sketch(f"r{i}", 1.0, 0.0, "1e-04", "alcohols") for i in range(5)]
    assert neighbours.surroundings(related)["r0"].repeats == (0,)
