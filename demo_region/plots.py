"""The forty candidate plots: where they are put, how big, and what was planted with them."""

from typing import NamedTuple

import numpy as np
from erosion import upstream_km2
from frame import CELL_KM, COLLAR_REACH, tile_km
from planted import BASINS, HOLLOWS
from relief import smooth
from scipy.ndimage import distance_transform_edt, uniform_filter
from shapely.geometry import Polygon
from waters import coast_x_km


class Plot(NamedTuple):
    """One plot to be drawn: a rough quadrangle about a place. Price in an invented currency per square metre."""

    name: str
    x: float
    y: float
    hectares: float
    turn_deg: float
    price: float | None


class Ground:
    """The true ground, asked for places that fit a wish."""

    def __init__(self, ground, water):
        self.x, self.y = tile_km()
        self.height = ground
        self.water = water
        north, east = np.gradient(ground, CELL_KM * 1000)
        self.slope = uniform_filter(np.hypot(north, east), 9)
        self.fall_north = uniform_filter(north, 9)  # positive where the ground faces north
        disc = uniform_filter(ground, 65)
        self.rise = uniform_filter(ground, 5) - disc

    def find(self, x, y, within_km, wish, low=-1e9, high=1e9):
        """The cell near a place, within a height range and off the water, where a field is largest."""
        ok = (np.hypot(self.x - x, self.y - y) < within_km) & (self.height > low) & (self.height < high)
        ok &= uniform_filter(self.water.astype(np.float32), 15) == 0
        best = int(np.argmax(np.where(ok, wish, -np.inf)))
        return float(self.x.flat[best]), float(self.y.flat[best])


def choose(ground, water, lake):
    """All plots in the order of their numbers, 1 to 40. See truth.toml for what each is meant to show."""
    g = Ground(ground, water)
    gentle = -g.slope
    bench = np.where(g.slope < 0.06, g.rise, -100) - 600 * g.slope
    lake_km = distance_transform_edt(~lake) * CELL_KM
    catchment = upstream_km2(ground, water, CELL_KM)
    dry_flat = gentle - 0.1 * (uniform_filter(catchment, 15) > 0.5)
    crest_x, crest_y = g.find(49.9, 28.5, 5.5, np.where(g.x > 48.5, uniform_filter(g.height, (31, 5)), 0))

    def open_coast(y, inland_km):
        return float(coast_x_km(y)) - inland_km, y

    lee_km = float(coast_x_km(crest_y)) - (crest_x - 0.85)
    lake_rows, lake_cols = np.nonzero(lake)
    south_shore = float(g.y[lake_rows.max(), 0])
    at_south = float(g.x[0, int(np.median(lake_cols[lake_rows > lake_rows.max() - 12]))])
    hollow = HOLLOWS
    great = BASINS["great basin"]
    north_edge = float(g.y.max()) + CELL_KM / 2 + COLLAR_REACH * 3 * CELL_KM
    places = [
        ("Sandrelle Strand", *open_coast(9.6, 2.0), 8, 10, 14),
        ("Corrivane Lee", crest_x - 0.85, crest_y, 7, 4, 9),
        ("Tavrick Level", *open_coast(14.4, lee_km), 7, 30, 11),
        ("Brackmaw Spit", *open_coast(22.4, 0.13), 3, 8, 20),
        ("Corrivane Top", crest_x, crest_y, 5, 2, 12),
        ("Vellisk Creek", float(coast_x_km(6.4)) - 3.5, 7.25, 6, 60, 10),
        ("Dunmarrel Inner", *open_coast(36.4, 5.0), 12, 15, 7),
        ("Perrandew Isle", 56.6, 16.75, 6, 80, None),
        ("Oskrivel Pan", hollow["coastal pan"].x, hollow["coastal pan"].y, 3, 20, 6),
        ("Sandrelle Strand, second entry", *open_coast(9.6, 2.0), 8, 10, 14),
        ("Little Mavren", *open_coast(4.2, 1.4), 0.3, 0, 18),
        ("Kharune Bench", *g.find(35.5, 7.5, 3.5, bench, 400, 560), 15, 25, 5),
        ("Issabar Wash", *g.find(37.5, 12.0, 5.0, catchment * (g.slope < 0.12), 330, 520), 6, 40, 3),
        ("Torrak Scarp", *g.find(43.5, 8.0, 4.0, g.slope, 330, 640), 4, 0, 2),
        ("Ammerode Flat", *g.find(36.5, 4.0, 2.0, dry_flat, 380, 520), 10, 50, 4),
        ("Nerrow Gate", *g.find(44.3, 16.9, 0.6, gentle, 120, 300), 3, 70, 2),
        ("Yellandor Terrace", *g.find(32.5, 29.0, 3.0, bench, 680, 880), 12, 15, 6),
        ("Savrin Hollow", hollow["savannah hollow"].x, hollow["savannah hollow"].y, 6, 35, 4),
        ("Pemmarick Side", 36.1, 30.75, 5, 10, 7),
        ("Great Yellandor", *g.find(38.5, 33.0, 3.0, gentle, 620, 800), 30, 20, 5),
        ("Midwater Claim", 18.2, 8.9, 9, 0, 1),
        ("Halfshore Claim", at_south, south_shore - 0.03, 6, 0, 8),
        ("Ondurwen Reach", *g.find(19.5, 18.2, 1.2, gentle, 1136, 1250), 10, 30, 13),
        ("Eastmere Rise", *g.find(27.0, 9.5, 0.8, bench, 1140, 1320), 8, 5, 9),
        ("Sorrelby Foot", *g.find(12.6, 3.6, 1.2, gentle, 1140, 1300), 9, 45, 8),
        ("Tamsorel Eyot", 23.6, 13.2, 4, 15, None),
        ("Lowlap Landing", *g.find(25.0, 14.5, 1.0, -lake_km, 1130.2, 1140), 3, 60, 15),
        ("Brennoch Hollow", hollow["upland hollow"].x, hollow["upland hollow"].y, 6, 20, 7),
        ("Great Basin Floor", great.x + 0.25, great.y, 8, 0, 8),
        ("Basin Shoulder", *g.find(19.8, 27.6, 0.3, gentle, 1780, 1850), 7, 35, 10),
        ("Narrowgate Meadow", *g.find(20.6, 31.7, 0.7, gentle, 1640, 1720), 5, 10, 6),
        ("Solvane Brae", *g.find(15.5, 34.2, 0.8, -np.abs(g.fall_north - 0.07) - np.abs(g.slope - 0.07), 1600, 1950),
         6, 75, 11),
        ("Windhollin Crest", *g.find(23.2, 26.3, 0.5, g.rise - 300 * g.slope, 1700, 1950), 3, 0, 9),
        ("Doubtful Dip", hollow["doubtful hollow"].x, hollow["doubtful hollow"].y, 2, 40, 9),
        ("Cindrel Hollow", hollow["high hollow"].x, hollow["high hollow"].y, 4, 30, 5),
        ("Skarrow Crest", *g.find(6.5, 28.0, 4.0, g.rise, 2350, 2900), 3, 0, 6),
        ("Hethermoor Shelf", *g.find(7.8, 26.4, 0.8, gentle - 0.002 * np.abs(g.rise - 10), 2250, 2480), 7, 65, 8),
        ("Skarrow Steeps", *g.find(7.5, 25.0, 3.5, g.slope * smooth(g.x, 4, 5), 2250, 2600), 5, 0, 3),
        ("Edgewick Claim", 20.0, north_edge + 0.02, 9, 0, 7),
        ("Farrowmisk Claim", -31.0, 18.0, 9, 0, 7),
    ]  # fmt: skip
    return [Plot(*place) for place in places]


def outline(plot, number):
    """A surveyor's rough quadrangle of the stated size, in kilometres."""
    rng = np.random.Generator(np.random.PCG64(9000 + number))
    longer = rng.uniform(1.1, 1.7)
    side = np.sqrt(plot.hectares / 100 / longer)
    corners = np.array([(-0.5, -0.5), (0.5, -0.5), (0.5, 0.5), (-0.5, 0.5)]) * (longer * side, side)
    corners = corners * (1 + rng.uniform(-0.07, 0.07, (4, 1)))
    turn = np.radians(plot.turn_deg)
    turned = corners @ np.array([[np.cos(turn), np.sin(turn)], [-np.sin(turn), np.cos(turn)]])
    return Polygon(turned + np.array([plot.x, plot.y]))


def crossed(shape):
    """The same plot with two corners in the wrong order: its outline crosses itself."""
    a, b, c, d = shape.exterior.coords[:4]
    middle = ((c[0] + d[0]) / 2, (c[1] + d[1]) / 2)
    return Polygon([a, b, c, middle, (d[0] + 0.02, d[1] - 0.03), (c[0] - 0.05, c[1] + 0.01), d])
