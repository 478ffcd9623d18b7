"""Marks, ranks and chances under draws of the data."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.certainty import Certainty, Varied, certainty
from sitescreen.judgement.drawn_marks import drawn_marks
from sitescreen.judgement.draws import NO_DRAWS, ReadingDraws
from sitescreen.judgement.marks import mark
from sitescreen.judgement.other_weights import low_marks
from sitescreen.judgement.overall import Judged, judge
from sitescreen.judgement.profiles import ZoneProfile, load_profiles
from sitescreen.settings import load_defaults

DEFAULTS = load_defaults()
PROFILES = load_profiles()
RULES = load_cautions()
DRAWS = 100

Plots = Callable[..., pd.DataFrame]
InZone = Callable[..., ZoneShares]


def sure_of(
    readings: pd.DataFrame,
    zones: ZoneShares,
    draws: ReadingDraws,
    shortlist: int = 1,
    profiles: dict[str, ZoneProfile] = PROFILES,
) -> Certainty:
    judged = judge(readings, zones, profiles, RULES, DEFAULTS.judgement)
    varied = (Varied("the terrain's error", "the slope"),)
    return certainty(judged, zones, profiles, 20, shortlist, DEFAULTS.judgement, draws, RULES, varied)


def drawn_again(readings: pd.DataFrame, draws: ReadingDraws, number: int) -> pd.DataFrame:
    """The readings of one draw, as a run would have read them."""
    return readings.assign(**{name: draws.of(name, readings[name].to_numpy())[:, number] for name in draws.values})


def run_weights(judged: Judged, count: int) -> dict[str, dict[str, np.ndarray]]:
    return {z: {n: np.full(count, w) for n, w in one.weights.items()} for z, one in judged.by_zone.items()}


def test_each_draw_is_judged_as_a_run_of_its_own(plots: Plots) -> None:
    """Blended zones, an undecided zone, unknown readings, readings that others follow from, and stops."""
    changes = [{"ridge_exposure": np.nan, "elevation_m": 1400.0}, {"slope_deg": 7.0}, {"rise_m": np.nan}]
    readings = plots({}, *changes, {"aspect_deg": np.nan})
    far = np.array([2.0, 400.0, 400.0, 400.0, 2.0])
    nowhere = np.full(5, 500.0)
    fits = memberships(readings["elevation_m"], far, nowhere, nowhere, None, DEFAULTS.zones)
    zones = zone_shares(fits, None, DEFAULTS.zones)
    assert zones.provisional.any()
    assert (zones.shares > 0).sum(axis=1).max() > 1
    rng = np.random.default_rng(1)
    slope = rng.uniform(0.0, 20.0, (5, 12))
    slope[2, 3] = np.nan  # nothing drawn: the run's own holds
    draws = ReadingDraws({"slope_deg": slope, "ridge_exposure": rng.uniform(0.5, 2.0, (5, 12)), "cold_deficit_k": rng.uniform(0, 4, (5, 12))})  # fmt: skip  # noqa: E501
    judged = judge(readings, zones, PROFILES, RULES, DEFAULTS.judgement)
    rows = np.array([3, 1, 0, 4, 2])
    data = drawn_marks(judged, zones, PROFILES, RULES, draws, rows)
    found = low_marks(judged, zones, rows, run_weights(judged, 12), data, np.arange(12))
    for number in range(12):
        again = judge(drawn_again(readings, draws, number), zones, PROFILES, RULES, DEFAULTS.judgement).table
        expected = np.where(again["set_aside"] == "", again["mark_low"], -np.inf)[rows]
        assert found[number] == pytest.approx(expected, abs=1e-9)
    assert np.isinf(found).any()
    assert np.isfinite(found).any(axis=1).all()


def test_data_without_error_spread_nothing(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {"slope_deg": 6.0}, {"ridge_exposure": 1.4}, {"sky_view": 0.9})
    zones = in_zone(readings, "upland")
    same = ReadingDraws({"slope_deg": np.repeat(readings[["slope_deg"]].to_numpy(), DRAWS, axis=1)})
    found, alone = sure_of(readings, zones, same).table, sure_of(readings, zones, NO_DRAWS).table
    rank = judge(readings, zones, PROFILES, RULES, DEFAULTS.judgement).table["rank"].astype(float)
    assert found["rank_low_data"].tolist() == found["rank_high_data"].tolist() == rank.tolist()
    for name in ("rank_low", "rank_high", "chance_first", "chance_beats_next", "group"):
        pd.testing.assert_series_equal(found[name], alone[name])
    assert found["rank_low_weights"].tolist() == alone["rank_low"].tolist()
    assert alone["rank_low_data"].isna().all()
    assert (found["chance_set_aside"] == 0.0).all()


def test_a_plot_beside_a_marginal_sill_has_a_mark_with_two_peaks(plots: Plots, in_zone: InZone) -> None:
    """In 40 of 100 draws the sill holds and the air is 3 K colder; in the others there is no pool; nothing between."""
    readings = plots({"cold_deficit_k": 0.0})
    zones = in_zone(readings, "upland")
    holds = np.arange(DRAWS) % 5 < 2
    draws = ReadingDraws({"cold_deficit_k": np.where(holds, 3.0, 0.0)[None, :]})
    judged = judge(readings, zones, PROFILES, RULES, DEFAULTS.judgement)
    data = drawn_marks(judged, zones, PROFILES, RULES, draws, np.array([0]))
    found = low_marks(judged, zones, np.array([0]), run_weights(judged, DRAWS), data, np.arange(DRAWS))[:, 0]
    cold = PROFILES["upland"].by_name["cold"]
    lost = cold.weight / sum(one.weight for one in PROFILES["upland"].criteria) * (100.0 - mark(3.0, cold).item())
    assert sorted(set(found.round(9))) == pytest.approx([judged.table["mark_low"].iloc[0] - lost, judged.table["mark_low"].iloc[0]])  # fmt: skip  # noqa: E501
    assert (found < found.max()).sum() == 40


def test_errors_that_plots_share_leave_their_order_firm(plots: Plots, in_zone: InZone) -> None:
    """The same draw serves all plots: both go up and down, and the better one stays ahead in each."""
    readings = plots({"ridge_exposure": 1.0}, {"ridge_exposure": 1.1})
    zones = in_zone(readings, "upland")
    error = np.random.default_rng(2).normal(0.0, 0.1, DRAWS)
    shared = np.stack([1.0 + error, 1.1 + error])
    found = sure_of(readings, zones, ReadingDraws({"ridge_exposure": shared})).table
    assert found["rank_high_data"].tolist() == [1.0, 2.0]
    assert (found["drawn_mark_high"] - found["drawn_mark_low"] > 5.0).all(), "each mark is far from sure"
    assert found["drawn_mark_high"].iloc[1] > found["drawn_mark_low"].iloc[0]
    own = np.stack([1.0 + error, 1.1 + error[::-1]])
    apart = sure_of(readings, zones, ReadingDraws({"ridge_exposure": own})).table
    assert apart["rank_high_data"].tolist() == [2.0, 2.0]


def test_the_chance_of_being_set_aside_is_the_share_of_draws(plots: Plots, in_zone: InZone) -> None:
    """The best plot is too steep in 30 of 100 draws; one that is set aside would pass in 25."""
    readings = plots({"slope_deg": 2.0}, {"slope_deg": 9.0}, {"slope_deg": 20.0}, {"outcome": "outside the terrain"})
    zones = in_zone(readings, "savannah")
    slope = np.repeat(readings[["slope_deg"]].to_numpy(), DRAWS, axis=1)
    slope[0, :30] = 25.0
    slope[2, 50:75] = 9.0
    table = sure_of(readings, zones, ReadingDraws({"slope_deg": slope}), shortlist=3).table
    assert table["chance_set_aside"].tolist()[:3] == [0.3, 0.0, 0.75]
    assert np.isnan(table["chance_set_aside"].iloc[3])
    assert table["chance_first"].tolist()[:2] == pytest.approx([0.7, 0.3])
    assert table["chance_shortlist"].tolist()[:2] == pytest.approx([0.7, 1.0]), "k 3, but it is not listed when stopped"
    assert table["chance_first_in_zone"].iloc[0] == pytest.approx(0.7)
    assert np.isnan(table["drawn_mark_low"].iloc[0]), "in over one of twenty trials it has no mark"
    assert table["rank_high"].iloc[0] == 2.0


def test_of_a_plot_that_no_draw_touched_no_chance_is_told(plots: Plots, in_zone: InZone) -> None:
    """Set aside, and its slope never drawn: 1 would claim what nobody looked at. A drawn twin has its share."""
    readings = plots({}, {"slope_deg": 20.0}, {"slope_deg": 20.0})
    zones = in_zone(readings, "savannah")
    slope = np.full((3, DRAWS), np.nan)
    slope[0], slope[2] = 3.0, np.where(np.arange(DRAWS) < 20, 9.0, 25.0)
    found = sure_of(readings, zones, ReadingDraws({"slope_deg": slope})).table
    assert found["chance_set_aside"].tolist() == pytest.approx([0.0, np.nan, 0.8], nan_ok=True)


def test_both_kinds_of_doubt_are_told_apart_and_together(
    plots: Plots, in_zone: InZone, cold_and_slope: dict[str, ZoneProfile]
) -> None:
    pairs = ((0.0, 8.0), (1.0, 3.0), (2.0, 0.0), (0.5, 5.0))  # marks of 80, 80, 75 and 81.25
    readings = plots(*({"cold_deficit_k": cold, "slope_deg": slope} for cold, slope in pairs))
    zones = in_zone(readings, "upland")
    draws = ReadingDraws({"slope_deg": np.random.default_rng(4).uniform(0.0, 10.0, (4, DRAWS))})
    sure = sure_of(readings, zones, draws, profiles=cold_and_slope)
    record = sure.for_record()
    assert record["data_draws"] == DRAWS
    assert record["varied"][1:] == ["the slope"]
    assert record["varies"] == "the weights and the terrain's error"
    assert record["left_out"] == "the wind"
    alone = sure_of(readings, zones, NO_DRAWS, profiles=cold_and_slope).for_record()
    assert (alone["varies"], alone["left_out"]) == ("the weights only", "the terrain's error and the wind")
    spans = record["ranks_spanned_on_average"]
    assert all(1.0 < span <= 4.0 for span in spans.values())
    alone = sure_of(readings, zones, NO_DRAWS, profiles=cold_and_slope)
    assert alone.for_record()["ranks_spanned_on_average"]["together"] == spans["weights_alone"]
    assert "100 draws of the data, the same for all plots: the slope." in sure.notes()[0].text
    assert "nothing else" in sure_of(readings, zones, NO_DRAWS, profiles=cold_and_slope).notes()[0].text


def test_identical_plots_share_a_rank_in_every_draw(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {}, {"slope_deg": 8.0})
    zones = in_zone(readings, "upland")
    slope = np.random.default_rng(8).uniform(0.0, 9.0, DRAWS)
    found = sure_of(readings, zones, ReadingDraws({"slope_deg": np.stack([slope, slope, slope + 1.0])})).table
    assert found.loc["a"].drop("chance_beats_next").tolist() == pytest.approx(found.loc["b"].drop("chance_beats_next").tolist(), nan_ok=True)  # fmt: skip  # noqa: E501
    assert found.at["a", "chance_beats_next"] == 0.5


@given(st.integers(0, 2**32 - 1), st.sampled_from(["slope_deg", "ridge_exposure", "cold_deficit_k", "sky_view"]))
@settings(max_examples=15, deadline=None)
def test_ignorance_wins_in_no_draw(seed: int, blank: str) -> None:
    """A twin with a reading missing, its other readings drawn alike, has no better range and no better chance."""
    rng = np.random.default_rng(seed)
    drawn = {
        "slope_deg": rng.uniform(0, 16, (4, 50)), "ridge_exposure": rng.uniform(0.5, 1.8, (4, 50)),
        "cold_deficit_k": rng.uniform(0, 4, (4, 50)), "sky_view": rng.uniform(0.7, 1.0, (4, 50)),
    }  # fmt: skip
    readings: dict[str, Any] = {name: values[:, 0].copy() for name, values in drawn.items()}
    readings |= {"aspect_deg": np.full(4, 180.0), "outcome": ["", "", "", ""]}
    for name, values in drawn.items():
        values[3], readings[name][3] = values[0], readings[name][0]
    drawn[blank][3], readings[blank][3] = np.nan, np.nan
    table = pd.DataFrame(readings, index=pd.Index(list("abct"), name="plot"))
    nowhere = np.full(4, 500.0)
    fits = memberships(np.full(4, 1800.0), nowhere, nowhere, nowhere, None, DEFAULTS.zones)
    fits.index = table.index
    zones = zone_shares(fits, ["upland"] * 4, DEFAULTS.zones)
    how = DEFAULTS.judgement.model_copy(update={"trials": 200})
    judged = judge(table, zones, PROFILES, (), how)
    found = certainty(judged, zones, PROFILES, 20, 1, how, ReadingDraws(drawn)).table
    for column in ("rank_low", "rank_high", "rank_low_data", "rank_high_data"):
        assert found.at["t", column] >= found.at["a", column]
    for column in ("chance_first", "chance_shortlist", "chance_top_quarter"):
        assert found.at["t", column] <= found.at["a", column]


def test_a_rank_outside_its_own_range_is_said(plots: Plots, in_zone: InZone) -> None:
    """The run reads 12° where every draw of the ground has 1 to 2°: noise in the model as it stands."""
    readings = plots({"slope_deg": 12.0}, {"slope_deg": 6.0})
    zones = in_zone(readings, "upland")
    drawn = np.stack([np.linspace(1.0, 2.0, DRAWS), np.full(DRAWS, 6.0)])
    sure = sure_of(readings, zones, ReadingDraws({"slope_deg": drawn}))
    assert sure.outside == ("a", "b")
    assert "outside their range: a and b." in sure.notes()[1].text
    same = sure_of(
        readings, zones, ReadingDraws({"slope_deg": np.repeat(readings[["slope_deg"]].to_numpy(), 9, axis=1)})
    )
    assert same.outside == ()
    assert len(same.notes()) == 1
