"""Weighing the questions anew in the page: the program's own arithmetic, and the words for it."""

from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.overall import judge
from sitescreen.settings import load_defaults

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]

HALVED = ("ventilation", "ridge_exposure", "sheltered_fraction")
QUESTIONS = ("breeze", "wind", "cold", "sun", "ground")
STOPS = (0.0, 0.5, 1.0, 2.0, 4.0)


def tangled(invent: Any, count: int = 60) -> Any:
    """Plots with unknown readings, one to three zones each, some of them undecided, ties, and an assumed wind."""
    rng = np.random.default_rng(11)
    made = invent(names=tuple(f"Field {i}" for i in range(count)))
    profiles = made.profiles
    readings = made.table.drop(columns=[c for c in made.table if c.startswith("mark_")]).set_index("plot")
    for profile in profiles.values():
        for one in profile.criteria:
            if isinstance(one.curve[0][0], float):
                ends = [point[0] for point in one.curve]
                value = rng.uniform(min(ends), max(ends), count)
                readings[one.reading] = np.where(rng.random(count) < 0.2, np.nan, value)
    names = list(profiles)
    shares = pd.DataFrame(0.0, index=readings.index, columns=names)
    for row in range(count):
        held = rng.choice(len(names), size=rng.integers(1, 4), replace=False)
        shares.iloc[row, held] = rng.dirichlet(np.ones(len(held)))
    for row in range(10, 20):  # ties
        readings.iloc[row] = readings.iloc[row - 10]
        shares.iloc[row] = shares.iloc[row - 10]
    readings["outcome"] = ["no ground" if row in (3, 40) else "" for row in range(count)]
    zone = pd.Series(np.array(names, dtype=object)[shares.to_numpy().argmax(axis=1)], index=readings.index)
    undecided = pd.Series([5 <= row % 20 < 9 for row in range(count)], index=readings.index)
    nothing = pd.Series(data=False, index=readings.index)
    zones = ZoneShares(
        shares, zone, shares.max(axis=1), nothing, undecided, pd.Series("", index=readings.index), nothing
    )
    judged = judge(readings, zones, profiles, (), load_defaults().judgement, HALVED)
    kept = readings.drop(columns=[c for c in judged.table if c in readings]).reset_index()
    table = pd.concat([kept, judged.table.reset_index(drop=True)], axis=1)
    order = table["rank"].astype("Float64").fillna(np.inf).to_numpy(dtype=np.float64).argsort(kind="stable")
    plots = made.table.iloc[:0].copy()  # the frame of a table with shapes
    plots = type(plots)(table, geometry="geometry", crs="EPSG:4326").iloc[order].reset_index(drop=True)
    return made.with_(table=plots, judged=judged, zones=zones, reasons={}), readings


def by_program(screening: Any, readings: Any, factors: dict[str, float]) -> pd.DataFrame:
    profiles = {
        zone: profile.model_copy(
            update={
                "criteria": [
                    c.model_copy(update={"weight": c.weight * factors.get(c.question, 1.0)}) for c in profile.criteria
                ]
            }
        )
        for zone, profile in screening.profiles.items()
    }
    table = judge(readings, screening.zones, profiles, (), load_defaults().judgement, HALVED).table
    return table.loc[screening.table["plot"]]


def numbers(values: Any) -> Any:
    return np.array([np.nan if value is None else float(value) for value in values])


def test_the_page_comes_to_the_programs_marks_and_ranks(read: Any, invent: Any) -> None:
    """Over random weights, with gaps, halved weights, shared and undecided zones, and ties: ranks are identical."""
    screening, readings = tangled(invent)
    page = read(screening)
    rng = np.random.default_rng(5)
    trials = [dict.fromkeys(QUESTIONS, 1.0), dict.fromkeys(QUESTIONS, 0.0)]
    trials += [dict(zip(QUESTIONS, rng.choice(STOPS, 5).tolist(), strict=True)) for _ in range(12)]
    trials += [dict(zip(QUESTIONS, rng.uniform(0.0, 5.0, 5).tolist(), strict=True)) for _ in range(8)]
    shared = 0
    for factors in trials:
        got = page.run("return weigh.marks(arguments[0])", factors)
        expected = by_program(screening, readings, factors)
        is_ranked = screening.table["rank"].notna().to_numpy()
        for ours, theirs in (("mark", "overall_mark"), ("low", "mark_low"), ("high", "mark_high")):
            wanted = np.where(is_ranked, expected[theirs].to_numpy(dtype=np.float64), np.nan)
            np.testing.assert_allclose(numbers(got[ours]), wanted, rtol=0, atol=1e-9)
        for ours, theirs in (("rank", "rank"), ("rankInZone", "rank_in_zone")):
            wanted = expected[theirs].astype("Float64").to_numpy(dtype=np.float64, na_value=np.nan)
            np.testing.assert_array_equal(numbers(got[ours]), wanted)
        ranks = numbers(got["rank"])
        shared += len(ranks) - len(np.unique(ranks))
    assert shared > 100  # ties were among them
    assert page.problems() == []


def test_a_weight_changes_answer_ladder_map_and_table_together(read: Any, screening: Any) -> None:
    page = read(screening)
    first = page.text("#answer")
    page.press("input[name=weight-breeze][value='0']")
    marks = page.run("return weigh.marks({ breeze: 0 })")
    order = [screening.table["name"][i] for i in marks["order"]]
    assert page.text("#answer").startswith(f"With breeze not counting, {order[0]} (plot ")
    assert page.text("#change").startswith("Breeze does not count: ")
    assert [text.split(" plot ")[0] for text in page.texts("#rows td.plot")] == order
    in_ladder = page.texts("#ladder-list .name")
    assert set(order[:3]) <= set(in_ladder)
    assert page.text("#weighed") == "weighed as set here"
    page.press("#back")
    assert page.text("#answer") == first
    assert page.text("#change").startswith("Back to the zone profile: ")
    assert page.text("#leaf .leaf-top .place").startswith("1st of 10")
    assert page.problems() == []


def test_certainty_is_grey_while_other_weights_hold(read: Any, tried: Any) -> None:
    page = read(tried)
    drawn = "return getComputedStyle(document.querySelector('{} .sure')).textDecorationLine"
    colour = drawn.format("#ladder-list")
    sure = page.text("#sure")
    assert sure.startswith("First place is firm")
    assert page.run(colour) == "none"
    page.press("input[name=weight-ground][value='4']")
    assert page.run(colour) == "line-through"
    assert "for these it is not known" in page.text("#sure")
    assert page.run(drawn.format("#leaf")) == "line-through"
    page.press("#back")
    assert page.run(colour) == "none"
    assert page.text("#sure") == sure


def test_with_nothing_counting_no_plot_has_a_rank(read: Any, screening: Any) -> None:
    page = read(screening)
    for question in page.run("return Object.keys(weigh.stops)"):
        page.press(f"input[name=weight-{question}][value='0']")
    assert "no plot can be ranked" in page.text("#answer")
    assert page.texts("#ladder-list li") == []
    assert set(page.texts("#rows td.rank")) == {"–"}
    assert page.problems() == []
