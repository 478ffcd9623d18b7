"""The wind at plots, sector by sector, compared with open level ground; each plot's sectors from its own true north."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._wind_kernel import plot_sectors
from sitescreen.climate.hill_speed_up import HillFields
from sitescreen.climate.roses import sector_bearings_deg
from sitescreen.climate.wind_cover import CoverFields, closure_of
from sitescreen.grid import Field
from sitescreen.settings import WindSettings
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class SectorWinds:
    """What the ground makes of the wind from each sector, at plots. No rose is in it yet.

    Parameters
    ----------
    plots : tuple of str, length n
        Plot ids; row k of every array is plot k.
    bearing_deg : float64 array, shape (sectors,)
        Centre of each sector: where the wind comes from, clockwise from true north. [°] 0, 22.5 … 337.5.
    speed_ratio : float64 array, shape (n, sectors)
        F: speed at 10 m over that over open level ground. [1] 1 is level ground. NaN where ground upwind is unknown.
    shelter : float64 array, shape (n, sectors)
        W: part of the speed that ground (and canopies) upwind leave, 0.3–1. [1] 1 is unsheltered.
    speed_up : float64 array, shape (n, sectors)
        ΔS: speed-up over hills, capped; negative in hollows. [1] 0 is level ground.
    """

    plots: tuple[str, ...]
    bearing_deg: FloatArray
    speed_ratio: FloatArray
    shelter: FloatArray
    speed_up: FloatArray

    def of(self, plots: tuple[str, ...]) -> "SectorWinds":
        """The same for other plots in another order; rows of NaN for those that are not among these."""
        place = {plot: row for row, plot in enumerate(self.plots)}
        rows = np.array([place.get(plot, -1) for plot in plots], dtype=np.int64)

        def picked(values: FloatArray) -> FloatArray:
            out = np.full((len(plots), len(self.bearing_deg)), np.nan)
            out[rows >= 0] = values[rows[rows >= 0]]
            return out

        return SectorWinds(
            plots, self.bearing_deg, picked(self.speed_ratio), picked(self.shelter), picked(self.speed_up)
        )


def together(parts: list[SectorWinds], plots: tuple[str, ...], sectors: int) -> SectorWinds:
    """The blocks' winds joined, in the order of ``plots``; rows of NaN for plots that no block has read."""
    nothing = np.empty((0, sectors))
    all_of = SectorWinds(
        tuple(plot for part in parts for plot in part.plots),
        sector_bearings_deg(sectors),
        *(
            np.concatenate([nothing, *(getattr(part, name) for part in parts)])
            for name in ("speed_ratio", "shelter", "speed_up")
        ),
    )
    return all_of.of(plots)


def sector_winds(
    plots: tuple[str, ...],
    elevation: Field,
    rise: Field,
    hills: HillFields,
    cover: CoverFields | None,
    begins: NDArray[np.int64],
    cells: NDArray[np.int64],
    shares: FloatArray,
    convergence_deg: FloatArray,
    least_known: float,
    settings: WindSettings,
) -> SectorWinds:
    """The wind of every sector at each plot: the mean over its cells.

    Parameters
    ----------
    plots : tuple of str, length n
    elevation, rise : Field
        Ground with open water at its level, raised by canopies where cover is given [m]; and the rise above the 1 km
        surroundings, known only where the ground around is: the hills' flow is not trusted beside unknown ground.
    hills : HillFields
        Of that ground.
    cover : CoverFields, or None
    begins : int64 array, shape (n + 1,)
        Plot k has the entries ``begins[k]`` to ``begins[k + 1]`` of the next two.
    cells : int64 array
        Flat index of each cell on the grid.
    shares : float64 array
        Part of the cell that lies in the plot.
    convergence_deg : float64 array, shape (n,)
        Bearing of grid north from true north at each plot. [°] The sectors are those of the plot's own true north.
    least_known : float
        Part of a plot that must be known, sector by sector.
    settings : WindSettings

    Notes
    -----
    See :func:`sitescreen.climate.wind.wind_fields` for F, W and ΔS. A field has one azimuth a sector for its whole
    block; here each plot has its own.
    """
    bearing = sector_bearings_deg(settings.sectors)
    azimuth = np.radians((bearing[None, :] - np.asarray(convergence_deg, dtype=np.float64)[:, None]) % 360.0)
    ratio, left, up = (np.empty((len(plots), settings.sectors)) for _ in range(3))
    closure = closure_of(settings)
    cover_ground, canopy, ln_roughness, how = CoverFields.arrays(cover, settings)
    in_bands(
        plot_sectors,
        len(plots),
        elevation.values,
        np.isfinite(rise.values),
        *hills,
        cover_ground,
        canopy,
        ln_roughness,
        elevation.grid.cell_size_m,
        np.asarray(begins, dtype=np.int64),
        cells,
        shares,
        azimuth,
        settings.shelter_reach_m,
        settings.receptor_height_m,
        closure,
        how,
        least_known,
        ratio,
        left,
        up,
        bands_a_thread=8,
    )
    return SectorWinds(plots, bearing, ratio, left, up)


__all__ = ["SectorWinds", "sector_winds", "together"]
