"""Readings of the wind from a plot's sectors and a rose."""

import numpy as np
import pytest

from sitescreen.climate.roses import RoseSums, place_weights, rose_sums, roses_at, sector_bearings_deg
from sitescreen.climate.sector_winds import SectorWinds, together
from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind
from sitescreen.judgement import wind_slots
from sitescreen.judgement.profiles import MEASURED_READINGS
from sitescreen.judgement.wind_readings import wind_readings
from sitescreen.settings import load_defaults

WIND = load_defaults().wind


def winds(ratio: np.ndarray, left: np.ndarray | None = None) -> SectorWinds:
    """Plots with these sectors."""
    ratio = np.atleast_2d(np.asarray(ratio, dtype=np.float64))
    left = np.ones_like(ratio) if left is None else np.atleast_2d(left)
    ids = tuple(f"p{k}" for k in range(len(ratio)))
    return SectorWinds(ids, sector_bearings_deg(ratio.shape[1]), ratio, left, np.zeros_like(ratio))


def two_winds() -> tuple[SectorWinds, Rose]:
    """Light 2 m/s for 70 % from north with F 1.3, strong 8 m/s for 30 % from east with F 0.6."""
    ratio = np.ones(16)
    ratio[[0, 4]] = 1.3, 0.6
    return winds(ratio), Rose(np.array([0.0, 90.0]), np.array([0.7, 0.3]), np.array([2.0, 8.0]), 0.0, False)


def test_strong_winds_decide_the_exposure() -> None:
    """The plan's check: 0.66, and not 1.17 as a mean over time of the cubes would give."""
    found = wind_readings(*two_winds(), WIND)
    assert found.ridge_exposure[0] == pytest.approx(0.66, abs=0.005)
    assert np.cbrt(0.7 * 1.3**3 + 0.3 * 0.6**3) == pytest.approx(1.17, abs=0.01)


def test_the_mean_wind_weighs_by_its_run() -> None:
    """(0.7·2·1.3 + 0.3·8·0.6)/(0.7·2 + 0.3·8) = 0.858."""
    assert wind_readings(*two_winds(), WIND).ventilation[0] == pytest.approx((1.82 + 1.44) / 3.8)


def test_the_worst_sector_is_the_most_exposed_that_brings_energy() -> None:
    """North has F 1.3 and 3.5 % of the energy (5.6 of 159), enough to count; at half the speed it has under 1 %."""
    plots, rose = two_winds()
    found = wind_readings(plots, rose, WIND)
    assert (found.worst_sector_exposure[0], found.worst_sector_from_deg[0]) == (1.3, 0.0)
    weaker = Rose(rose.direction_deg, rose.share, np.array([1.0, 8.0]), 0.0, False)
    found = wind_readings(plots, weaker, WIND)
    assert (found.worst_sector_exposure[0], found.worst_sector_from_deg[0]) == (0.6, 90.0)


def test_shelter_and_slow_time_are_shares_of_the_windy_time() -> None:
    """Calm half the time changes neither: 30 % of the windy time from the side with F 0.6 and W 0.4."""
    plots, rose = two_winds()
    left = np.ones(16)
    left[4] = 0.4
    plots = winds(plots.speed_ratio, left)
    half_calm = Rose(rose.direction_deg, 0.5 * rose.share, rose.speed_m_s, 0.5, False)
    for one in (rose, half_calm):
        found = wind_readings(plots, one, WIND)
        assert found.slow_wind_share[0] == pytest.approx(0.3)
        assert found.sheltered_fraction[0] == pytest.approx(0.3 * 0.6)


def test_open_level_ground_reads_one_under_any_rose() -> None:
    random = np.random.default_rng(1)
    rose = Rose(np.arange(16) * 22.5, random.dirichlet(np.ones(16)), 10.0 * random.random(16), 0.0, False)
    found = wind_readings(winds(np.ones(16)), rose, WIND)
    assert [found.ventilation[0], found.ridge_exposure[0], found.worst_sector_exposure[0]] == pytest.approx([1, 1, 1])
    assert found.slow_wind_share[0] == found.sheltered_fraction[0] == 0.0


def test_a_sector_that_nobody_knows_matters_only_if_wind_comes_from_it() -> None:
    ratio = np.full((2, 16), 1.2)
    ratio[0, 4], ratio[1, 8] = np.nan, np.nan
    _, rose = two_winds()
    found = wind_readings(winds(ratio, np.where(np.isnan(ratio), np.nan, 1.0)), rose, WIND)
    for name in vars(found):
        values = getattr(found, name)
        assert np.isnan(values[0]), name
        assert np.isfinite(values[1]), name


def test_each_plot_may_have_its_own_rose() -> None:
    plots, rose = two_winds()
    two = winds(np.repeat(plots.speed_ratio, 2, axis=0))
    one, even = rose_sums(rose), rose_sums(assumed_wind().rose("year", 0.0, 0.0))
    own = RoseSums(*(np.stack([getattr(one, name), getattr(even, name)]) for name in ("time", "flow", "power")))
    found = wind_readings(two, own, WIND)
    assert found.ventilation[0] == wind_readings(plots, rose, WIND).ventilation[0]
    assert found.ventilation[1] == wind_readings(plots, even, WIND).ventilation[0] == pytest.approx(15.9 / 16)


def test_eight_sectors_share_what_lies_between_them() -> None:
    rose = Rose(np.array([0.0, 22.5]), np.array([0.4, 0.6]), np.array([3.0, 5.0]), 0.0, False)
    sums = rose_sums(rose, 8)
    assert sums.time.tolist() == pytest.approx([0.7, 0.3, 0, 0, 0, 0, 0, 0])
    assert sums.power.sum() == pytest.approx(rose_sums(rose, 16).power.sum())


def places(blended: bool) -> WindTable:
    """North winds at 39° east, east winds at 40°."""
    roses = {
        (slot, number): Rose(np.array([90.0 * number]), np.array([1.0]), np.array([2.0]), 0.0, False)
        for slot in SLOTS
        for number in (0, 1)
    }
    return WindTable(((39.0, 0.0), (40.0, 0.0)), roses, False, None, (), (10.0, 900.0), blended)


def test_the_nearest_place_serves_or_both_by_inverse_square() -> None:
    """At 39.25° the places are 1 and 3 parts off: all on the first, or 9 : 1."""
    lon, lat = np.array([39.25, 39.75]), np.zeros(2)
    assert place_weights(places(False), lon, lat).tolist() == [[1.0, 0.0], [0.0, 1.0]]
    assert place_weights(places(True), lon, lat) == pytest.approx(np.array([[0.9, 0.1], [0.1, 0.9]]))
    assert roses_at(places(True), "year", lon, lat, 16).time[0, [0, 4]] == pytest.approx([0.9, 0.1])


def test_at_a_place_its_own_wind_blows() -> None:
    assert place_weights(places(True), np.array([39.0]), np.array([0.0]))[0, 0] == pytest.approx(1.0, abs=1e-5)


def test_blocks_are_joined_in_the_order_asked_for() -> None:
    first, second = winds(np.full((1, 16), 1.1)), winds(np.full((2, 16), 0.9))
    second = SectorWinds(("x", "y"), second.bearing_deg, second.speed_ratio, second.shelter, second.speed_up)
    joined = together([first, second], ("y", "nowhere", "p0"), 16)
    assert joined.plots == ("y", "nowhere", "p0")
    assert joined.speed_ratio[:, 0].tolist() == pytest.approx([0.9, np.nan, 1.1], nan_ok=True)


def test_slots_are_those_of_the_wind_table_and_readings_those_of_profiles() -> None:
    assert tuple(SLOTS) == wind_slots.SLOTS
    assert set(wind_slots.SLOT_OF) <= set(MEASURED_READINGS)
    assert set(wind_slots.SLOT_OF.values()) <= set(SLOTS)
    assert set(wind_slots.IN_WORDS) == set(SLOTS)
