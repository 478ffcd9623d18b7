"""Siting hints: what turning costs, the contour, rows and eaves, and the words for them."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.sun_path import SunPath
from sitescreen.judgement.long_axis import AxisCosts, SitingGround, axis_costs
from sitescreen.judgement.siting import PlotSiting, best_alone, decided_by, plot_sitings
from sitescreen.judgement.siting_words import along, point
from sitescreen.settings import SitingWeights, load_defaults

ClearYear = Callable[..., SunPath]
AxisGround = Callable[..., SitingGround]
SETTINGS = load_defaults().siting
ALBEDO = 0.2


def siting(of: SitingGround, zone: str, slope_deg: float = 2.0, aspect_deg: float = 0.0, shore: str = "") -> PlotSiting:
    values = pd.DataFrame({"slope_deg": [slope_deg], "aspect_deg": [aspect_deg], "shore_kind": [shore]}, index=["7"])
    return plot_sitings(of, pd.DataFrame({zone: [1.0]}), values, np.arange(1), ALBEDO, SETTINGS)["7"]


def total(of: SitingGround, zone: str) -> np.ndarray:
    (_, found) = next(axis_costs(of, pd.DataFrame({zone: [1.0]}), np.arange(1), ALBEDO, SETTINGS))
    return (found.sun + found.wind)[0]


def test_curve_and_turns_are_the_cost_that_was_made_least(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    """From 0 at the best to 100 at the worst bearing; the turns read it 10, 20 and 30° to either side."""
    of = axis_ground(clear_year(-4.0), breeze_from_deg=90.0)
    found = siting(of, "hot_humid_coast", shore="sea")
    cost = total(of, "hot_humid_coast")
    share = 100.0 * (cost - cost[found.axis_deg]) / (cost.max() - cost[found.axis_deg])
    assert found.cost_pct == pytest.approx(np.maximum(share[::5], 0.0), abs=0.06)
    assert len(found.cost_pct) == 36
    for turn in found.turns:
        assert turn.smaller_pct == pytest.approx(share[found.axis_deg - turn.turn_deg], abs=0.06)
        assert turn.larger_pct == pytest.approx(share[found.axis_deg + turn.turn_deg], abs=0.06)
    assert [turn.turn_deg for turn in found.turns] == [10, 20, 30]
    assert (np.diff([turn.sun_pct for turn in found.turns]) > 0).all()


def test_turning_an_east_west_house_15_to_20_degrees_costs_little_sun(
    clear_year: ClearYear, axis_ground: AxisGround
) -> None:
    """Practice allows 15–20°; the façade loads by ASHRAE's clear sky rise by 3 % at 15° and by 13 % at 30°."""
    turns = siting(axis_ground(clear_year(0.0)), "hot_humid_coast").turns
    assert 1.0 < turns[0].sun_pct < 3.0
    assert 3.0 < turns[1].sun_pct < 8.0
    assert turns[2].sun_pct == pytest.approx(13.0, abs=1.0)


def test_sun_decides_where_no_wind_is_known_and_says_so(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    found = siting(axis_ground(clear_year(-4.0)), "hot_arid")
    assert (found.axis_deg, found.decided_by, found.wind) == (90, "sun", "")
    assert (found.wind_from_deg, found.wind_incidence_deg) == (None, None)
    assert found.turns[0].air_pct is None
    assert found.says[0] == (
        "Long walls facing N and S: axis 90° (east–west). The sun alone decided: no table of winds was given."
    )


def test_breeze_is_named_with_its_bearing_and_angle(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    found = siting(axis_ground(clear_year(-4.0), breeze_from_deg=150.0), "hot_humid_coast", shore="sea")
    assert (found.axis_deg, found.wind, found.wind_from_deg, found.wind_incidence_deg) == (90, "sea breeze", 150, 30)
    assert (found.sun_axis_deg, found.wind_axis_deg) == (90, 60)
    assert "(for the sun alone 90°, for the sea breeze alone 60°)" in found.says[0]
    assert "the sea breeze from the SSE meets the long wall 30° off square" in found.says[0]


def test_shelter_zones_keep_the_wind_off(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    found = siting(axis_ground(clear_year(-1.0), flow=np.eye(16)[4]), "high_upland")
    assert not found.wind_wanted
    assert "is to be kept off" in found.says[0]
    # turning lets more in, so the change is an increase
    assert (found.turns[1].air_pct or 0.0) > 0.0
    assert found.turns[1].morning_pct > 0.0
    assert "less cool-season morning sun" in found.says[1]
    assert "more wind" in found.says[1]


@pytest.mark.parametrize(
    ("sun_best", "wind_best", "axis_deg", "who"),
    [(90, 0, 70, "sun"), (90, 0, 20, "wind"), (90, 10, 50, "both"), (90, 88, 89, "both"), (170, 40, 5, "sun")],
)
def test_the_nearer_of_two_bests_decided(sun_best: int, wind_best: int, axis_deg: int, who: str) -> None:
    bearing = np.arange(180)

    def valley(best: int) -> np.ndarray:
        away = np.abs(bearing - best)
        return np.minimum(away, 180 - away)[None, :] / 90.0

    blank = np.zeros((1, 180))
    costs = AxisCosts(valley(sun_best), valley(wind_best), blank, blank, blank, np.zeros(1), np.zeros(1, dtype=bool))
    axis = np.array([float(axis_deg)])
    alone = best_alone(costs, 1e-3)
    assert (alone.sun_deg[0], alone.wind_deg[0]) == (sun_best, wind_best)
    assert decided_by(axis, alone) == [who]
    assert decided_by(axis, best_alone(costs._replace(wind=blank), 1e-3)) == ["sun"]
    assert decided_by(axis, best_alone(costs._replace(sun=blank), 1e-3)) == ["wind"]


@pytest.mark.parametrize(
    ("slope_pct", "aspect_deg", "contour_deg"),
    [(14.9, 45.0, None), (15.1, 45.0, 135), (20.0, 100.0, 10), (20.0, 270.0, 0), (20.0, np.nan, None)],
)
def test_contour_is_shown_beside_the_axis_on_ground_over_15_percent(
    clear_year: ClearYear, axis_ground: AxisGround, slope_pct: float, aspect_deg: float, contour_deg: int | None
) -> None:
    """A level line runs square to the way the ground falls."""
    of = axis_ground(clear_year(-4.0))
    found = siting(of, "savannah", float(np.degrees(np.arctan(slope_pct / 100.0))), aspect_deg)
    assert found.contour_deg == contour_deg
    assert any("contour" in sentence for sentence in found.says) == (contour_deg is not None)
    if contour_deg is not None:
        cost = total(of, "savannah")
        assert found.contour_cost_pct == pytest.approx(
            100.0 * (cost[contour_deg] - cost[90]) / (cost.max() - cost[90]), abs=0.06
        )


def test_rows_for_the_wind_stand_six_heights_apart(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    """5 to 7 heights (Koenigsberger et al. 1974): 18 m clear with eaves at 3 m."""
    found = siting(axis_ground(clear_year(-4.0)), "hot_humid_coast")
    assert (found.rows_for, found.row_gap_heights, found.row_gap_m) == ("air", 6.0, 18.0)
    assert "6.0 eaves heights" in found.says[2]


def test_rows_for_the_sun_at_the_equator(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    """9 h solar time of the June solstice, sun at 40.45° and 58.49° from north: a north wall needs d/H = 0.613.

    The year's days here come within 0.4° of the solstice's declination; an axis other than 90° would need another gap.
    """
    found = siting(axis_ground(clear_year(0.0, 6.0), flow=np.eye(16)[4]), "upland")
    assert found.axis_deg == pytest.approx(90, abs=4)
    assert found.rows_for == "sun"
    turned = np.cos(np.radians(58.49 - (found.axis_deg - 90))) / np.cos(np.radians(58.49))
    assert found.row_gap_heights == pytest.approx(0.613 * turned, abs=0.02)
    assert found.row_gap_m == pytest.approx(3.0 * (found.row_gap_heights or 0.0), abs=0.05)


def test_ground_that_falls_to_the_cool_season_sun_brings_rows_closer(
    clear_year: ClearYear, axis_ground: AxisGround
) -> None:
    of = axis_ground(clear_year(-4.0), flow=np.eye(16)[4])
    gaps = [siting(of, "upland", 8.0, aspect).row_gap_heights or 0.0 for aspect in (0.0, np.nan, 180.0)]
    assert gaps[0] < gaps[1] < gaps[2]


def test_ground_too_steep_for_the_sun_has_no_gap(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    found = siting(axis_ground(clear_year(-4.0), flow=np.eye(16)[4]), "upland", 50.0, 200.0)
    assert found.row_gap_heights is None
    assert any(sentence.startswith("No gap between rows") for sentence in found.says)


def test_dry_zones_set_rows_close(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    found = siting(axis_ground(clear_year(-4.0)), "hot_arid")
    assert (found.rows_for, found.row_gap_m) == ("shade", None)


def test_eaves_shade_the_wall_that_the_hot_season_sun_looks_at(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    """Equator, December to February: 1.5 m of south wall need 1.5 × 0.613 = 0.92 m of eave, the north wall none.

    At 9 h the sun of the solstice stands 40.45° high, 58.49° from south.
    """
    found = siting(axis_ground(clear_year(0.0, 6.0)), "hot_arid")
    north, south = found.eaves
    assert (north.face_deg, south.face_deg) == (0.0, 180.0)
    assert north.projection_m == 0.0
    assert south.projection_m == pytest.approx(0.92, abs=0.02)
    assert found.says[-2] == (
        "Eaves that shade 1.5 m of wall from 9 to 15 h in the hot season: none is needed for the N wall, 0.9 m for the "
        "S wall."
    )


def test_eaves_that_would_need_posts_are_not_promised(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    """A wall turned towards the morning sun for the sake of an east wind: 9 h sun square on needs some 1.5 m."""
    coast = SETTINGS.zones["hot_humid_coast"].model_copy(update={"weights": SitingWeights(sun=0.0, wind=1.0)})
    settings = SETTINGS.model_copy(update={"zones": {"hot_humid_coast": coast}, "eave_most_m": 1.2})
    of = axis_ground(clear_year(0.0), breeze_from_deg=90.0)
    values = pd.DataFrame({"slope_deg": [2.0], "aspect_deg": [0.0], "shore_kind": ["sea"]}, index=["7"])
    shares = pd.DataFrame({"hot_humid_coast": [1.0]})
    found = plot_sitings(of, shares, values, np.arange(1), ALBEDO, settings)["7"]
    assert found.axis_deg == 0
    assert [eave.projection_m for eave in found.eaves] == [None, None]
    assert "none up to 1.2 m is enough for the E wall" in found.says[-2]


def test_hint_says_that_it_is_no_design(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    of = axis_ground(clear_year(-4.0))
    assert siting(of, "upland").says[-1] == "A siting hint from terrain, sun and wind, not a design."
    guessed = of._replace(suns=_with_source(of.suns, "assumed"))
    assert "hot and cool months are assumed" in siting(guessed, "upland").says[-1]


def test_hint_as_plain_data_goes_into_json(clear_year: ClearYear, axis_ground: AxisGround) -> None:
    import json

    found = siting(axis_ground(clear_year(-4.0), breeze_from_deg=60.0), "lake_basin", 9.0, 30.0, "lake")
    data = json.loads(json.dumps(found.for_page(), allow_nan=False))
    assert data["axis_deg"] == found.axis_deg
    assert data["turns"][1]["turn_deg"] == 20
    assert data["eaves"][0]["face_deg"] == found.eaves[0].face_deg


@pytest.mark.parametrize(
    ("axis_deg", "words"),
    [(90, "east–west"), (88, "east–west"), (85, "nearly east–west"), (105, "nearly east–west"), (106, "ESE–WNW"),
     (0, "north–south"), (179, "north–south"), (170, "nearly north–south"), (45, "NE–SW"), (67, "ENE–WSW")],
)  # fmt: skip
def test_how_an_axis_lies_in_words(axis_deg: float, words: str) -> None:
    assert along(axis_deg) == words


@pytest.mark.parametrize(("bearing_deg", "name"), [(0, "N"), (359, "N"), (11.3, "NNE"), (157, "SSE"), (348.7, "NNW")])
def test_points_of_the_compass(bearing_deg: float, name: str) -> None:
    assert point(bearing_deg) == name


def _with_source(suns: Any, source: str) -> Any:
    from dataclasses import replace

    return replace(suns, seasons=suns.seasons._replace(source=source))
