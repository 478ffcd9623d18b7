"""Open water as the terrain model itself shows it: wide, exactly level ground; and whether the map agrees."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from sitescreen.grid import Field, Grid

LEVEL_M = 0.01
"""Heights this close are the same level. [m] Terrain models lay water flat; ground is never that level for long."""


RIM_CELLS = 3
"""Cells round level ground whose heights the cubic warp has mixed with the land: two for its reach, one for the rim."""
RIM_M = 0.5
"""A cell of that rim this close to the level is water still. [m] (our closure)"""


@dataclass(frozen=True)
class FlatWater:
    """Connected, exactly level ground.

    Parameters
    ----------
    label : int32 array, shape (rows, cols)
        0 where the ground is not level, else 1 … n.
    level_m : float64 array, shape (n,)
        Height of each. [m]
    area_km2 : float64 array, shape (n,)
    grid : Grid
    """

    label: NDArray[np.int32]
    level_m: NDArray[np.float64]
    area_km2: NDArray[np.float64]
    grid: Grid


def flat_water(elevation: Field, smallest_km2: float = 0.5) -> FlatWater:
    """Find water by its being level.

    Parameters
    ----------
    elevation : Field
        Height. [m]
    smallest_km2 : float
        Smaller level patches are left out: a terrace or a pitch is level too. [km²]

    Returns
    -------
    FlatWater
        Numbered from the north-west. Salt pans and other ground that a model in whole metres shows as level are found
        as well: the terrain alone cannot tell.

    Notes
    -----
    The heart of a water is made of cells that are the middle of nine within 1 cm, and lie within 1 cm of its median;
    where most do not, as on a plain that falls by millimetres a cell, it is no water. Up to three cells round the
    heart belong to it as long as they are within 0.5 m of its level. Arms too narrow to have a heart are missed: of a
    very ragged lake of 505 km² on a 90 m grid, 437 km² were found, with 0.1 % of dry ground among them.
    """
    heights = elevation.values
    high = ndimage.maximum_filter(np.where(np.isnan(heights), np.float32(np.inf), heights), 3, mode="nearest")
    low = ndimage.minimum_filter(np.where(np.isnan(heights), np.float32(-np.inf), heights), 3, mode="nearest")
    with np.errstate(invalid="ignore"):
        middle = (high - low) <= LEVEL_M
    cores, _ = ndimage.label(middle)
    sizes = np.bincount(cores.ravel())
    cell_km2 = (elevation.grid.cell_size_m / 1000.0) ** 2
    label = np.zeros(elevation.grid.shape, dtype=np.int32)
    levels: list[float] = []
    areas: list[float] = []
    for core, box in enumerate(ndimage.find_objects(cores), start=1):
        if sizes[core] * (1 + 2 * RIM_CELLS) ** 2 * cell_km2 < smallest_km2:
            continue  # its rim cannot bring it to size; saves looking at every small terrace
        grown = tuple(slice(max(0, side.start - RIM_CELLS), side.stop + RIM_CELLS) for side in box)
        heart = cores[grown] == core
        level = float(np.median(heights[grown][heart]))
        off_m = np.abs(heights[grown] - level)
        heart &= off_m <= LEVEL_M
        if heart.sum() < 0.5 * sizes[core]:
            continue
        rim = (off_m <= RIM_M) & (label[grown] == 0)
        patch = ndimage.binary_dilation(heart, np.ones((3, 3), dtype=bool), iterations=RIM_CELLS, mask=rim)
        area = float(patch.sum()) * cell_km2
        if area < smallest_km2:
            continue
        levels.append(level)
        areas.append(area)
        label[grown][patch] = len(levels)
    return FlatWater(label, np.array(levels, dtype=np.float64), np.array(areas, dtype=np.float64), elevation.grid)


@dataclass(frozen=True)
class WaterDisagreement:
    """How far the mapped water and the level ground of the terrain differ.

    Parameters
    ----------
    mapped_km2, flat_km2, both_km2 : float
        Mapped water on known ground, level ground, and where they agree. [km²]
    overlap : float
        Intersection over union, 0–1; NaN where there is neither.
    mapped_not_flat_share : float
        Share of the mapped water, on known ground, that is not level. NaN without mapped water.
    lake_shore_range_m : float
        Largest difference between the 5th and 95th percentile of the ground's height along one mapped lake's rim: a
        lake has one level. [m] NaN without a lake.
    sea_high_m : float
        95th percentile of the ground's height under the mapped sea. [m] NaN without sea on known ground.
    """

    mapped_km2: float
    flat_km2: float
    both_km2: float
    overlap: float
    mapped_not_flat_share: float
    lake_shore_range_m: float
    sea_high_m: float

    @property
    def agrees(self) -> bool:
        """Whether map and terrain tell much the same story (limits: our closure)."""
        return not (self.overlap < 0.8 or self.lake_shore_range_m > 10.0 or self.sea_high_m > 10.0)

    @property
    def sentence(self) -> str:
        """The finding in plain words, with figures."""
        if self.mapped_km2 == 0.0 and self.flat_km2 == 0.0:
            return "Neither the shore layer nor the terrain shows open water here."
        said = (
            f"Mapped water covers {self.mapped_km2:.1f} km² of known ground, the terrain shows {self.flat_km2:.1f} km² "
            f"of level water; they share {self.both_km2:.1f} km² (overlap {self.overlap:.2f})."
        )
        if self.mapped_not_flat_share > 0.2:
            said += f" {self.mapped_not_flat_share:.0%} of the mapped water lies over ground that is not level."
        if self.lake_shore_range_m > 10.0:
            said += f" Along one lake's mapped shore the ground varies by {self.lake_shore_range_m:.0f} m."
        if self.sea_high_m > 10.0:
            said += f" Under the mapped sea the ground reaches {self.sea_high_m:.0f} m."
        if not self.agrees:
            said += " Distances follow the shore layer; check it against the terrain."
        return said


def water_disagreement(water_kind: NDArray[np.uint8], flat: FlatWater, elevation: Field) -> WaterDisagreement:
    """Compare mapped water with level ground.

    Parameters
    ----------
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake, as mapped.
    flat : FlatWater
    elevation : Field
        Height. [m] Where it is unknown nothing is compared: terrain models often leave the sea out.
    """
    cell_km2 = (elevation.grid.cell_size_m / 1000.0) ** 2
    known = np.isfinite(elevation.values)
    mapped, level = (water_kind > 0) & known, (flat.label > 0) & known
    both, either = int((mapped & level).sum()), int((mapped | level).sum())
    number = int(mapped.sum())
    sea = elevation.values[(water_kind == 1) & known]
    return WaterDisagreement(
        mapped_km2=number * cell_km2,
        flat_km2=float(level.sum()) * cell_km2,
        both_km2=both * cell_km2,
        overlap=both / either if either else float("nan"),
        mapped_not_flat_share=1.0 - both / number if number else float("nan"),
        lake_shore_range_m=_lake_shore_range_m(water_kind == 2, elevation.values),
        sea_high_m=float(np.percentile(sea, 95.0)) if sea.size else float("nan"),
    )


def _lake_shore_range_m(lake: NDArray[np.bool_], heights: NDArray[np.float32]) -> float:
    """The worst lake's range of height along its rim, from the lake's outermost cells."""
    if not lake.any():
        return float("nan")
    # the window's own edge is no rim, hence border_value=1
    rim = lake & ~ndimage.binary_erosion(lake, border_value=1) & np.isfinite(heights)
    lakes, _ = ndimage.label(lake, np.ones((3, 3), dtype=bool))
    numbers, at = lakes[rim], heights[rim]
    order = np.argsort(numbers, kind="stable")
    starts = np.flatnonzero(np.diff(numbers[order], prepend=-1))
    ranges = [
        float(np.subtract(*np.percentile(group, (95.0, 5.0))))
        for group in np.split(at[order], starts[1:])
        if group.size >= 8
    ]
    return max(ranges, default=float("nan"))


__all__ = ["FlatWater", "WaterDisagreement", "flat_water", "water_disagreement"]
