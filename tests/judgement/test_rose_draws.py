"""The wind's readings under redrawn roses."""

from collections.abc import Mapping

import numpy as np
import pytest

from sitescreen.climate.roses import sector_bearings_deg
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind
from sitescreen.judgement.rose_draws import rose_draws, rose_varied, sector_factors
from sitescreen.judgement.wind_readings import wind_readings
from sitescreen.settings import load_defaults

WIND = load_defaults().wind
COLUMNS = ("ventilation", "ridge_exposure", "sheltered_fraction", "ridge_exposure_cool_night")


def ground(count: int = 3, seed: int = 1) -> SectorWinds:
    rng = np.random.default_rng(seed)
    ids = tuple(f"p{k}" for k in range(count))
    ratio, left = rng.uniform(0.4, 1.6, (count, 16)), rng.uniform(0.4, 1.0, (count, 16))
    return SectorWinds(ids, sector_bearings_deg(16), ratio, left, np.zeros((count, 16)))


def table(*places: tuple[float, float], blended: bool = False) -> WindTable:
    """Another rose at each place, the same in all slots."""
    roses = {}
    for number in range(len(places)):
        share = np.random.default_rng(number).dirichlet(np.ones(16))
        rose = Rose(sector_bearings_deg(16), share, np.full(16, 3.0 + number), 0.0, False)
        roses |= {(slot, number): rose for slot in SLOTS}
    return WindTable(places, roses, False, None, (), tuple(np.nan for _ in places), blended)


def draw(
    winds: SectorWinds, wind: WindTable, lon: np.ndarray, seed: int = 20, days: float = 90.0
) -> Mapping[str, np.ndarray]:
    how = WIND.model_copy(update={"rose_days": days})
    return rose_draws(winds, wind, lon, np.zeros(len(lon)), COLUMNS, [("ridge_exposure", "cool_night")], seed, 60, how)


def test_shares_are_drawn_as_from_so_many_days() -> None:
    """Gamma numbers of shape n·p over n·p: mean 1, variance 1/(n·p)."""
    share = np.array([0.5, 0.3, 0.2, 0.0])
    found = sector_factors(share, 90.0, 20, "year", 20_000)
    assert found[:, 3].tolist() == [1.0] * 20_000
    for sector, p in enumerate(share[:3]):
        spread = 1.0 / (90.0 * p)
        assert found[:, sector].mean() == pytest.approx(1.0, abs=4 * np.sqrt(spread / 20_000))
        assert found[:, sector].var() == pytest.approx(spread, rel=0.06)
    # as a Dirichlet distribution has it: var p1 = p(1 − p)/(n + 1)
    shares = found[:, :3] * share[:3]
    shares /= shares.sum(axis=1, keepdims=True)
    assert shares[:, 0].var() == pytest.approx(0.25 / 91.0, rel=0.06)


def test_where_nobody_gave_a_rose_all_are_alike() -> None:
    """Even on the simplex: P(share > t) = (1 − t)^15 for 16 sectors."""
    found = sector_factors(np.ones(16), 16.0, 20, "year", 20_000)
    share = found[:, 5] / found.sum(axis=1)
    for t in (0.02, 0.1, 0.2):
        expected = (1.0 - t) ** 15
        assert (share > t).mean() == pytest.approx(expected, abs=4 * np.sqrt(expected * (1 - expected) / 20_000))


def test_a_long_record_leaves_the_readings_as_they_are() -> None:
    winds, wind, lon = ground(), table((0.0, 0.0)), np.zeros(3)
    run = wind_readings(winds, wind.roses["year", 0], WIND)
    found = draw(winds, wind, lon, days=1e5)
    assert set(found) == set(COLUMNS)
    for name in ("ventilation", "ridge_exposure", "sheltered_fraction"):
        assert found[name].shape == (3, 60)
        assert found[name].mean(axis=1) == pytest.approx(getattr(run, name), rel=0.01)
        assert found[name].std(axis=1).max() < 0.01
    short = draw(winds, wind, lon)
    # a power mean of strong winds varies more than a mean over time
    assert short["ridge_exposure"].std(axis=1).min() > 0.01


def test_a_plots_draws_hang_on_no_other_plot() -> None:
    wind = table((0.0, 0.0), (1.0, 0.0), blended=True)
    lon = np.array([0.1, 0.9, 0.4])
    winds = ground()
    many = draw(winds, wind, lon)
    for row in range(3):
        alone = draw(winds.of((winds.plots[row],)), wind, lon[[row]])
        for name in COLUMNS:
            assert np.array_equal(many[name][[row]], alone[name])


def test_draws_hang_on_the_seed_and_each_slot_has_its_own() -> None:
    winds, wind, lon = ground(), table((0.0, 0.0)), np.zeros(3)
    one, same, other = (draw(winds, wind, lon, seed) for seed in (1, 1, 2))
    assert np.array_equal(one["ventilation"], same["ventilation"])
    assert not np.array_equal(one["ventilation"], other["ventilation"])
    assert not np.array_equal(one["ridge_exposure"], one["ridge_exposure_cool_night"])


def test_ground_that_is_unknown_upwind_stays_unknown() -> None:
    winds = ground(1)
    winds.speed_ratio[0, 3] = np.nan
    found = draw(winds, table((0.0, 0.0)), np.zeros(1))
    assert np.isnan(found["ventilation"]).all()


def test_what_is_varied_is_said() -> None:
    assert "none was given" in rose_varied(assumed_wind(), WIND).in_full
    assert "90 independent days" in rose_varied(table((0.0, 0.0)), WIND).in_full
