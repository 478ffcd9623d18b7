"""Ranks under other weights."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.judgement.certainty import Certainty, any_weights, certainty, drawn_weights, groups, ranks_of
from sitescreen.judgement.other_weights import low_marks
from sitescreen.judgement.overall import Judged, judge
from sitescreen.judgement.profiles import Criterion, ZoneProfile, load_profiles
from sitescreen.judgement.uniform import uniform
from sitescreen.settings import JudgementSettings, load_defaults

DEFAULTS = load_defaults()
PROFILES = load_profiles()
TRIALS = DEFAULTS.judgement.trials

Plots = Callable[..., pd.DataFrame]
InZone = Callable[..., ZoneShares]


def own_profile(*names: str, spread_pct: float = 30.0, weight: float = 50.0) -> ZoneProfile:
    """A zone whose criteria give a reading of 0–100 as the mark."""
    criteria = tuple(
        Criterion(
            name=name, reading=name, question="own", title=name, weight=weight, weight_spread_pct=spread_pct,
            curve=((0.0, 0.0), (100.0, 100.0)), source="x",
        )
        for name in names
    )  # fmt: skip
    return ZoneProfile(zone="mine", title="Mine", wants="Anything.", criteria=criteria)


def in_mine(readings: pd.DataFrame) -> ZoneShares:
    nowhere = np.full(len(readings), 500.0)
    fits = memberships(np.full(len(readings), 50.0), nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    fits.index = readings.index
    return zone_shares(fits, ["mine"] * len(readings), DEFAULTS.zones, ["mine"])


def tried(
    readings: pd.DataFrame, profile: ZoneProfile, change: dict[str, Any] | None = None, seed: int = 20
) -> Certainty:
    zones = in_mine(readings)
    how = JudgementSettings.model_validate(DEFAULTS.judgement.model_dump() | (change or {}))
    judged = judge(readings, zones, {"mine": profile}, (), how)
    return certainty(judged, zones, {"mine": profile}, seed, 1, how)


def judged_mine(profile: ZoneProfile) -> Judged:
    readings = pd.DataFrame({one.name: [50.0] for one in profile.criteria}, index=["a"])
    return judge(readings, in_mine(readings), {"mine": profile}, (), DEFAULTS.judgement)


def marks_of(**plots: tuple[float, ...]) -> pd.DataFrame:
    names = ("one", "two", "three", "four")
    return pd.DataFrame({plot: dict(zip(names, marks, strict=False)) for plot, marks in plots.items()}).T


# --- published shares ------------------------------------------------------------------------------------------------

THREE = marks_of(A=(100.0, 0.0), B=(0.0, 100.0), C=(60.0, 60.0))


def test_shares_of_each_rank_under_all_weights() -> None:
    """Two criteria, all weights alike: A 0.4 0.1 0.5, B the same, C 0.2 0.8 0, by hand (w between 0.4 and 0.6)."""
    weight = (np.arange(10_000) + 0.5) / 10_000
    ranks = ranks_of(np.outer(weight, THREE["one"]) + np.outer(1.0 - weight, THREE["two"]))
    shares = {plot: [(ranks[:, k] == rank).mean() for rank in (1, 2, 3)] for k, plot in enumerate(THREE.index)}
    # a tie falls on no midpoint, so the shares are exact
    assert shares["A"] == pytest.approx([0.4, 0.1, 0.5], abs=1e-12)
    assert shares["B"] == pytest.approx([0.4, 0.1, 0.5], abs=1e-12)
    assert shares["C"] == pytest.approx([0.2, 0.8, 0.0], abs=1e-12)


def test_chance_of_first_under_any_weights_is_those_shares() -> None:
    found = tried(THREE, own_profile("one", "two")).table["chance_first_any_weights"]
    # four standard errors of 2,000 trials: 4·√(0.24/2000)
    assert found.tolist() == pytest.approx([0.4, 0.4, 0.2], abs=0.044)


def test_any_weights_are_even_on_the_simplex() -> None:
    """P(w1 > t) = (1 − t)^(n−1): n 4, t 0.5 → 0.125; mean ordered weights of three 11/18, 5/18, 2/18."""
    four = any_weights(judged_mine(own_profile("one", "two", "three", "four")), 7, 20_000)["mine"]
    share = four["one"] / sum(four.values())
    assert (share > 0.5).mean() == pytest.approx(0.125, abs=4 * np.sqrt(0.125 * 0.875 / 20_000))
    three = any_weights(judged_mine(own_profile("one", "two", "three")), 7, 20_000)["mine"]
    ordered = np.sort(np.array(list(three.values())) / sum(three.values()), axis=0).mean(axis=1)
    assert ordered == pytest.approx([2 / 18, 5 / 18, 11 / 18], abs=0.005)


def test_spread_of_weights_gives_the_chance_that_geometry_says() -> None:
    """Marks (100, 0) and (0, 90), weights ± 20 %: first where 1 + 0.2u > 0.9(1 + 0.2v), 0.7278 of the square u, v."""
    two = marks_of(A=(100.0, 0.0), B=(0.0, 90.0))
    table = tried(two, own_profile("one", "two", spread_pct=20.0)).table
    assert table.at["A", "chance_beats_next"] == pytest.approx(0.7278, abs=4 * np.sqrt(0.7278 * 0.2722 / TRIALS))
    assert table["chance_first"].sum() == pytest.approx(1.0)
    assert table["group"].tolist() == [1, 1], "0.73 is below 0.8"


# --- what must hold --------------------------------------------------------------------------------------------------


def test_weights_without_spread_leave_nothing_open() -> None:
    table = tried(THREE, own_profile("one", "two", spread_pct=0.0)).table
    assert table.loc["C", ["rank_low", "rank_high", "chance_first", "group"]].tolist() == [1, 1, 1.0, 1]
    assert table.loc["A", ["rank_low", "rank_high", "chance_first", "group"]].tolist() == [2, 2, 0.0, 2]


def test_weights_of_the_run_give_its_own_marks(plots: Plots) -> None:
    """Blended zones, an undecided zone and unknown readings alike."""
    readings = plots({}, {"ridge_exposure": np.nan, "elevation_m": 1400.0}, {"slope_deg": 7.0}, {"rise_m": 2.0})
    far = np.array([2.0, 400.0, 400.0, 400.0])
    nowhere = np.full(4, 500.0)
    fits = memberships(readings["elevation_m"], far, nowhere, nowhere, None, DEFAULTS.zones)
    zones = zone_shares(fits, None, DEFAULTS.zones)
    assert zones.provisional.tolist() == [False, False, True, True]
    assert (zones.shares > 0).sum(axis=1).tolist() == [1, 2, 2, 2]
    judged = judge(readings, zones, PROFILES, (), DEFAULTS.judgement)
    weights = {z: {n: np.array([w]) for n, w in one.weights.items()} for z, one in judged.by_zone.items()}
    assert low_marks(judged, zones, np.arange(4), weights)[0] == pytest.approx(judged.table["mark_low"].to_numpy())


def test_identical_plots_share_ranks_chances_and_group() -> None:
    table = tried(marks_of(A=(90.0, 20.0), B=(90.0, 20.0), C=(10.0, 10.0)), own_profile("one", "two")).table
    assert table.loc["A", ["rank_low", "rank_high", "chance_first", "group"]].tolist() == [1, 1, 1.0, 1]
    assert table.loc["B", ["rank_low", "rank_high", "chance_first", "group"]].tolist() == [1, 1, 1.0, 1]
    assert table.at["A", "chance_beats_next"] == 0.5
    assert table.loc["C", ["rank_low", "chance_top_quarter", "group"]].tolist() == [3, 0.0, 2]


def test_draws_hang_on_seed_and_name_alone() -> None:
    less = drawn_weights(judged_mine(own_profile("one", "two")), {"mine": own_profile("one", "two")}, 5, 500)["mine"]
    profile = own_profile("zero", "one", "two")
    more = drawn_weights(judged_mine(profile), {"mine": profile}, 5, 500)["mine"]
    assert np.array_equal(less["one"], more["one"])
    assert not np.array_equal(more["one"], more["two"])
    assert not np.array_equal(uniform(5, "one", 500), uniform(6, "one", 500))
    assert less["one"].min() >= 35.0
    assert less["one"].max() <= 65.0
    assert np.ptp(less["one"]) > 29.0, "the whole spread"


def test_draws_are_the_same_on_every_machine() -> None:
    """First words of Philox with the key of the first 16 bytes of SHA-256 of "20/one"; our own, kept as a fence."""
    assert uniform(20, "one", 3) == pytest.approx(FENCE, abs=1e-15)


FENCE = (0.2900271818066432, 0.6137513915843472, 0.6282760932351111)

MARK = st.one_of(st.floats(0, 100), st.just(50.0))


@given(st.lists(st.tuples(MARK, MARK, MARK), min_size=2, max_size=5), st.integers(0, 2))
@settings(max_examples=25, deadline=None)
def test_ignorance_wins_in_no_trial(rows: list[tuple[float, ...]], blank: int) -> None:
    """A twin with a reading missing has no better range and no better chance than its complete twin."""
    names = ("one", "two", "three")
    readings = pd.DataFrame([*rows, rows[0]], columns=names, index=[str(k) for k in range(len(rows) + 1)])
    readings.iloc[-1, blank] = np.nan
    table = tried(readings, own_profile(*names), {"trials": 200}).table
    whole, twin = table.iloc[0], table.iloc[-1]
    assert twin["rank_low"] >= whole["rank_low"]
    assert twin["rank_high"] >= whole["rank_high"]
    for chance in ("chance_first", "chance_top_quarter", "chance_shortlist", "chance_first_any_weights"):
        assert twin[chance] <= whole[chance]


@given(st.lists(st.tuples(MARK, MARK), min_size=3, max_size=6))
@settings(max_examples=25, deadline=None)
def test_a_third_plot_changes_no_mark_in_any_trial(rows: list[tuple[float, float]]) -> None:
    readings = pd.DataFrame(rows, columns=["one", "two"], index=[str(k) for k in range(len(rows))])
    profile = own_profile("one", "two")
    whole = judge(readings, in_mine(readings), {"mine": profile}, (), DEFAULTS.judgement)
    part = judge(readings[:2], in_mine(readings[:2]), {"mine": profile}, (), DEFAULTS.judgement)
    weights = drawn_weights(whole, {"mine": profile}, 20, 50)
    among = low_marks(whole, in_mine(readings), np.arange(len(rows)), weights)[:, :2]
    assert np.array_equal(among, low_marks(part, in_mine(readings[:2]), np.arange(2), weights))


def test_plots_set_aside_take_no_part(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {"outcome": "outside the terrain"})
    zones = in_zone(readings, "upland")
    judged = judge(readings, zones, PROFILES, (), DEFAULTS.judgement)
    found = certainty(judged, zones, PROFILES, 20, 5, DEFAULTS.judgement)
    assert found.table.loc["b"].isna().all()
    assert (found.drawn, found.ranked) == (1, 1)
    nobody = judge(readings[1:], in_zone(readings[1:], "upland"), PROFILES, (), DEFAULTS.judgement)
    none = certainty(nobody, in_zone(readings[1:], "upland"), PROFILES, 20, 5, DEFAULTS.judgement)
    assert none.notes() == ()
    assert none.table.isna().all(axis=None)


def test_of_very_many_plots_only_the_best_are_drawn() -> None:
    marks = marks_of(**{f"p{k}": (float(k), 100.0 - k / 2) for k in range(30)})
    few = {"trials_plots_most": 29, "trials_plots_least": 12}
    found = tried(marks, own_profile("one", "two"), few)
    whole = tried(marks, own_profile("one", "two"))
    assert (found.drawn, found.ranked) == (12, 30)
    drawn = found.table["rank_low"].notna()
    assert drawn.tolist() == [k >= 18 for k in range(30)]
    assert "only the 12 with the highest" in found.notes()[1].text
    assert len(whole.notes()) == 1
    assert found.table.at["p29", "chance_first"] == whole.table.at["p29", "chance_first"]
    # one with the highest possible mark and a low certain one: those left out ahead of it are still counted
    marks.loc["p0", "one"] = np.nan
    found = tried(marks, own_profile("one", "two"), few)
    assert found.table.loc["p0", ["rank_low", "rank_high"]].tolist() == [30, 30]


def test_a_group_ends_where_its_best_plot_wins_often_enough() -> None:
    steps = np.array([[5.0, 4.0, 4.5, 1.0], [5.0, 6.0, 4.5, 1.0], [5.0, 4.0, 5.5, 1.0], [5.0, 4.0, 5.5, 6.0]])
    assert groups(steps, 0.8).tolist() == [1, 1, 1, 1], "0.75, 0.5 and 0.75"
    assert groups(steps, 0.75).tolist() == [1, 2, 2, 3], "the second group's best beats the fourth in 3 of 4"
