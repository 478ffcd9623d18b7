"""What the sun's beam brings to the two long faces of a building, for every bearing of its long axis at once."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._long_faces_kernel import long_faces
from sitescreen.climate.sun_path import DAYS_IN_MONTH, SunPath, lit
from sitescreen.climate.wall_pressure import BEARINGS_DEG
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]


class BeamSums(NamedTuple):
    """Beam over time, per square metre.

    ``faces`` (n, 180): on the two long faces together, by the bearing of the axis. ``level`` (n,): on level ground.
    """

    faces: FloatArray
    level: FloatArray


def beam_sums(across: FloatArray, height_deg: FloatArray, azimuth_deg: FloatArray) -> BeamSums:
    """Beam on the two long faces of a building, and on level ground.

    Parameters
    ----------
    across : float64 array, shape (n, times)
        Beam on a wall that faces the sun's azimuth, i.e. the beam's horizontal part, 0 where the sun is hidden; times
        whatever each moment is to count for. [W/m², or kWh/m²]
    height_deg, azimuth_deg : float64 arrays, shape (times,)
        Of the sun; the azimuth clockwise from true north. [°]

    Returns
    -------
    BeamSums
        Faces: Σ over times of ``across · |sin(azimuth − bearing)|`` for bearings of 0, 1 … 179°. In the unit of
        ``across``.

    Notes
    -----
    One face looks to bearing + 90°, the other to bearing − 90°: the sun stands before one of them at a time, and the
    beam on it is the horizontal part times |sin(azimuth − bearing)|. With ``g = azimuth mod 180`` that is
    sin(g − bearing) for g at or above the bearing and its negative below, so the sums over time need forming only once,
    by whole degrees of g; every whole bearing then takes two products.
    """
    folded = azimuth_deg % 180.0
    bearing = np.radians(BEARINGS_DEG)
    out = BeamSums(np.empty((len(across), BEARINGS_DEG.size)), np.empty(len(across)))
    in_bands(
        long_faces,
        len(across),
        np.ascontiguousarray(across),
        np.tan(np.radians(height_deg)),
        # the remainder of a tiny negative azimuth is 180 itself
        np.floor(folded).astype(np.int64) % 180,
        np.sin(np.radians(folded)),
        np.cos(np.radians(folded)),
        np.sin(bearing),
        np.cos(bearing),
        *out,
    )
    return out


class FaceLoad(NamedTuple):
    """Sun on each long face, the mean of the two, on a mean day of the year. [kWh/m² a day]

    ``beam_kwh_m2`` (n, 180): from the sun itself, by the bearing of the axis. ``sky_kwh_m2`` (n,): from sky and ground,
    the same for all bearings.
    """

    beam_kwh_m2: FloatArray
    sky_kwh_m2: FloatArray


def face_load(
    path: SunPath,
    skyline_deg: NDArray[np.floating[Any]],
    sky_view: FloatArray,
    months: FloatArray,
    shine: FloatArray,
    albedo: float,
) -> FaceLoad:
    """Sun on the long faces of a building, past the skyline.

    Parameters
    ----------
    path : SunPath
        The plots' common sun.
    skyline_deg : array, shape (n, m)
        As for :func:`sitescreen.climate.sun_path.lit`. [°]
    sky_view : float64 array, shape (n,)
        Share of the sky that the ground leaves to a level plane, 0–1. A wall is taken to see half of it, whichever way
        it faces.
    months : float64 array, shape (n, 12)
        How much each month counts; 1 for all gives the year's mean day.
    shine : float64 array, shape (12, steps)
        Part of the beam that counts: the share of the time without cloud before the sun, 0 at moments left aside. The
        light of the sky counts at all moments.
    albedo : float
        Share of light that the ground throws back.

    Returns
    -------
    FaceLoad
    """
    moments = path.elevation_deg > 0.0
    month = np.nonzero(moments)[0]
    height, azimuth = path.elevation_deg[moments], path.azimuth_deg[moments]
    shines = lit(path._replace(elevation_deg=height, azimuth_deg=azimuth), skyline_deg)
    # kWh/m² on the mean day of the year for a month that counts fully
    to_kwh = DAYS_IN_MONTH / DAYS_IN_MONTH.sum() * path.step_h / 1000.0
    across = (path.beam_w_m2 * shine)[moments] * np.cos(np.radians(height)) * to_kwh[month]
    beam = beam_sums(np.take(months, month, axis=1) * (shines * across), height, azimuth)
    sky_by_month = path.diffuse_w_m2.sum(axis=1) * to_kwh
    # month by month, so that a plot's sum cannot depend on how many plots stand beside it
    sky = sum(months[:, number] * sky_by_month[number] for number in range(12))
    ground = albedo * (1.0 - 0.5 * sky_view) * (beam.level + sky)
    return FaceLoad(0.5 * beam.faces, 0.5 * sky_view * sky + ground)
