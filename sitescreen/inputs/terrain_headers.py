"""What a terrain raster says of itself, checked before it is believed."""

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyproj import CRS
from pyproj.exceptions import CRSError
from rasterio.windows import Window

from sitescreen.errors import InputError
from sitescreen.inputs.datum import named_crs, refuse_unlike_its_system
from sitescreen.inputs.terrain_files import HIGHEST_M, LOWEST_M, SENTINELS, RasterFile, opened
from sitescreen.notes import Note

SMELLS_OF_FEET_M = 6_000.0
"""Higher than people live: where no unit is stated, feet are likely. [m]"""

LOWEST_LAND_M = -450.0
"""No dry land lies lower: the lowest shore on Earth is at about −430. [m]"""

SAMPLE_BLOCKS = 9
"""Blocks of a file that are looked at before it is used, the first and the last among them."""

FEET_M = 0.3048
_UNITS_M = {
    **dict.fromkeys(("m", "metre", "metres", "meter", "meters"), 1.0),
    **dict.fromkeys(("ft", "foot", "feet", "international foot"), FEET_M),
    **dict.fromkeys(
        ("us-ft", "us survey foot", "us survey feet", "ftus", "foot_us", "us_survey_foot"), 1200.0 / 3937.0
    ),
    "dm": 0.1,
    "decimetre": 0.1,
    "cm": 0.01,
    "centimetre": 0.01,
    "mm": 0.001,
}


def read_header(path: Path, vertical_unit: str | None = None, crs: str | None = None) -> RasterFile:
    """What a raster says of itself, checked against a sample of its heights.

    Parameters
    ----------
    path : Path
    vertical_unit : "m" or "ft", optional
        What the brief says; it has the last word.
    crs : str, optional
        What the brief says for files that say nothing.

    Raises
    ------
    InputError
        If it cannot be read, is a picture, is turned, has no usable coordinate system, or claims one that does not fit
        its coordinates or heights.
    """
    with opened(path) as source:
        notes: list[Note] = []
        _refuse_pictures(source, path.name)
        system, vertical = _systems(source, path.name, crs, notes)
        shape = _georeference(source, path.name, system)
        unit_m = _unit_m(source, path.name, vertical, vertical_unit, notes)
        flags = source.mask_flag_enums[0]
        file = RasterFile(
            path=path,
            crs_wkt=system.to_wkt(),
            **shape,
            unit_m=unit_m if unit_m is not None else 1.0,
            scale=float(source.scales[0]),
            offset=float(source.offsets[0]),
            nodata=source.nodatavals[0],
            masked=any(flag.name in ("per_dataset", "alpha") for flag in flags),
        )
        known_m, said = _look(file, source)
    notes += said + _range_notes(file, known_m, unit_m is None)
    return replace(file, has_heights=known_m.size > 0, notes=tuple(notes))


def _refuse_pictures(source: Any, name: str) -> None:
    if source.count == 0:
        raise InputError(
            f"the terrain file {name} holds {len(source.subdatasets)} layers and none of its own",
            "a raster of heights is needed",
            "Save the layer of heights as a GeoTIFF",
        )
    colours = {one.name for one in source.colorinterp}
    if {"red", "green", "blue"} <= colours or "palette" in colours or source.dtypes[0].startswith("complex"):
        raise InputError(
            f"the terrain file {name} is a picture ({', '.join(one.name for one in source.colorinterp)})",
            "a raster of heights is needed",
            "Take the file of heights that the picture was made from",
        )


def _systems(source: Any, name: str, given: str | None, notes: list[Note]) -> tuple[CRS, CRS | None]:
    """The horizontal system of a file, and the vertical one if it states it."""
    own = None
    if source.crs is not None and source.crs.to_wkt():
        try:
            own = CRS.from_wkt(source.crs.to_wkt())
        except CRSError:
            own = None
    vertical = None
    if own is not None and own.is_compound:
        vertical = next((part for part in own.sub_crs_list if part.is_vertical), None)
        own = own.sub_crs_list[0]
    if own is not None and len(own.axis_info) > 2:
        own = own.to_2d()
    if own is None or not (own.is_geographic or own.is_projected):
        said = (
            "no coordinate system" if own is None else f"the coordinate system “{own.name}”, which is tied to no place"
        )
        if given is None:
            raise InputError(
                f"the terrain file {name} has {said}",
                "a system that ties it to the Earth is needed",
                'Name it in the brief, for instance [terrain] crs = "EPSG:32737", or write it into the file',
            )
        return named_crs(given, "[terrain] crs"), vertical
    if given is not None and own != named_crs(given, "[terrain] crs"):
        notes.append(
            Note(
                "warning",
                "terrain",
                f"{name} says it is in “{own.name}”, and the brief says “{given}”: the file was believed.",
            )
        )
    return own, vertical


def _georeference(source: Any, name: str, system: CRS) -> dict[str, Any]:
    """Corner, steps and orientation, checked."""
    transform, rows, cols = source.transform, source.height, source.width
    if transform.is_identity or transform.a == 0 or transform.e == 0:
        raise InputError(
            f"the terrain file {name} does not say where on the Earth it lies",
            "a raster with a geographic reference is needed",
            "Take the original file, or keep its world file (.tfw) beside it",
        )
    if max(abs(transform.b) * rows, abs(transform.d) * cols) > 1e-6 * max(abs(transform.a), abs(transform.e)):
        raise InputError(
            f"the terrain file {name} lies turned against its own axes",
            "rows that run west to east are needed",
            "Warp it to a north-up raster first",
        )
    step_x, step_y = abs(transform.a), abs(transform.e)
    west = min(transform.c, transform.c + cols * transform.a)
    north = max(transform.f, transform.f + rows * transform.e)
    box = np.array([west, north - rows * step_y, west + cols * step_x, north])
    way_out = "Write the right coordinate system into it, or reproject the original file"
    refuse_unlike_its_system(f"the terrain file {name}", system, box, way_out)
    if system.is_geographic and max(abs(box[1]), abs(box[3])) > 90.0 + step_y:
        raise InputError(
            f"the terrain file {name} says it is in degrees, yet reaches from latitude {box[1]:.7g} to {box[3]:.7g}",
            "latitudes between −90 and 90 are needed",
            way_out,
        )
    return {
        "west": west,
        "north": north,
        "step_x": step_x,
        "step_y": step_y,
        "rows": rows,
        "cols": cols,
        "upside_down": transform.e > 0,
        "mirrored": transform.a < 0,
    }


def _unit_m(source: Any, name: str, vertical: CRS | None, given: str | None, notes: list[Note]) -> float | None:
    """Metres in one vertical unit; None where nobody says it."""
    word = (source.units[0] or "").strip()
    if not word and vertical is not None:
        word = vertical.axis_info[0].unit_name
    stated = _UNITS_M.get(word.lower())
    if given is not None:
        wanted = FEET_M if given == "ft" else 1.0
        if word and (stated is None or abs(stated / wanted - 1.0) > 1e-5):
            notes.append(
                Note(
                    "warning",
                    "terrain",
                    f"{name} says its heights are in “{word}”, and the brief says “{given}”: the brief was believed.",
                )
            )
        return stated if stated is not None and abs(stated / wanted - 1.0) <= 1e-5 else wanted
    if word and stated is None:
        raise InputError(
            f"the terrain file {name} says its values are in “{word}”",
            "heights in metres or feet are needed",
            'If they are, say so in the brief: [terrain] vertical_unit = "m" or "ft"',
        )
    if stated is not None and stated != 1.0:
        notes.append(
            Note("info", "terrain", f"Heights of {name} are in “{word}”, as it says, and were turned into metres.")
        )
    return stated


def _look(file: RasterFile, source: Any) -> tuple[NDArray[np.float32], list[Note]]:
    """Heights of some blocks of a file [m], and what its values tell; empty only if the file holds no height at all."""
    notes: list[Note] = []
    if source.count > 1:
        said = f"{file.name} has {source.count} bands; the first was taken for the heights."
        notes.append(Note("warning", "terrain", said))
    high, wide = source.block_shapes[0]
    across, down = -(-file.cols // wide), -(-file.rows // high)
    undeclared: set[float] = set()

    def heights_m(block: int) -> NDArray[np.float32]:
        row, col = (block // across) * high, (block % across) * wide
        window = Window(col, row, min(wide, file.cols - col), min(high, file.rows - row))
        raw, absent = file.read_raw(source, window)
        undeclared.update(value for value in SENTINELS if value != file.nodata and (raw == value).any())
        return file.in_metres(raw[~absent])

    sample = sorted({round(k) for k in np.linspace(0, across * down - 1, min(SAMPLE_BLOCKS, across * down))})
    known_m = np.concatenate([heights_m(block) for block in sample])
    for block in range(across * down):
        if known_m.size:
            break
        known_m = heights_m(block)
    if undeclared:
        words = " and ".join(f"{value:.0f}" for value in sorted(undeclared))
        said = f"{file.name} holds the value {words} without declaring it; it was read as “no height”."
        notes.append(Note("warning", "terrain", said))
    return known_m, notes


def _range_notes(file: RasterFile, known_m: NDArray[np.float32], unit_unknown: bool) -> list[Note]:
    """Whether heights can be metres."""
    if not known_m.size:
        return []
    lowest, highest = float(known_m.min()), float(known_m.max())
    if unit_unknown and HIGHEST_M < highest < HIGHEST_M / FEET_M:
        raise InputError(
            f"the terrain file {file.name} says no unit and holds heights up to {highest:.0f}, too high for metres",
            "the unit of the heights is needed",
            'Set vertical_unit = "ft" under [terrain] in the brief if they are feet',
        )
    if lowest < LOWEST_M or highest > HIGHEST_M:
        said = f"{file.name} holds heights from {lowest:.0f} to {highest:.0f} m; impossible ones are read as unknown."
        return [Note("warning", "terrain", said)]
    notes = []
    if lowest < LOWEST_LAND_M:
        said = (
            f"{file.name} holds heights down to {lowest:.0f} m, lower than any land: they are sea floor, or stand for "
            "“no height” without the file declaring it. Where no sea is mapped, they are taken as ground."
        )
        notes.append(Note("warning", "terrain", said))
    return notes + (_unit_notes(file, highest) if unit_unknown else [])


def _unit_notes(file: RasterFile, highest: float) -> list[Note]:
    """What to say where nobody names the unit of the heights."""
    if file.crs.is_projected and abs(file.crs.axis_info[0].unit_conversion_factor / FEET_M - 1.0) < 1e-3:
        said = (
            f"{file.name} says no unit for its heights, and its coordinates are in feet. Heights are taken as metres; "
            'if they are feet as well, set vertical_unit = "ft" under [terrain].'
        )
        return [Note("warning", "terrain", said)]
    if highest > SMELLS_OF_FEET_M:
        said = (
            f"{file.name} says no unit and holds heights up to {highest:.0f}. Taken as metres; if they are feet, set "
            'vertical_unit = "ft" under [terrain].'
        )
        return [Note("warning", "terrain", said)]
    return [
        Note(
            "assumed",
            "terrain",
            f'{file.name} says no unit: its heights are taken as metres (for feet set vertical_unit = "ft").',
        )
    ]
