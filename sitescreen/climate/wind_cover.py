"""What ground cover does to the wind: canopies raise the ground and shelter downwind, roughness slows the air."""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.inputs.cover import Cover
from sitescreen.settings import WindSettings

_NO_CELLS = np.zeros((0, 0), dtype=np.float32)


@dataclass(frozen=True)
class CoverFields:
    """Ground cover on a grid, as the wind meets it.

    Parameters
    ----------
    ground : Field
        Height of the bare ground. [m]
    canopy_m : float32 array, shape (rows, cols)
        Height of trees or buildings; 0 where none are mapped. [m]
    ln_roughness : float32 array, shape (rows, cols)
        Natural logarithm of the roughness length in metres; that of open country where nothing is mapped.
    """

    ground: Field
    canopy_m: NDArray[np.float32]
    ln_roughness: NDArray[np.float32]

    def raised(self, settings: WindSettings) -> Field:
        """The ground that the wind meets: bare ground plus the canopy's displacement height. [m]"""
        values = self.ground.values + np.float32(settings.canopy_displacement) * self.canopy_m
        return Field(values, self.ground.grid, "m", "height of the ground as the wind meets it")

    @staticmethod
    def arrays(cover: "CoverFields | None", settings: WindSettings) -> tuple[Any, Any, Any, tuple[float, ...]]:
        """What the kernels take: three rasters, without cells where there is no cover, and the closure's numbers."""
        how = (
            settings.canopy_displacement,
            settings.windbreak_most,
            settings.windbreak_full_heights,
            settings.windbreak_span_heights,
            settings.shelter_reach_m,
            settings.roughness_fetch_m,
            math.log(settings.roughness_m),
            settings.receptor_height_m,
        )
        if cover is None:
            return _NO_CELLS, _NO_CELLS, _NO_CELLS, how
        # beyond this no canopy on the grid shelters anything
        farthest = (settings.windbreak_full_heights + settings.windbreak_span_heights) * float(cover.canopy_m.max())
        how = (*how[:4], min(farthest, settings.shelter_reach_m), *how[5:])
        return cover.ground.values, cover.canopy_m, cover.ln_roughness, how


def wind_cover(cover: Cover, ground: Field, settings: WindSettings) -> CoverFields:
    """Canopy and roughness of a map of ground cover on the grid of the ground.

    Parameters
    ----------
    cover : Cover
    ground : Field
        Height of the bare ground. [m]
    settings : WindSettings
        Where no class is mapped there is no canopy, and the roughness is that of open country.
    """
    classes = cover.classes(ground.grid)
    rough = cover.values(classes, "roughness_m", settings.roughness_m)
    return CoverFields(ground, cover.values(classes, "canopy_m", 0.0), np.log(rough))


def closure_of(settings: WindSettings) -> tuple[float, float, float, float, float]:
    """Shelter's start, span and most, speed-up's least and most, as the kernels take them."""
    return (
        settings.shelter_from_tangent,
        settings.shelter_span_tangent,
        settings.shelter_most,
        settings.speed_up_least,
        settings.speed_up_most,
    )
