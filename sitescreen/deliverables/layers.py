"""``layers/*.tif``: each measured field as a cloud-optimised GeoTIFF."""

import math
import os
import re
from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from rasterio.io import MemoryFile
from rasterio.shutil import copy

from sitescreen.grid import Field

FOLDER = "layers"

STEPS_PER_UNIT = {"m": 64, "°": 32, "km": 1024, "1": 1024, "K": 64}
"""Values are rounded to this part of their unit (1.6 cm, 0.03°, 1 m, 0.001): far below what any terrain model knows,
and half the bytes. Powers of two, so that the rounded numbers end in zero bits."""


def rounded(field: Field) -> NDArray[np.float32]:
    """The field's values, to the nearest step of its unit; as they are where the unit has none."""
    steps = STEPS_PER_UNIT.get(field.unit)
    if steps is None:
        return field.values
    scaled = np.round(field.values * np.float32(steps)) / np.float32(steps)
    return scaled.astype(np.float32, copy=False)


def file_name(key: str) -> str:
    """The file of a field: its key, with anything but letters, digits, ``_`` and ``-`` replaced."""
    return re.sub(r"[^A-Za-z0-9_-]+", "_", key) + ".tif"


def write_layers(fields: Mapping[str, Field], folder: Path) -> None:
    """Write each field into a file of its own, several at a time: most of the work is compressing.

    Parameters
    ----------
    fields : mapping of name to Field
    folder : Path
        It exists.
    """
    with ThreadPoolExecutor(max_workers=min(4, os.cpu_count() or 1)) as pool:
        done = [pool.submit(write_layer, field, folder / file_name(key)) for key, field in fields.items()]
        for one in done:
            one.result()


def write_layer(field: Field, path: Path) -> None:
    """Write one field; unknown cells are NaN, and unit and meaning stand in the band's tags.

    Parameters
    ----------
    field : Field
    path : Path
        Its folder exists.

    Raises
    ------
    OSError
        If it cannot be written, as on a full disk.
    """
    grid = field.grid
    profile = {
        "driver": "GTiff",
        "width": grid.cols,
        "height": grid.rows,
        "count": 1,
        "dtype": "float32",
        "crs": grid.crs,
        "transform": grid.transform,
        "nodata": math.nan,
    }
    with MemoryFile(ext=".tif") as plain, MemoryFile(ext=".tif") as optimised:
        with plain.open(**profile) as band:
            band.write(rounded(field), 1)
            band.set_band_description(1, field.what)
            band.set_band_unit(1, field.unit)
            band.update_tags(unit=field.unit, description=field.what, AREA_OR_POINT="Area")
        copy(
            plain.name,
            optimised.name,
            driver="COG",
            COMPRESS="DEFLATE",
            LEVEL="4",  # a third of the time of the default for a twentieth more bytes
            PREDICTOR="FLOATING_POINT",
            # codes have no mean
            OVERVIEW_RESAMPLING="NEAREST" if field.unit == "code" else "AVERAGE",
        )
        # made in memory and written by Python: on a full disk GDAL may leave half a file and say nothing
        path.write_bytes(optimised.read())
