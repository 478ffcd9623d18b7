"""Four sites drawn by hand, and what every sector's F should be there, written down before looking.

What was expected, and why
--------------------------
All ground is a Gaussian ridge or its mirror image, a valley, of half-length 300 m and H/L 0.2 (the lee foot: 0.4), so
that no slope passes 0.3. Wind at angle a to the ridge's normal feels cos²a of its height (the linear theory's (k·s)²).

* **Crest** of a ridge from north to south, 60 m. Taylor & Lee 1984: ΔS = 2·0.2·e^(−0.1) = 0.36 across it, ± 25 %; half
  of that at 45°; none along it.
* **Lee foot**, 600 m east of the crest of such a ridge of 120 m. From the west the ridge stands 11° above the eye
  (tangent 0.20): a third of the way from no shelter to full, and W = 0.8; the flow over the ridge, slow at both its
  feet, comes to the same sign. From the east nothing shelters, but the foot is a foot: F below 1, and above that from
  the west. Along the ridge nothing.
* **Valley along the wind**, from west to east, 60 m deep. The linear theory leaves wind along a valley as it is: F 1,
  though real valleys may channel it (what the method cannot know). Winds across it lose what a ridge would gain: 0.36,
  ± 25 %, bent to 0.33 by the cap.
* **Valley across the wind**: the same, turned by 90°: the same table, turned.

What came otherwise
-------------------
All ranges held. At the lee foot W is 0.86 (the foot lies 7 m up: tangent 0.187), and F from the west is not below
that from the east: the linear flow slows both feet alike, to 0.82, and of flow and shelter the stronger counts. Only
behind steeper ground is the lee the calmer side: the last test but one.
"""

import numpy as np
import pytest

from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.climate.sector_winds import SectorWinds, sector_winds
from sitescreen.grid import Field
from sitescreen.settings import load_defaults
from sitescreen.terrain.position import rise_m
from tests.climate.hills import HALF, ground

WIND = load_defaults().wind
CELLS = 500
SPREAD = 300.0 / HALF

ACROSS_RIDGE = {0.0: (1.25, 1.50), 22.5: (1.20, 1.42), 45.0: (1.10, 1.25), 67.5: (1.00, 1.10), 90.0: (0.97, 1.03)}
ACROSS_VALLEY = {0.0: (0.58, 0.80), 22.5: (0.62, 0.84), 45.0: (0.76, 0.92), 67.5: (0.90, 1.00), 90.0: (0.97, 1.03)}
"""F by the angle between the wind and the normal of the ridge or valley."""

RIDGE_NORMAL_DEG, VALLEY_EW_NORMAL_DEG, VALLEY_NS_NORMAL_DEG = 90.0, 0.0, 90.0

LEE_FOOT = {
    0.0: (0.97, 1.03), 22.5: (0.90, 1.02), 45.0: (0.80, 0.98), 67.5: (0.72, 0.97), 90.0: (0.68, 0.96),
    112.5: (0.72, 0.97), 135.0: (0.80, 0.98), 157.5: (0.90, 1.02), 180.0: (0.97, 1.03), 202.5: (0.88, 1.02),
    225.0: (0.72, 0.96), 247.5: (0.62, 0.90), 270.0: (0.60, 0.85), 292.5: (0.62, 0.90), 315.0: (0.72, 0.96),
    337.5: (0.88, 1.02),
}  # fmt: skip
"""F by where the wind comes from."""


def by_normal(table: dict[float, tuple[float, float]], normal_deg: float) -> list[tuple[float, float]]:
    """Sixteen ranges from a table by the angle to a normal."""
    angles = np.abs((np.arange(16) * 22.5 - normal_deg + 90.0) % 180.0 - 90.0)
    return [table[float(angle)] for angle in angles]


def site(field: Field, east_cells: int = 0) -> SectorWinds:
    """The sectors of one cell, some cells east of the middle."""
    cell = (CELLS // 2) * CELLS + CELLS // 2 + east_cells
    return sector_winds(
        ("site",), field, rise_m(field, 1000.0), hill_fields(field, WIND), None, np.array([0, 1]),
        np.array([cell]), np.ones(1), np.zeros(1), 0.9, WIND,
    )  # fmt: skip


def ridge(height_m: float, along_north: bool = True) -> Field:
    return ground(lambda x, y: height_m * np.exp(-((x if along_north else y) ** 2) / (2 * SPREAD**2)), cells=CELLS)


SITES = {
    "crest": (ridge(60.0), 0, by_normal(ACROSS_RIDGE, RIDGE_NORMAL_DEG)),
    "lee foot": (ridge(120.0), 20, list(LEE_FOOT.values())),
    "valley along the wind": (ridge(-60.0, along_north=False), 0, by_normal(ACROSS_VALLEY, VALLEY_EW_NORMAL_DEG)),
    "valley across the wind": (ridge(-60.0), 0, by_normal(ACROSS_VALLEY, VALLEY_NS_NORMAL_DEG)),
}


@pytest.mark.parametrize("name", SITES)
def test_every_sector_lies_where_it_was_expected(name: str) -> None:
    field, east_cells, expected = SITES[name]
    found = site(field, east_cells).speed_ratio[0]
    wrong = [
        f"from {22.5 * k:g}°: F {ratio:.2f}, expected {low:g} to {high:g}"
        for k, (ratio, (low, high)) in enumerate(zip(found, expected, strict=True))
        if not low <= ratio <= high
    ]
    assert not wrong, f"{name}: {'; '.join(wrong)}"


def test_behind_the_ridge_it_is_sheltered_and_before_it_only_slowed() -> None:
    foot = site(ridge(120.0), 20)
    assert (foot.shelter[0, 12], foot.shelter[0, 4]) == (pytest.approx(0.857, abs=0.01), 1.0)
    assert foot.speed_ratio[0, [4, 12]] == pytest.approx([0.82, 0.82], abs=0.01)
    assert foot.speed_up[0, [4, 12]] == pytest.approx([-0.18, -0.18], abs=0.01)


def test_behind_a_steeper_ridge_the_lee_is_the_calmer_side() -> None:
    steeper = site(ridge(200.0), 20).speed_ratio[0]
    assert steeper[12] < steeper[4] - 0.1


def test_prevailing_wind_along_the_valley_keeps_its_speed_and_across_it_loses() -> None:
    """East winds in the two valleys, one the other turned."""
    along, across = (site(SITES[name][0]).speed_ratio[0] for name in list(SITES)[2:])
    assert along[4] > 0.97 > 0.8 > across[4]
    assert np.roll(along, 4) == pytest.approx(across, abs=0.01)
