"""The invented ground: large forms, noise, running water, planted cases, and the error of a real terrain model."""

import numpy as np
import planted
from erosion import flood, weather
from frame import CELL_KM, COLLAR_CELL_KM, COLLAR_REACH, COLS, ROWS, collar_km, tile_km
from scipy.ndimage import distance_transform_edt, gaussian_filter, map_coordinates
from waters import LAKE_LEVEL_M, POND_LEVEL_M, cells_inside, coast_x_km

STEP_M = 0.125  # heights are kept to an eighth of a metre: exact in binary, so the files pack well


def smooth(value, low, high):
    """0 below ``low``, 1 above ``high``, smooth in between."""
    t = np.clip((value - low) / (high - low), 0.0, 1.0)
    return t * t * (3 - 2 * t)


def noise(shape, seed, longest, falling=2.0, shortest=2.0):
    """Random relief of standard deviation 1, wavelengths from ``longest`` down to ``shortest`` cells.

    Parameters
    ----------
    falling : float
        Exponent by which amplitude falls with wave number; 2 is like real relief.
    """
    rng = np.random.Generator(np.random.PCG64(seed))
    padded = [n + int(min(longest, n)) for n in shape]  # so that opposite edges do not match
    spectrum = np.fft.rfft2(rng.standard_normal(padded))
    waves = np.hypot(np.fft.fftfreq(padded[0])[:, None], np.fft.rfftfreq(padded[1])[None, :])
    gain = np.where(waves > 0, (waves**2 + 1.0 / longest**2) ** (-falling / 2), 0.0)
    gain *= np.exp(-((waves * shortest) ** 2) / 2)
    field = np.fft.irfft2(spectrum * gain, s=padded)[: shape[0], : shape[1]]
    return (field - field.mean()) / field.std()


# Heights along two west–east sections: x [km], height [m]. The country's skeleton.
NORTH = [
    (-8, 1500), (-4, 1900), (2.5, 2440), (4.2, 2640), (5.6, 2480), (7, 2390), (9.4, 2340), (10.8, 2250), (12.3, 2060),
    (15, 1900), (19, 1760), (23, 1680), (26.3, 1600), (27.2, 1480), (28.7, 1010), (30, 900), (34, 800), (38, 690),
    (40.5, 640), (42.4, 720), (43.6, 690), (44.6, 520), (46.2, 110), (48, 50), (53, 5), (60, -60),
]  # fmt: skip
SOUTH = [
    (-8, 1500), (0, 2150), (3.2, 2350), (5.0, 2580), (6.4, 2450), (8.4, 1950), (10.4, 1370), (11.6, 1190), (13, 1150),
    (24.5, 1150), (26.3, 1210), (27.6, 1170), (29.2, 760), (31, 600), (34, 500), (37, 430), (40, 400), (42, 440),
    (43.2, 600), (44.2, 540), (46, 110), (48, 50), (53, 5), (60, -60),
]  # fmt: skip


def large_forms(waters):
    """The country before rain: heights in metres on the collar's grid."""
    x, y = collar_km()
    inland = 1 - smooth(x, 41, 47)
    bend = [size * noise(x.shape, seed, longest) for seed, size, longest in ((101, 1.25, 260), (102, 1.9, 260))]
    # The inland forms run a little west of north, the coast does not.
    xw = x + bend[0] * (0.35 + 0.65 * inland) + 0.14 * (y - 20) * inland
    yw = y + bend[1]
    width = 2.0 + 4.5 * smooth(x, 27, 31)
    south = 1 - smooth(yw, 20.4 - width, 20.4 + width)
    high = np.interp(xw, *zip(*NORTH, strict=True)) * (1 - south) + np.interp(xw, *zip(*SOUTH, strict=True)) * south
    high = gaussian_filter(high, 3)

    # Divides that close the interior to the north and the south; beyond them the collar falls away.
    high += inland * 260 * np.exp(-(((yw + 1.6) / 2.0) ** 2)) + inland * 230 * np.exp(-(((yw - 42.5) / 2.2) ** 2))
    high -= inland * (200 * smooth(-yw, 3, 9) + 250 * smooth(yw, 44, 49))

    # The gap by which the dry basin drains through the coastal range.
    gap = np.exp(-(((yw - 13.2) / 1.1) ** 4)) * smooth(x, 39.5, 42) * (1 - smooth(x, 45.2, 47))
    high = high * (1 - gap) + gap * np.interp(x, [39.5, 42, 44.5, 47], [400, 340, 230, 75])

    # Lake plain, then the coastal plain, each by distance to its water.
    lake_km = distance_transform_edt(~cells_inside(waters["Lake Ondurwen"][1], collar=True)) * COLLAR_CELL_KM
    plain = LAKE_LEVEL_M + 3 + 16 * lake_km + 3 * lake_km**2
    near = 1 - smooth(lake_km, 0.7 + 0.5 * south, 2.6 + 0.9 * south)
    high = high * (1 - near) + plain * near
    rim_km = lake_km + 0.25 * noise(x.shape, 106, 40)
    high = np.maximum(
        high, LAKE_LEVEL_M + 8 + 6 * lake_km - 420 * np.maximum(rim_km - 1.7, 0)
    )  # the lake keeps its rim
    sea_km = distance_transform_edt(~cells_inside(waters["Amberlith Sea"][1], collar=True)) * COLLAR_CELL_KM
    off_km = np.minimum(sea_km, np.clip(coast_x_km(y) - x, 0, None))  # the creek does not lower the plain about it
    coast = 1.0 + 6.0 * off_km + 0.7 * off_km**2
    low = smooth(xw, 45.4, 46.9)
    high = high * (1 - low) + coast * low
    # The coastal ridge: a long low wave of hard rock, 2–3 km from the shore, broken once.
    axis = 49.9 + 0.35 * np.sin((y - 20) / 2.6) + 0.22 * noise(x.shape, 107, 40)
    length = smooth(y, 19.0, 22.0) * (1 - smooth(y, 34.0, 37.0)) * (1 - 0.8 * np.exp(-(((y - 27.2) / 0.7) ** 2)))
    side = np.where(x < axis, 0.34, 0.55)
    ridge = 180 * length * np.exp(-(((x - axis) / side) ** 2)) * (1 + 0.22 * noise(x.shape, 103, 30))
    # Rough where it is steep and high, smooth on the plains.
    amplitude = np.interp(gaussian_filter(high, 8), [0, 90, 250, 500, 1000, 1200, 1600, 2100, 2700],
                          [1.5, 5, 45, 24, 20, 30, 60, 80, 130])  # fmt: skip
    amplitude += 45 * smooth(np.hypot(*np.gradient(gaussian_filter(high, 5), COLLAR_CELL_KM * 1000)), 0.06, 0.25)
    amplitude *= 0.12 + 0.88 * smooth(lake_km, 0.3, 3.5)
    amplitude = gaussian_filter(amplitude, 6) + 0.10 * np.clip(ridge, 0, None)
    return high + ridge + amplitude * (0.8 * noise(x.shape, 104, 60) + 0.4 * noise(x.shape, 105, 14))


def collar_ground(waters):
    """Heights in metres on the collar's grid after rain; 0 at sea."""
    sea = cells_inside(waters["Amberlith Sea"][1], collar=True)
    lake = cells_inside(waters["Lake Ondurwen"][1], collar=True)
    ground = large_forms(waters)
    ground = np.where(sea, 0.0, np.maximum(ground, 0.4))
    ground = np.where(lake, LAKE_LEVEL_M, ground)
    wide = gaussian_filter(ground, 16)
    # Land is lifted back toward its large form as water wears it: valleys deepen, plateaus stay.
    softness = 0.004 + 0.006 * smooth(ground, 60, 250)
    ground = weather(
        ground, sea | lake, softness, COLLAR_CELL_KM, 45, 0.10,
        restore=lambda worn: 0.12 * (wide - gaussian_filter(worn, 16)),
    )  # fmt: skip
    return np.where(sea, 0.0, np.where(lake, LAKE_LEVEL_M, np.maximum(ground, 0.5)))


def finer(coarse):
    """The collar's heights, interpolated (cubic) at the tile's cell centres."""
    rows = (np.arange(ROWS) + 0.5) / 3 - 0.5 + COLLAR_REACH
    cols = (np.arange(COLS) + 0.5) / 3 - 0.5 + COLLAR_REACH
    return map_coordinates(coarse, np.meshgrid(rows, cols, indexing="ij"), order=3, mode="nearest")


def tile_ground(coarse, waters):
    """True heights of the 1″ tile in metres, and its waters as masks: planted cases yes, the model's error no."""
    x, y = tile_km()
    sea = cells_inside(waters["Amberlith Sea"][1])
    lake = cells_inside(waters["Lake Ondurwen"][1])
    pond = cells_inside(waters["Pemmarick Pond"][1])
    shore_km = distance_transform_edt(~(sea | lake | pond)) * CELL_KM
    near_lake = distance_transform_edt(~lake) * CELL_KM
    near_pond = distance_transform_edt(~pond) * CELL_KM
    base = finer(coarse)

    ground = planted.islands(base, x, y, shore_km)
    ground = planted.pond_bed(ground, near_pond, POND_LEVEL_M)
    crooked = [noise(x.shape, seed, 60, falling=2.4, shortest=4) for seed in (203, 204, 205)]
    ground, kept, floors = planted.plant(ground, x, y, crooked)

    steep = np.hypot(*np.gradient(gaussian_filter(ground, 6), CELL_KM * 1000))
    lift = (0.4 + 22 * np.minimum(steep, 0.45)) * smooth(shore_km, 0.03, 0.8) * (1 - kept)
    ground = ground + lift * (0.8 * noise(x.shape, 201, 26) + 0.45 * noise(x.shape, 202, 9))
    ground = np.maximum(ground, 0.6 + 3.0 * np.minimum(shore_km, 0.3))  # land stands above the sea
    ground = np.where(near_lake < 0.6, np.maximum(ground, LAKE_LEVEL_M + 0.6 + 4 * near_lake), ground)
    ground = np.where(sea, 0.0, np.where(lake, LAKE_LEVEL_M, np.where(pond, POND_LEVEL_M, ground)))

    outlets = sea | lake | pond | floors
    softness = 0.0035 * (1 - kept) * (0.25 + 0.75 * smooth(ground, 60, 200))
    ground = weather(ground, outlets, np.where(kept > 0.98, 0.0, softness), CELL_KM, 6, 0.12)
    # Toward its edges the tile becomes the collar's surface, so that there is no step between the two files.
    edge = np.minimum(np.minimum(x, y), y.max() - y)
    ground = base + (ground - base) * smooth(edge, 0.05, 1.2)
    ground, _ = flood(ground, outlets, 1e-4)
    ground = np.where(sea, 0.0, np.where(lake, LAKE_LEVEL_M, np.where(pond, POND_LEVEL_M, ground)))
    return ground, sea, lake, pond


def model_error(shape, seed, cell_km, sigma_m):
    """Error as terrain models have it: 70 % of the variance short (about 90 m), 30 % over 1.5 km."""
    short = noise(shape, seed, 3 * 0.09 / cell_km, falling=3.0, shortest=1.5)
    long = noise(shape, seed + 1, 3 * 1.5 / cell_km, falling=3.0, shortest=0.5 / cell_km)
    return sigma_m * (np.sqrt(0.7) * short + np.sqrt(0.3) * long)


def as_a_model_sees_it(ground, waters_flat, seed, cell_km, sigma_m):
    """The ground with a model's error, to an eighth of a metre; waters stay flat, as in edited models."""
    seen = np.where(waters_flat, ground, np.maximum(ground + model_error(ground.shape, seed, cell_km, sigma_m), 0.125))
    return (np.round(seen / STEP_M) * STEP_M).astype(np.float32)
