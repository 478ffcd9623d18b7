"""One terrain raster: what it says of itself, whether that can be believed, and its heights in metres."""

import math
import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import rasterio
from numpy.typing import NDArray
from pyproj import CRS
from rasterio.errors import NotGeoreferencedWarning, RasterioError, RasterioIOError
from rasterio.windows import Window

from sitescreen.errors import InputError
from sitescreen.notes import Note

SENTINELS = (-32768.0, -32767.0, -9999.0, -10000.0, -99999.0)
"""Values that stand for "no height" in many files that do not say so; ±3.4e38 and beyond do as well."""

HUGE = 1e30
LOWEST_M, HIGHEST_M = -12_000.0, 9_000.0
"""No ground or sea floor lies beyond. [m]"""


@dataclass(frozen=True)
class RasterFile:
    """One raster, as rows from north to south and columns from west to east.

    ``west`` and ``north`` are the outer corner of its first cell, ``step_x`` and ``step_y`` its cells' sides, all in
    units of its coordinate system. ``upside_down`` and ``mirrored``: it stores rows or columns the other way round.
    ``unit_m``: metres in its vertical unit. ``masked``: a mask beside the values says where there are none.
    """

    path: Path
    crs_wkt: str
    west: float
    north: float
    step_x: float
    step_y: float
    rows: int
    cols: int
    upside_down: bool
    mirrored: bool
    unit_m: float
    scale: float
    offset: float
    nodata: float | None
    masked: bool
    has_heights: bool = True
    notes: tuple[Note, ...] = ()

    @property
    def name(self) -> str:
        """File name without its folder."""
        return self.path.name

    @property
    def crs(self) -> CRS:
        """The horizontal coordinate system."""
        return CRS.from_wkt(self.crs_wkt)

    def read_raw(self, source: Any, window: Window) -> tuple[NDArray[Any], NDArray[np.bool_]]:
        """Values as stored, and where they stand for no height; rows and columns as the file has them."""
        try:
            raw = source.read(1, window=window)
            hidden = source.read_masks(1, window=window) == 0 if self.masked else False
        except RasterioError as error:
            raise InputError(
                f"the terrain file {self.name} is damaged or cut off: heights in it cannot be read",
                "a whole raster is needed",
                "Copy or download it again",
            ) from error
        return raw, is_absent(raw, self.nodata) | hidden

    def in_metres(self, raw: NDArray[Any]) -> NDArray[np.float32]:
        """Stored values as heights. [m]"""
        with np.errstate(over="ignore", invalid="ignore"):
            if (self.unit_m, self.scale, self.offset) == (1.0, 1.0, 0.0):
                return np.array(raw, dtype=np.float32)
            return ((raw.astype(np.float64) * self.scale + self.offset) * self.unit_m).astype(np.float32)

    def read_m(self, source: Any, row0: int, row1: int, col0: int, col1: int) -> NDArray[np.float32]:
        """Heights of a window, row 0 north. [m] NaN where there is none.

        Parameters
        ----------
        source : rasterio dataset
            This file, opened.
        row0, row1, col0, col1 : int
            Half-open ranges of rows and columns.

        Raises
        ------
        InputError
            If the file is damaged there.
        """
        if self.upside_down:
            row0, row1 = self.rows - row1, self.rows - row0
        if self.mirrored:
            col0, col1 = self.cols - col1, self.cols - col0
        raw, absent = self.read_raw(source, Window(col0, row0, col1 - col0, row1 - row0))
        heights = self.in_metres(raw)
        with np.errstate(invalid="ignore"):
            heights[absent | (heights < LOWEST_M) | (heights > HIGHEST_M)] = np.nan
        heights = heights[::-1] if self.upside_down else heights
        return np.ascontiguousarray(heights[:, ::-1] if self.mirrored else heights)


def is_absent(raw: NDArray[Any], nodata: float | None) -> NDArray[np.bool_]:
    """Where stored values stand for "no height": the declared one, the usual undeclared ones, NaN and infinity."""
    absent = _is_sentinel(raw)
    if raw.dtype.kind == "f":
        absent |= ~np.isfinite(raw) | (np.abs(raw) >= HUGE)
    if nodata is not None and not math.isnan(nodata):
        # as the file's own type holds it: -3.4028234663852886e+38 and its float32 are not the same number
        with np.errstate(over="ignore", invalid="ignore"):
            absent |= raw == np.asarray(nodata).astype(raw.dtype) if _fits(nodata, raw.dtype) else False
    return absent


def _is_sentinel(raw: NDArray[Any]) -> NDArray[np.bool_]:
    absent = np.zeros(raw.shape, dtype=bool)
    for value in SENTINELS:
        if _fits(value, raw.dtype):
            absent |= raw == np.asarray(value).astype(raw.dtype)
    return absent


def _fits(value: float, dtype: np.dtype[Any]) -> bool:
    if dtype.kind == "f":
        return True
    limits = np.iinfo(dtype)
    return value == int(value) and limits.min <= value <= limits.max


def opened(path: Path) -> Any:
    """A raster opened for reading.

    Raises
    ------
    InputError
        If it is not there or is no raster.
    """
    if not path.exists():
        raise InputError(
            f"the terrain file {path} is not there",
            "an existing raster is needed",
            "Check the name under [terrain] files; paths are relative to the brief",
        )
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", NotGeoreferencedWarning)  # told below, as an error with a way out
            return rasterio.open(path)
    except RasterioIOError as error:
        raise InputError(
            f"the terrain file {path.name} cannot be opened as a raster",
            "a whole raster that GDAL reads is needed, such as GeoTIFF, HGT or an ASCII grid",
            "Check that it is the right file, and copy or download it again",
        ) from error
