"""An invented screening, to test deliverables without running one: twelve plots between a sea and a ridge."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from types import SimpleNamespace
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
from pyproj import Transformer
from shapely.geometry import Polygon

from sitescreen.grid import Field, Grid
from sitescreen.judgement.profiles import load_profiles
from sitescreen.notes import Note

NAMES = ("Ammerling Field", "Brisk Hanger", "Corrow", "Dunmarrel", "Eastle Bank", "Fennow", "Gorse Neap", "Hollin Pit",
         "Ister Point", "Jarrow Lea", "Kestel Ridge", "Lowmere")  # fmt: skip


@dataclass(frozen=True)
class Invented:
    """Looks like a Screening."""

    brief: Any
    table: gpd.GeoDataFrame
    fields: Mapping[str, Field]
    reasons: Mapping[str, Any]
    profiles: Mapping[str, Any]
    notes: tuple[Note, ...]
    not_measured: tuple[str, ...]
    not_checked: tuple[str, ...]
    record: dict[str, Any]

    def with_(self, **changes: Any) -> "Invented":
        """The same with some parts replaced."""
        return replace(self, **changes)


def ground(grid: Grid) -> dict[str, Field]:
    """A sea in the east at 0 m, hills that rise to the west, one hollow."""
    x = (np.arange(grid.cols) + 0.5) / grid.cols
    y = (np.arange(grid.rows) + 0.5)[:, None] / grid.rows
    inland = np.clip(0.85 + 0.05 * np.sin(9 * y) - x, 0, None)
    height = 900 * inland**1.3 + 90 * np.sin(14 * x + 5 * y) * np.sin(11 * y) * np.clip(inland * 4, 0, 1)
    pit = np.exp(-((x - 0.35) ** 2 + (y - 0.6) ** 2) / 0.004)
    height = np.where(inland > 0, np.maximum(height - 60 * pit, 1), 0)
    north, east = np.gradient(height, grid.cell_size_m)
    shore_km = inland * grid.cols * grid.cell_size_m / 1000
    rise = height - height.mean(axis=1, keepdims=True)

    def field(values: Any, unit: str, what: str) -> Field:
        return Field(np.asarray(values, np.float32) + np.zeros(grid.shape, np.float32), grid, unit, what)

    wind = np.clip(1 + rise / 600, 0.3, 2.2)
    return {
        "elevation_m": field(height, "m", "Height of the ground"),
        "slope_deg": field(np.degrees(np.arctan(np.hypot(north, east))), "°", "Slope"),
        "shore_distance_km": field(shore_km, "km", "Distance to the nearest shore"),
        "breeze_reach": field(np.exp(-shore_km / 9), "1", "Share of the daytime breeze that gets there"),
        "ventilation": field(wind, "1", "Mean wind over that of open level ground"),
        "ridge_exposure": field(wind**1.2, "1", "Strong wind over that of open level ground"),
        "cold_deficit_k": field(np.where(pit > 0.2, 4 * pit, 0), "K", "Colder than open ground on a clear calm night"),
    }


def build(
    names: tuple[str, ...] = NAMES,
    *,
    zone: int = 37,
    shape: tuple[int, int] = (48, 64),
    zones: tuple[str, ...] = ("hot_humid_coast", "upland"),
    ids: tuple[str, ...] | None = None,
    seed: int = 4,
) -> Invented:
    """A screening of as many plots as there are names; south of the equator, so northings are negative."""
    rng = np.random.default_rng(seed)
    cell = 90.0
    grid = Grid(f"EPSG:{32600 + zone}", 500_040.0 - 45 * 900, -180_000.0, cell, *shape)
    fields = ground(grid)
    profiles = load_profiles()
    count = len(names)
    rows = rng.integers(4, shape[0] - 6, count)
    cols = rng.integers(4, int(shape[1] * 0.8), count)
    x, y = grid.x_centres_m()[cols], grid.y_centres_m()[rows]
    to_degrees = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    half = rng.uniform(90, 260, count)
    corners = [(-1, -0.8), (1, -1), (0.9, 0.8), (-1, 1)]
    shapes = [Polygon([to_degrees.transform(e + h * a, n + h * b) for a, b in corners])
              for e, n, h in zip(x, y, half, strict=True)]  # fmt: skip
    lon, lat = to_degrees.transform(x, y)
    table = pd.DataFrame({
        "plot": list(ids) if ids else [str(i + 1) for i in range(count)],
        "name": list(names),
        "zone": [zones[0] if fields["elevation_m"].values[r, c] < 300 else zones[-1]
                 for r, c in zip(rows, cols, strict=True)],
        "zone_share": rng.uniform(0.6, 1, count),
        "cautions": "",
        "area_ha": half**2 * 4 / 1e4,
        "lon": lon,
        "lat": lat,
        "shore_kind": "sea",
    })  # fmt: skip
    for key, field in fields.items():
        table[key] = field.values[rows, cols].astype(np.float64)
    table["cold_pool_kind"] = np.where(table["cold_deficit_k"] > 0, "closed", "none")
    table["pond_depth_m"] = 0.0
    table["onshore_from_deg"] = 92.4
    table.loc[table.index == 1, "ventilation"] = np.nan
    overall = np.full(count, np.nan)
    for i, row in table.iterrows():
        profile, sums = profiles[row["zone"]], []
        for c in profile.criteria:
            if c.reading in table and not np.isnan(row[c.reading]):
                curve = np.array(c.curve)
                mark = float(np.interp(row[c.reading], curve[:, 0], curve[:, 1]))
                table.loc[i, f"mark_{c.name}"] = mark
                sums.append((c.weight, mark))
        overall[i] = sum(w * m for w, m in sums) / sum(w for w, _ in sums)
        table.loc[i, f"membership_{row['zone']}"] = 0.9
    aside = np.zeros(count, bool)
    aside[[i for i in (4, 7) if i < count]] = True
    table["set_aside"] = np.where(aside, "3.2 m of water could stand on it.", "")
    table["overall_mark"] = np.where(aside, np.nan, overall)
    table["mark_low"] = table["overall_mark"] - 4
    table["mark_high"] = table["overall_mark"] + 3
    table["rank"] = table["overall_mark"].rank(ascending=False, method="first").astype("Int64")
    table["rank_in_zone"] = table.groupby("zone")["overall_mark"].rank(ascending=False, method="first").astype("Int64")
    table["weakest"] = "slope"
    order = table["rank"].astype("float64").fillna(1e9).argsort(kind="stable")
    plots = gpd.GeoDataFrame(table, geometry=shapes, crs="EPSG:4326").iloc[order].reset_index(drop=True)
    reasons = {
        plot: SimpleNamespace(
            for_=["Sea breeze: 0.82 of it gets here.", "Level ground: 3.1°."],
            against=["Little air moves: 0.71 times open ground."],
            cautions=["Concern: low-lying shore."] if i % 3 == 0 else [],
        )
        for i, plot in enumerate(plots["plot"])
    }
    brief = SimpleNamespace(
        title="Sites for three small clinics",
        judge=SimpleNamespace(shortlist=3),
        output=SimpleNamespace(layers=True),
        terrain=SimpleNamespace(surface="bare", vertical_error_m=2.5),
    )
    return Invented(
        brief, plots, fields, reasons, profiles,
        (
            Note("assumed", "wind", "No wind table was given: equal wind from 16 sectors at 3 m/s, its weight halved."),
            Note("warning", "shore", "The mapped shore runs over ground up to 12 m high."),
            Note("info", "terrain", "Cells of 90 m."),
        ),
        ("hours of sun", "cold air behind narrows"),
        ("flood levels", "protected land", "landslides"),
        {"version": "0.1.0", "inputs": {"terrain": [{"name": "tile.tif", "sha256": "00"}]}, "seconds": {"read": 0.1}},
    )  # fmt: skip


@pytest.fixture(scope="session")
def invent() -> Callable[..., Invented]:
    """Builds an invented screening; see ``build``."""
    return build


@pytest.fixture(scope="session")
def screening() -> Invented:
    """The usual one."""
    return build()


def unsure(made: Invented) -> Invented:
    """The same as after the trials: ranks 2 to 4 alike, plot of rank 3 with a mark that may fall by 22.6."""
    table = made.table.copy()
    ranked = table["rank"].notna()
    rank = table["rank"].astype("float64")
    table["chance_first"] = np.where(ranked, np.where(rank == 1, 0.97, 0.0), np.nan)
    table["rank_low"] = np.where(ranked, np.maximum(rank - 1, 1), np.nan)
    table["rank_high"] = np.where(ranked, rank + 2, np.nan)
    table["group"] = np.where(ranked, np.where(rank.isin([2, 3, 4]), 2, rank), np.nan)
    table["mark_low"] = table["overall_mark"] - np.where(rank == 3, 22.6, 0.4)
    table["breeze_arrival_h"] = 10.3
    table["breeze_screen"] = np.where(rank == 1, 0.0, np.where(rank == 2, 0.4, 1.0))
    table["elevation_m"] = np.where(rank == 3, 1200.0, 100.0)
    for column, value in (("crest_bearing_deg", 92.0), ("crest_distance_m", 1020.0), ("crest_above_plot_m", 42.0)):
        table[column] = np.where(rank == 4, value, np.nan)
    return made.with_(table=table)


@pytest.fixture(scope="session")
def tried() -> Invented:
    """The usual one with chances, ties and a screened breeze."""
    return unsure(build())
