"""Breeze by distance: the figures of the design rule, and its limits."""

import numpy as np
import pytest

from sitescreen.climate.breeze import arrival_h, lake_reach, lake_weight, sea_reach
from sitescreen.settings import load_defaults

BREEZE = load_defaults().breeze


def test_arrival_lags_by_distance_over_front_speed() -> None:
    """Lag = x/c with c = 3 m/s: 0.74 h at 8 km, 1.85 h at 20 km (computed from the definition)."""
    lag = arrival_h(np.array([1.0, 8.0, 20.0, 40.0]), BREEZE) - BREEZE.onset_h
    assert lag == pytest.approx([0.0926, 0.7407, 1.8519, 3.7037], abs=1e-4)


def test_front_that_arrives_after_the_breeze_ends_does_not_arrive() -> None:
    assert np.isnan(arrival_h(np.array([90.0]), BREEZE))[0]


def test_share_of_breeze_hours_is_the_design_rule() -> None:
    """0.99 at 1 km, 0.91 at 8 km; the share of hours alone is 0.65 at 30 km, before the tail exp(−22/20)."""
    reach = sea_reach(np.array([1.0, 8.0, 30.0]), BREEZE)
    assert reach[:2] == pytest.approx([0.988, 0.907], abs=1e-3)
    assert reach[2] / np.exp(-22.0 / 20.0) == pytest.approx(0.653, abs=1e-3)


def test_sea_reach_falls_strictly_and_stays_above_zero_to_30_km() -> None:
    reach = sea_reach(np.linspace(0.0, 30.0, 301), BREEZE)
    assert (np.diff(reach) < 0).all()
    assert reach[-1] > 0


def test_lake_weight_from_two_to_twenty_five_km() -> None:
    assert lake_weight(np.array([1.0, 2.0, 13.5, 25.0, 60.0]), BREEZE) == pytest.approx([0, 0, 0.5, 1, 1])


def test_lake_breeze_never_reaches_further_than_the_lake_is_wide() -> None:
    """Small lakes (< 50 km): early-afternoon penetration < lake width (Segal et al. 1997, BAMS 78:1135–1147)."""
    width = np.full(3, 20.0)
    reach = lake_reach(np.array([19.0, 20.0, 25.0]), width, BREEZE)
    assert reach[0] > 0
    assert reach[1:].tolist() == [0.0, 0.0]
