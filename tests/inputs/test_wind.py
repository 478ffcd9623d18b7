"""The table of winds."""

from collections.abc import Iterable
from pathlib import Path

import numpy as np
import pytest

from sitescreen.errors import InputError
from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind, read_wind

HEAD = "season,part,direction_deg,share,speed_m_s"


def table(folder: Path, rows: Iterable[str], head: str = HEAD) -> WindTable:
    path = folder / "wind.csv"
    path.write_text("\n".join([head, *rows]) + "\n", encoding="utf-8")
    return read_wind(path)


def year(*winds: tuple[object, object, object], season: str = "year", part: str = "all") -> list[str]:
    return [f"{season},{part},{direction},{share},{speed}" for direction, share, speed in winds]


def by_sector(rose: Rose) -> np.ndarray:
    return np.bincount((rose.direction_deg / 22.5).astype(int), weights=rose.share, minlength=16)


def notes(found: WindTable, level: str) -> str:
    return "\n".join(note.text for note in found.notes if note.level == level)


def test_sixteen_directions_come_out_as_they_went_in(tmp_path: Path) -> None:
    shares = [0.02 + 0.005 * k for k in range(16)]
    calm = 1.0 - sum(shares)
    found = table(tmp_path, year(*[(22.5 * k, shares[k], 2.0 + 0.1 * k) for k in range(16)], ("", calm, 0)))
    rose = found.rose("year", 0.0, 0.0)
    assert by_sector(rose) == pytest.approx(shares)
    assert rose.speed_m_s == pytest.approx([2.0 + 0.1 * k for k in range(16)])
    assert rose.calm_share == pytest.approx(calm)
    assert not rose.assumed
    assert not found.notes or "taken for it" in notes(found, "assumed")


def test_shares_and_calm_make_one_in_every_slot(tmp_path: Path) -> None:
    rows = year((0, 0.5, 3), (90, 0.2, 5), (90, 0.1, 9), ("calm", 0.2, ""), season="hot", part="afternoon")
    rows += year((180, 0.9, 2), ("", 0.1, 0), season="cool", part="night")
    found = table(tmp_path, rows)
    for slot in SLOTS:
        rose = found.rose(slot, 0.0, 0.0)
        assert rose.share.sum() + rose.calm_share == pytest.approx(1.0, abs=1e-12)


def test_two_speeds_from_one_side_are_kept_apart(tmp_path: Path) -> None:
    """Strong winds carry the cube of their speed: a mean of 2 and 8 m/s would lose most of it."""
    rose = table(tmp_path, year((90, 0.7, 2.0), (90, 0.3, 8.0))).rose("year", 0.0, 0.0)
    assert rose.direction_deg.tolist() == [90.0, 90.0]
    assert sorted(zip(rose.speed_m_s, rose.share, strict=True)) == [
        (2.0, pytest.approx(0.7)),
        (8.0, pytest.approx(0.3)),
    ]


@pytest.mark.parametrize("count", [4, 8, 12, 16, 32, 36, 72])
def test_an_even_wind_stays_even_whatever_compass_it_was_written_with(tmp_path: Path, count: int) -> None:
    """In 10° steps, counting into the nearest sector would give 3 rows to one sector and 2 to the next."""
    found = table(tmp_path, year(*[(360.0 * (k + 1) / count, 1.0 / count, 3.0) for k in range(count)]))
    assert by_sector(found.rose("year", 0.0, 0.0)) == pytest.approx(np.full(16, 1 / 16))
    assert (count == 16) == ("shared out" not in notes(found, "info"))


def test_a_few_of_sixteen_directions_are_not_spread(tmp_path: Path) -> None:
    rose = table(tmp_path, year((45, 0.6, 3), (90, 0.4, 3))).rose("year", 0.0, 0.0)
    assert by_sector(rose)[[2, 4]] == pytest.approx([0.6, 0.4])


def test_ten_degrees_straddle_two_sectors_by_angle(tmp_path: Path) -> None:
    """10° ± 5° lies from 5 to 15: 6.25 of its 10 degrees below 11.25, where the northern sector ends."""
    rose = table(tmp_path, year((10, 1.0, 3))).rose("year", 0.0, 0.0)
    assert by_sector(rose)[:2] == pytest.approx([0.625, 0.375])


def test_north_is_0_and_360_alike(tmp_path: Path) -> None:
    rose = table(tmp_path, year((360, 0.5, 3), (0, 0.5, 4))).rose("year", 0.0, 0.0)
    assert by_sector(rose)[0] == pytest.approx(1.0)


def test_per_cent_are_shares(tmp_path: Path) -> None:
    found = table(tmp_path, year((0, 60, 3), (90, 30, 3), ("", 10, 0)))
    rose = found.rose("year", 0.0, 0.0)
    assert by_sector(rose)[[0, 4]] == pytest.approx([0.6, 0.3])
    assert rose.calm_share == pytest.approx(0.1)
    assert not notes(found, "warning")


def test_shares_a_little_off_are_scaled_and_told_far_off_refused(tmp_path: Path) -> None:
    assert not notes(table(tmp_path, year((0, 0.99, 3))), "warning")
    found = table(tmp_path, year((0, 0.6, 3), (90, 0.3, 3)))
    assert "sum to 0.9; they were scaled to 1" in notes(found, "warning")
    assert by_sector(found.rose("year", 0, 0))[[0, 4]] == pytest.approx([2 / 3, 1 / 3])
    with pytest.raises(InputError, match=r"“year, all” in the wind table wind\.csv sum to 0\.7"):
        table(tmp_path, year((0, 0.7, 3)))
    with pytest.raises(InputError, match="sum to 130"):
        table(tmp_path, year((0, 65, 3), (90, 65, 3)))


def test_a_direction_with_speed_0_is_calm(tmp_path: Path) -> None:
    rose = table(tmp_path, year((0, 0.8, 3), (90, 0.1, 0), (180, 0.1, 0))).rose("year", 0.0, 0.0)
    assert rose.calm_share == pytest.approx(0.2)
    assert rose.direction_deg.tolist() == [0.0]


def test_slots_fall_back_in_the_stated_order_and_say_so(tmp_path: Path) -> None:
    everything = year((90, 1.0, 3), season="hot", part="afternoon") + year((180, 1.0, 3), season="hot", part="all")
    everything += year((270, 1.0, 3), season="year", part="night")
    everything += year((0, 1.0, 3), season="year", part="all")
    found = table(tmp_path, everything)
    came_from = {slot: found.rose(slot, 0, 0).direction_deg[0] for slot in SLOTS}
    assert came_from == {"hot_afternoon": 90.0, "hot_night": 180.0, "cool_night": 270.0, "year": 0.0}
    assert "no “hot, night”: “hot, all” was taken" in notes(found, "assumed")
    assert "no “cool, night”: “year, night” was taken" in notes(found, "assumed")
    assert "hot, afternoon”:" not in notes(found, "assumed")


def test_without_a_whole_year_the_mean_of_what_there_is_serves(tmp_path: Path) -> None:
    rows = year((90, 1.0, 3), season="hot", part="all") + year((270, 0.5, 3), ("", 0.5, 0), season="cool", part="all")
    found = table(tmp_path, rows)
    rose = found.rose("year", 0, 0)
    assert by_sector(rose)[[4, 12]] == pytest.approx([0.5, 0.25])
    assert rose.calm_share == pytest.approx(0.25)
    assert "the mean of all it has" in notes(found, "assumed")


def test_the_nearest_place_serves(tmp_path: Path) -> None:
    head = HEAD + ",lon,lat"
    rows = [f"year,all,90,1,3,{lon},{lat}" for lon, lat in ((39.0, -4.0),)]
    rows += ["year,all,180,1,5,37.0,-1.0", "year,all,270,1,7,-179.5,-17"]
    found = table(tmp_path, rows, head)
    assert found.places == ((39.0, -4.0), (37.0, -1.0), (-179.5, -17.0))
    assert found.rose("year", 38.9, -3.0).speed_m_s.tolist() == [3.0]
    assert found.rose("year", 36.0, 0.5).speed_m_s.tolist() == [5.0]
    assert found.rose("year", 179.0, -17.0).speed_m_s.tolist() == [7.0]  # across the date line
    assert "at 39, -4" in notes(found, "assumed")


def test_what_stands_in_for_missing_rows_is_assumed(tmp_path: Path) -> None:
    """A table without whole-year rows must not count in full for the year."""
    found = table(tmp_path, year((90, 1.0, 3), season="hot", part="afternoon"))
    assert [found.is_assumed(slot) for slot in SLOTS] == [False, True, True, True]
    found = table(tmp_path, year((90, 1.0, 3)) + year((0, 1.0, 3), season="hot"))
    assert [found.is_assumed(slot) for slot in SLOTS] == [True, True, True, False]
    everything = [line for season, part in SLOTS.values() for line in year((90, 1.0, 3), season=season, part=part)]
    assert not any(table(tmp_path, everything).is_assumed(slot) for slot in SLOTS)
    assert all(assumed_wind().is_assumed(slot) for slot in SLOTS)


def test_the_rainy_season_is_there_only_if_the_table_has_it(tmp_path: Path) -> None:
    assert not table(tmp_path, year((90, 1.0, 3))).has("rain")
    assert not assumed_wind().has("rain")
    both = year((0, 1.0, 3)) + year((90, 1.0, 3), season="rain", part="night")
    both += year((180, 1.0, 3), season="rain", part="afternoon")
    found = table(tmp_path, both)
    assert found.has("rain")
    assert by_sector(found.rose("rain", 0, 0))[[4, 8]] == pytest.approx([0.5, 0.5])
    whole = table(tmp_path, both + year((270, 1.0, 3), season="rain"))
    assert by_sector(whole.rose("rain", 0, 0))[12] == pytest.approx(1.0)


def test_a_place_may_say_its_height_once(tmp_path: Path) -> None:
    head = HEAD + ",lon,lat,elevation_m"
    found = table(tmp_path, ["year,all,90,0.5,3,39,-4,120", "year,all,0,0.5,3,39,-4,", "year,all,0,1,3,40,-4,"], head)
    assert found.place_m == (120.0, pytest.approx(np.nan, nan_ok=True))
    with pytest.raises(InputError, match="elevation_m is 130 here and 120 further up"):
        table(tmp_path, ["year,all,90,0.5,3,39,-4,120", "year,all,0,0.5,3,39,-4,130"], head)


@pytest.mark.parametrize(
    ("rows", "message"),
    [
        (year((400, 1, 3)), "line 2 of the wind table wind.csv: direction_deg is “400”; a number from 0 to 360"),
        (year((-10, 1, 3)), "direction_deg is “-10”"),
        (year(("NE", 1, 3)), "direction_deg is “NE”"),
        (year((0, -0.1, 3)), "share is “-0.1”"),
        (year((0, 1, 80)), "speed_m_s is “80”"),
        (year((0, 1, "")), "speed_m_s is “”"),
        (year((0, 1, 3), season="summer"), "season is “summer”; one of hot, cool, rain, year is needed"),
        (year((0, 1, 3), part="noon"), "part is “noon”"),
        (year((0, 0.5, 3), (0, 0.5, 3)), "line 3 .*stands there twice"),
        (year(("", 0.5, 4), (0, 0.5, 3)), "no direction and a speed of 4"),
        (year(("", 1, 0)), "“year, all” in the wind table wind.csv holds nothing but calm"),
        (year((0, 1, 0)), "nothing but calm"),
        ([], "has no rows"),
    ],
)
def test_rows_that_cannot_be_right_are_refused_with_their_line(tmp_path: Path, rows: list[str], message: str) -> None:
    with pytest.raises(InputError, match=message):
        table(tmp_path, rows)


def test_places_on_some_rows_only_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="2 places, one of them without lon and lat"):
        table(tmp_path, ["year,all,0,1,3,39,-4", "year,all,90,1,3,,"], HEAD + ",lon,lat")
    with pytest.raises(InputError, match="lat is “”"):
        table(tmp_path, ["year,all,0,1,3,39,"], HEAD + ",lon,lat")


def test_speeds_in_knots_or_kilometres_are_suspected(tmp_path: Path) -> None:
    assert "metres per second" in notes(table(tmp_path, year((0, 1, 25))), "warning")


def test_the_assumed_wind_is_even_and_says_so() -> None:
    found = assumed_wind()
    for slot in SLOTS:
        rose = found.rose(slot, 39.0, -4.0)
        assert rose.assumed
        assert by_sector(rose) == pytest.approx(np.full(16, 1 / 16))
        assert set(rose.speed_m_s) == {3.0}
        assert rose.calm_share == 0.0
    assert found.assumed
    assert found.stamp is None
    assert [note.level for note in found.notes] == ["assumed"]


def test_the_table_is_stamped(tmp_path: Path) -> None:
    found = table(tmp_path, year((0, 1, 3)))
    assert found.stamp is not None
    assert found.stamp.name == "wind.csv"
    assert not found.assumed
