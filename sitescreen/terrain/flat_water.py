"""Open water as the terrain model itself shows it: wide, exactly level ground; and whether the map agrees."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from sitescreen.grid import Field, Grid
from sitescreen.terrain._flat_water_kernel import level_patches


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

    def part(self, grid: Grid, window: tuple[slice, slice]) -> "FlatWater":
        """The same waters, as far as they lie in a window; level and area stay those of the whole."""
        return replace(self, label=self.label[window], grid=grid)


def flat_water(stored: Field, smallest_km2: float = 0.5) -> FlatWater:
    """Find water by its being exactly level.

    Parameters
    ----------
    stored : Field
        Heights as the terrain model holds them, not interpolated: interpolation mixes a lake's rim, and all of its
        narrow arms, with the land. [m]
    smallest_km2 : float
        Smaller level patches are left out: a terrace or a pitch is level too. [km²]

    Returns
    -------
    FlatWater
        Numbered from the north-west: cells of one height that share sides, at least one of them the middle of nine. The
        terrain alone cannot tell salt pans, and other ground that a model in whole metres shows as level, from water.
    """
    patches = np.zeros(stored.grid.shape, dtype=np.int32)
    count = int(level_patches(stored.values, patches))
    cell_km2 = (stored.grid.cell_size_m / 1000.0) ** 2
    area = np.bincount(patches.ravel(), minlength=count + 1) * cell_km2
    area[0] = 0.0
    kept = np.flatnonzero(area >= smallest_km2)
    number = np.zeros(count + 1, dtype=np.int32)
    number[kept] = np.arange(1, len(kept) + 1)
    first = np.zeros(count + 1, dtype=np.int64)
    places = np.flatnonzero(patches.ravel())[::-1]
    first[patches.ravel()[places]] = places  # the first cell of each patch is written last
    level = stored.values.ravel()[first[kept]].astype(np.float64)
    return FlatWater(number[patches], level, np.asarray(area[kept], dtype=np.float64), stored.grid)


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


def together(parts: Sequence[WaterDisagreement]) -> WaterDisagreement:
    """The figures of several pieces of ground that do not overlap, as one: areas added, ranges at their worst."""
    mapped, flat, both = (sum(getattr(part, name) for part in parts) for name in ("mapped_km2", "flat_km2", "both_km2"))
    either = mapped + flat - both
    return WaterDisagreement(
        mapped_km2=mapped,
        flat_km2=flat,
        both_km2=both,
        overlap=both / either if either else float("nan"),
        mapped_not_flat_share=1.0 - both / mapped if mapped else float("nan"),
        lake_shore_range_m=_worst(part.lake_shore_range_m for part in parts),
        sea_high_m=_worst(part.sea_high_m for part in parts),
    )


def _worst(figures: Iterable[float]) -> float:
    return max((figure for figure in figures if np.isfinite(figure)), default=float("nan"))


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


__all__ = ["FlatWater", "WaterDisagreement", "flat_water", "together", "water_disagreement"]
