"""Make the demo region: an invented country with coast, dry interior, lake, uplands and a high ridge.

    python demo_region/make_region.py            writes the data files beside this script (about half a minute)
    python demo_region/make_region.py --to DIR   writes them elsewhere, to compare with the committed ones

Same seeds, same files: every random number comes from numpy's PCG64 with a written seed. Nothing is read.
"""

import argparse
import csv
import warnings
from pathlib import Path

import climate
import geopandas as gpd
import numpy as np
import plots
import pyogrio
import rasterio
import relief
import shapely
import waters
from frame import (
    CELL,
    CELL_KM,
    COLLAR_CELL,
    COLLAR_CELL_KM,
    COLLAR_REACH,
    COLLAR_WEST,
    KM_NORTH,
    ROWS,
    SOUTH,
    WEST,
    lon_lat,
)
from rasterio.transform import from_origin

ERROR_M = 1.5
"""Standard deviation of the terrain model's error, as the brief states it. [m]"""

ROADS = {
    "Coast road": [(49.6, 0.3), (49.2, 5.2), (49.0, 8.4), (50.0, 16), (48.3, 21), (48.2, 34), (49.4, 39.7)],
    "Gate road": [(50.0, 16), (47, 15.8), (43.2, 15.6), (38, 13), (34.5, 14), (31, 16), (27.5, 15.2), (25.9, 14.6)],
    "Upland road": [(27.5, 15.2), (26.6, 19.6), (24.8, 22.5), (19.5, 25.2), (18.6, 29.2), (12, 31), (8.6, 30.6)],
    "Savannah road": [(38, 13), (37.4, 22), (35.4, 29.2), (33, 31.5), (34.2, 39)],
}

PLACES = {
    "Brackmaw": (48.9, 25.5), "Mavren": (48.8, 9.4), "Gatefoot": (38.4, 13.1), "Ondurwen Quay": (26.3, 14.9),
    "Yellandor": (35.2, 29.6), "Hethermoor": (18.4, 29.6), "Skarrow": (9.0, 30.9),
}  # fmt: skip


def main() -> None:
    """Make everything."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--to", type=Path, default=Path(__file__).parent, help="folder for the data files")
    folder = parser.parse_args().to
    folder.mkdir(parents=True, exist_ok=True)

    drawn = waters.draw_waters()
    collar = relief.collar_ground(drawn)
    ground, sea, lake, pond = relief.tile_ground(collar, drawn)
    write_terrain(folder, collar, drawn, ground, sea | lake | pond)
    write_shore(folder, drawn)
    write_plots(folder, plots.choose(ground, sea | lake | pond, lake))
    write_roads(folder)
    write_places(folder)

    def height_at(x_km, y_km):
        return ground[int(ROWS - y_km / KM_NORTH / CELL), int(x_km / CELL_KM)]

    write_table(folder / "normals.csv", climate.normals(height_at, lon_lat))
    write_table(folder / "wind.csv", climate.roses(height_at, lon_lat))


def write_terrain(folder: Path, collar, drawn, ground, flat) -> None:
    """The 1″ tile and the 3″ collar, each with the error of a real model; float32 on eighths of a metre."""
    tile = relief.as_a_model_sees_it(ground, flat, 301, CELL_KM, ERROR_M)
    _write_raster(folder / "terrain.tif", tile, WEST, SOUTH + ROWS * CELL, CELL)
    waters_flat = waters.cells_inside(drawn["Amberlith Sea"][1], collar=True)
    waters_flat |= waters.cells_inside(drawn["Lake Ondurwen"][1], collar=True)
    coarse = relief.as_a_model_sees_it(collar, waters_flat, 311, COLLAR_CELL_KM, ERROR_M)
    north = SOUTH + ROWS * CELL + COLLAR_REACH * COLLAR_CELL
    _write_raster(folder / "collar.tif", coarse, COLLAR_WEST, north, COLLAR_CELL)


def _write_raster(path: Path, values, west: float, north: float, cell: float) -> None:
    profile = {
        "driver": "GTiff",
        "dtype": "float32",
        "count": 1,
        "height": values.shape[0],
        "width": values.shape[1],
        "crs": "EPSG:4326",
        "transform": from_origin(west, north, cell, cell),
        "nodata": -9999.0,
        "compress": "deflate",
        "predictor": 3,
        "zlevel": 9,
        "tiled": True,
        "blockxsize": 256,
        "blockysize": 256,
    }
    with rasterio.open(path, "w", **profile) as out:
        out.write(values, 1)
        out.units = ("metre",)
        out.set_band_description(1, "height of the invented ground")


def degrees(shape):
    """A shape in kilometres as longitude and latitude."""
    return shapely.transform(shape, lambda x, y: lon_lat(x, y), interleaved=False)


def write_shore(folder: Path, drawn) -> None:
    """Waters as polygons: sea with a creek and an island, the lake with an island, a pond."""
    names, kinds, shapes = [], [], []
    for name, (kind, shape) in drawn.items():
        names.append(name)
        kinds.append(kind)
        shapes.append(degrees(shape.simplify(0.004)))
    _write_layer(folder / "shore.gpkg", "shore", {"name": names, "kind": kinds}, shapes)


def write_plots(folder: Path, chosen: list[plots.Plot]) -> None:
    """The forty plots."""
    shapes = []
    for number, plot in enumerate(chosen, start=1):
        # Plot 10 is plot 1 entered twice; plot 15 crosses itself.
        shape = plots.outline(plot, 1 if number == 10 else number)
        shapes.append(degrees(plots.crossed(shape) if number == 15 else shape))
    columns = {
        "plot": [str(number) for number in range(1, len(chosen) + 1)],
        "name": [plot.name for plot in chosen],
        "price": [np.nan if plot.price is None else float(plot.price) for plot in chosen],
    }
    _write_layer(folder / "plots.gpkg", "plots", columns, shapes)


def write_roads(folder: Path) -> None:
    """A few roads, for orientation on the map and for distance criteria."""
    lines = [degrees(waters.rounded(points)) for points in ROADS.values()]
    _write_layer(folder / "roads.gpkg", "roads", {"name": list(ROADS)}, lines)


def write_places(folder: Path) -> None:
    """The villages, for orientation on the map."""
    points = [degrees(shapely.Point(where)) for where in PLACES.values()]
    _write_layer(folder / "places.gpkg", "places", {"name": list(PLACES)}, points)


def _write_layer(path: Path, layer: str, columns: dict, shapes: list) -> None:
    path.unlink(missing_ok=True)
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": "2000-01-01T00:00:00.000Z"})  # else the file holds the clock
    frame = gpd.GeoDataFrame(columns, geometry=shapes, crs="EPSG:4326")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # one outline is invalid on purpose
        frame.to_file(path, layer=layer, driver="GPKG", engine="pyogrio")


def write_table(path: Path, rows: list[dict]) -> None:
    """A CSV table with Unix line ends."""
    with path.open("w", newline="", encoding="utf-8") as out:
        writer = csv.DictWriter(out, fieldnames=list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


if __name__ == "__main__":
    main()
