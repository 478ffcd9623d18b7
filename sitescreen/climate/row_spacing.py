"""How far a row of houses, or an eave, throws its shadow across a wall, and so how far apart rows stand."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def shadow_reach(
    sun_elevation_deg: ArrayLike,
    sun_azimuth_deg: ArrayLike,
    face_deg: ArrayLike,
    slope_deg: ArrayLike = 0.0,
    aspect_deg: ArrayLike = 0.0,
) -> FloatArray:
    """Reach of a shadow square to a wall, for each metre of height of what throws it.

    Parameters
    ----------
    sun_elevation_deg, sun_azimuth_deg : arrays that broadcast together
        Height of the sun above level, and its bearing clockwise from true north. [°]
    face_deg : array
        Bearing that the wall faces. [°]
    slope_deg, aspect_deg : arrays
        Steepness of the ground [°] and the bearing that it falls to. [°] Level if left out; where the ground is level
        the aspect may be NaN.

    Returns
    -------
    float64 array
        Metres per metre: the clear gap, measured square to the wall, at which a row of houses of height 1 in front just
        leaves the foot of the wall in the sun; on level ground also how far an eave must stand out to keep the sun from
        1 m of wall below it. 0 where the sun is behind the wall or down, infinite where the ground towards the sun
        rises as steeply as the sun stands.

    Notes
    -----
    With HSA the angle between the sun's bearing and the wall's, and ``rise`` the ground's rise per metre towards the
    sun, ``cos HSA / (tan h − rise)``. On level ground that is 1 / tan VSA of the vertical shadow angle, tan VSA = tan h
    / cos HSA: geometry, in any textbook on sunshades. Rows are taken to be long, and to follow the ground.
    """
    height = np.radians(np.asarray(sun_elevation_deg, dtype=np.float64))
    sun = np.asarray(sun_azimuth_deg, dtype=np.float64)
    in_front = np.cos(np.radians(sun - np.asarray(face_deg, dtype=np.float64)))
    slope = np.radians(np.asarray(slope_deg, dtype=np.float64))
    falls = np.where(slope > 0.0, np.cos(np.radians(sun - np.asarray(aspect_deg, dtype=np.float64))), 0.0)
    margin = np.tan(height) + np.tan(slope) * falls
    # 1e-9: cos 90° is not quite 0 in the computer, and a sun along the wall throws no shadow on it
    shines = (height > 0.0) & (in_front > 1e-9)
    with np.errstate(divide="ignore", invalid="ignore"):
        reach = np.where(margin > 0.0, in_front / margin, np.inf)
    return np.asarray(np.where(shines, reach, 0.0), dtype=np.float64)


def farthest_reach(
    sun_elevation_deg: FloatArray,
    sun_azimuth_deg: FloatArray,
    chosen: NDArray[np.bool_],
    face_deg: FloatArray,
    slope_deg: FloatArray | None = None,
    aspect_deg: FloatArray | None = None,
) -> FloatArray:
    """The farthest reach of a shadow across walls in chosen hours.

    Parameters
    ----------
    sun_elevation_deg, sun_azimuth_deg : float64 arrays, shape (times,)
        [°]
    chosen : bool array, shape (n, times)
        The moments that count for each wall.
    face_deg : float64 array, shape (n,)
        Bearing that each wall faces. [°]
    slope_deg, aspect_deg : float64 arrays, shape (n,), optional
        The ground at each wall; level if left out.

    Returns
    -------
    float64 array, shape (n,)
        As :func:`shadow_reach`, the largest of the chosen moments; 0 where the sun stands before the wall in none.
    """
    steepness = np.zeros(len(face_deg)) if slope_deg is None else slope_deg
    falls_to = np.zeros(len(face_deg)) if aspect_deg is None else aspect_deg
    every = shadow_reach(
        sun_elevation_deg[None, :],
        sun_azimuth_deg[None, :],
        face_deg[:, None],
        steepness[:, None],
        falls_to[:, None],
    )
    return np.asarray(np.where(chosen, every, 0.0).max(axis=1, initial=0.0), dtype=np.float64)
