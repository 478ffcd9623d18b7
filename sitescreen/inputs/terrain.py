"""The terrain model: one surface of heights in metres, from however many files it came in."""

import math
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer

from sitescreen.brief import TerrainBrief
from sitescreen.errors import BriefError, GridError, InputError
from sitescreen.grid import Bounds, Field, Grid
from sitescreen.inputs.canopy import Canopy, open_canopy
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.terrain_headers import read_header
from sitescreen.inputs.terrain_mosaic import Mosaic, mosaic_datum, mosaics
from sitescreen.inputs.terrain_products import Surface, terrain_error
from sitescreen.inputs.terrain_voids import WIDTH_CELLS
from sitescreen.inputs.terrain_warp import CLOSED, OUTSIDE, VOID, central_meridian_deg, is_wgs84_degrees, warped
from sitescreen.lattice import cell_size_m
from sitescreen.notes import Note

ARC_SECOND_M = 1852.0 / 60.0
"""An arc second of latitude, by the nautical mile. [m] One figure for the whole Earth, so that the cell size cannot
depend on which tiles are given."""

NEAR_DEG = 15.0
"""Terrain farther than this from a grid's central meridian cannot lie on it. [°]"""

INTERPOLATED_FROM = 1.5
"""Cells of a file this many times the grid's deserve a note."""


class Heights(NamedTuple):
    """The same ground twice, on one grid. [m]"""

    ground: Field
    """Interpolated: smooth, for slopes and horizons."""
    stored: Field
    """Of the model's own cell under each centre: exact, for telling level water."""

    def part(self, bounds: Bounds) -> "Heights":
        """Both inside bounds that lie on the grid's cell edges."""
        return Heights(self.ground.part(bounds), self.stored.part(bounds))


@dataclass
class Terrain:
    """A terrain model that reads heights when they are asked for.

    Parameters
    ----------
    mosaics : tuple of Mosaic
        In the order in which they fill the ground.
    cell_size_m : float
        Step of the lattice that suits the finest file. [m]
    vertical_error_m : float
        One standard deviation of the heights. [m]
    error_range_m : float
        Distance over which errors hang together. [m]
    surface : "bare" or "canopy"
        What the heights show.
    stamps : tuple of FileStamp
    canopy : Canopy, optional
        Heights of trees and roofs, which :meth:`read` takes off.
    notes : tuple of Note
        What opening the files told. See also :attr:`findings`.
    """

    mosaics: tuple[Mosaic, ...]
    cell_size_m: float
    vertical_error_m: float
    error_range_m: float
    surface: Surface
    stamps: tuple[FileStamp, ...]
    notes: tuple[Note, ...]
    canopy: Canopy | None = None
    _closed_km2: float = field(default=0.0, repr=False)
    _void_km2: float = field(default=0.0, repr=False)
    _read_km2: float = field(default=0.0, repr=False)

    def data_bounds(self, crs: str) -> Bounds:
        """West, south, east and north of all files' ground near a metric system's meridian. [m]

        The outlines are followed at absolute places, so that a tile cut in four has the bounds of the tile.

        Raises
        ------
        GridError
            If there is no terrain near that meridian.
        """
        to_grid = Transformer.from_crs("EPSG:4326", crs, always_xy=True)
        middle = central_meridian_deg(crs, to_grid, np.zeros(1), np.zeros(1))
        points = []
        for mosaic in self.mosaics:
            outline = _lonlat_outline(mosaic)
            turns = np.round((np.array(outline.bounds)[[0, 2]] - middle) / 360.0)
            for turn in np.unique(turns):
                near = shapely.box(middle + 360.0 * turn - NEAR_DEG, -90.0, middle + 360.0 * turn + NEAR_DEG, 90.0)
                inside = outline if near.contains(outline) else shapely.intersection(outline, near)
                points.append(shapely.get_coordinates(inside))
        lonlat = np.concatenate(points)
        east, north = to_grid.transform(lonlat[:, 0], lonlat[:, 1])
        if not len(lonlat) or not (np.isfinite(east).all() and np.isfinite(north).all()):
            raise GridError(
                f"the terrain lies far from where the grid {crs} is drawn",
                "terrain near the grid's central meridian is needed",
                "Check that terrain and plots are of the same place",
            )
        return float(east.min()), float(north.min()), float(east.max()), float(north.max())

    def data_outline(self) -> Any:
        """The ground that the files cover, holes in their data included: shapely geometry, EPSG:4326."""
        parts = [_within_180(_lonlat_outline(mosaic)) for mosaic in self.mosaics]
        return parts[0] if len(parts) == 1 else shapely.union_all(parts)

    def elevation(self, grid: Grid) -> Field:
        """Heights at the cell centres of a grid: the ground of :meth:`read`. [m]"""
        return self.read(grid).ground

    def read(self, grid: Grid) -> "Heights":
        """Heights at the cell centres of a grid.

        Parameters
        ----------
        grid : Grid

        Returns
        -------
        Heights
            Height above the files' vertical datum. [m] NaN outside the files and in their gaps, save gaps up to three
            cells wide, which are closed from their rims. Of a surface of tree tops with a canopy layer the ground
            below; what the model holds stays with its trees.

        Raises
        ------
        InputError
            If a file turns out to be damaged.
        """
        heights: NDArray[np.float32] = np.full(grid.shape, np.nan, dtype=np.float32)
        under: NDArray[np.uint8] = np.full(grid.shape, OUTSIDE, dtype=np.uint8)
        stored: NDArray[np.float32] = np.full(grid.shape, np.nan, dtype=np.float32)
        for mosaic in self.mosaics:
            warped(mosaic, mosaic_datum(mosaic), grid, heights, under, stored)
        if self.canopy is not None:
            heights -= self.canopy.height_m(grid)
        cell_km2 = (grid.cell_size_m / 1000.0) ** 2
        self._closed_km2 += cell_km2 * float(np.count_nonzero(under == CLOSED))
        self._void_km2 += cell_km2 * float(np.count_nonzero(under == VOID))
        self._read_km2 += cell_km2 * float(np.count_nonzero(under != OUTSIDE))
        return Heights(
            Field(heights, grid, "m", "height of the ground"), Field(stored, grid, "m", "height as the model holds it")
        )

    @property
    def findings(self) -> tuple[Note, ...]:
        """What reading heights has told so far: gaps in the ground that was read, closed and left."""
        notes = []
        if self._closed_km2:
            said = f"Gaps up to {WIDTH_CELLS} cells wide were closed from their rims: {_km2(self._closed_km2)} in all."
            notes.append(Note("info", "terrain", said))
        if self._void_km2:
            share = 100.0 * self._void_km2 / self._read_km2
            said = (
                f"The terrain has no heights on {_km2(self._void_km2)} of the ground that was read ({share:.2g} %): "
                "wider gaps, or sea. Where no sea is mapped, these stay unknown."
            )
            notes.append(Note("info", "terrain", said))
        return tuple(notes)


def _km2(area: float) -> str:
    return f"{area:.2g} km²" if area < 10.0 else f"{area:,.0f} km²"


def _lonlat_outline(mosaic: Mosaic) -> Any:
    """A mosaic's outline, EPSG:4326; longitudes as its files count them."""
    datum, outline = mosaic_datum(mosaic), mosaic.outline()
    if is_wgs84_degrees(datum):
        return outline

    def move(xy: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.column_stack(datum.transformer.transform(xy[:, 0], xy[:, 1]))

    return shapely.transform(outline, move)


def _within_180(outline: Any) -> Any:
    """The same ground with longitudes from −180 to 180."""
    west, _, east, _ = outline.bounds
    if west >= -180.0 and east <= 180.0:
        return outline
    parts = []
    for turn in range(math.floor((west + 180.0) / 360.0), math.floor((east + 180.0) / 360.0) + 1):
        inside = shapely.intersection(outline, shapely.box(360.0 * turn - 180.0, -91.0, 360.0 * turn + 180.0, 91.0))
        parts.append(shapely.transform(inside, lambda xy, by=360.0 * turn: xy - np.array([by, 0.0])))
    return shapely.union_all(parts)


def open_terrain(brief: TerrainBrief) -> Terrain:
    """Open the terrain files of a brief: what they say of themselves is read, and a sample of their heights.

    Parameters
    ----------
    brief : TerrainBrief
        The files are joined; where several have a height the first-named one's counts.

    Raises
    ------
    InputError
        If a file is missing, damaged, has no usable coordinate system, or claims one that does not fit; if no file has
        any height; if the brief names an unknown product.
    """
    error = terrain_error(brief)
    files = [read_header(path, brief.vertical_unit, brief.crs) for path in brief.files]
    empty = [file.name for file in files if not file.has_heights]
    if len(empty) == len(files):
        raise InputError(
            f"the terrain {', '.join(empty[:3])}{' …' if len(empty) > 3 else ''} holds no height at all",
            "a raster with heights is needed",
            "Check that it is the right file, and that its no-data value is not that of the ground",
        )
    groups = mosaics(files)
    for mosaic in groups:
        mosaic_datum(mosaic)  # refuses a datum that no published way leads from, before any work is done
    step = cell_size_m(min(_spacing_m(mosaic) for mosaic in groups))
    notes = [*error.notes, *_said_once([(file.name, note) for file in files for note in file.notes])]
    if empty:
        notes.append(Note("warning", "terrain", f"No height at all is in {', '.join(empty)}."))
    notes += [Note("info", "terrain", said) for mosaic in groups if (said := mosaic_datum(mosaic).said)]
    notes += _spacing_notes(groups, step)
    stamps = tuple(stamp(file.path, _short_crs(file.crs)) for file in files)
    surface, canopy = error.surface, None
    if brief.canopy_height is not None:
        if surface == "bare":
            raise BriefError(
                "[terrain] canopy_height was given for a model of bare ground",
                "a model that shows tree tops and roofs is needed for it",
                'Set surface = "canopy", or leave canopy_height out',
            )
        canopy = open_canopy(brief.canopy_height)
        surface, stamps = "bare", (*stamps, canopy.stamp)
        notes += canopy.notes
    return Terrain(groups, step, error.vertical_error_m, error.error_range_m, surface, stamps, tuple(notes), canopy)


def _short_crs(crs: CRS) -> str:
    code = crs.to_epsg()
    return f"EPSG:{code}" if code else str(crs.name)


def _spacing_m(mosaic: Mosaic) -> float:
    """Spacing of a mosaic's cells on the ground. [m]"""
    lattice = mosaic.lattice
    if mosaic.crs.is_geographic:
        return lattice.step_y * 3600.0 * ARC_SECOND_M
    unit_m = float(mosaic.crs.axis_info[0].unit_conversion_factor)
    return math.sqrt(lattice.step_x * lattice.step_y) * unit_m


def _spacing_notes(groups: tuple[Mosaic, ...], step: float) -> list[Note]:
    """What to say of files that are coarser than the grid, and of coarse ones that hide finer ones."""
    notes = []
    for number, mosaic in enumerate(groups):
        spacing, name = _spacing_m(mosaic), mosaic.files[0].name
        if spacing > INTERPOLATED_FROM * step:
            said = f"{name} has cells of about {spacing:.0f} m; reading them at {step:g} m shows nothing finer."
            notes.append(Note("info", "terrain", said))
        here = shapely.box(*_lonlat_outline(mosaic).bounds)
        for later in groups[number + 1 :]:
            finer = spacing > INTERPOLATED_FROM * _spacing_m(later)
            if finer and here.intersects(shapely.box(*_lonlat_outline(later).bounds)):
                said = (
                    f"{name} (cells of {spacing:.0f} m) is named before {later.files[0].name} (cells of "
                    f"{_spacing_m(later):.0f} m), so the coarser counts where both have heights. Name the finer first."
                )
                notes.append(Note("warning", "terrain", said))
    return notes


def _said_once(said: list[tuple[str, Note]]) -> list[Note]:
    """What many files have to say alike, said of the first of them."""
    alike: dict[str, list[Note]] = {}
    for name, note in said:
        alike.setdefault(note.text.replace(name, ""), []).append(note)
    out = []
    for notes in alike.values():
        more = len(notes) - 1
        tail = f" The same goes for {more} more file{'s' if more > 1 else ''}." if more else ""
        out.append(Note(notes[0].level, notes[0].where, notes[0].text + tail))
    return out
