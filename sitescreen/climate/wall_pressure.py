"""How the wind's angle to a wall changes the air that it drives through a building, by pressure on two facing walls."""

import math
from functools import cache

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

SQUARE_ON = 0.6
"""Pressure coefficient of a low-rise wall that the wind meets square on (Swami & Chandra 1988)."""

BEARINGS_DEG = np.arange(180)
"""The bearings that a long axis can have: it has no front end. [°]"""

_STEP_DEG = 0.25
"""Fine enough for the dip at 90°, and a whole part of half a sector, 11.25 or 22.5°."""


def pressure_coefficient(incidence_deg: FloatArray, side_ratio: float = 1.0) -> FloatArray:
    """Mean pressure coefficient of a wall of a low building, from the wind's angle to its normal [1]_.

    Parameters
    ----------
    incidence_deg : float64 array
        0 = the wind meets the wall square on, 90 = it blows along the wall, 180 = the wall is in the lee. [°]
    side_ratio : float
        The wall's width over that of the walls beside it.

    Returns
    -------
    float64 array
        Pressure over that of the free wind, ½ρU². Negative = suction.

    References
    ----------
    .. [1] M. V. Swami and S. Chandra, "Correlations for pressure distribution on buildings and calculation of natural-
       ventilation airflow," ASHRAE Transactions, vol. 94, pp. 243–266, 1988. Coefficients as many programs copy them;
       the original was not at hand.
    """
    angle = np.radians(np.abs((np.asarray(incidence_deg, dtype=np.float64) + 180.0) % 360.0 - 180.0))
    ratio = math.log(side_ratio)
    half = angle / 2.0
    return SQUARE_ON * np.log(
        1.248
        - 0.703 * np.sin(half)
        - 1.175 * np.sin(angle) ** 2
        + 0.131 * np.sin(2.0 * angle * ratio) ** 3
        + 0.769 * np.cos(half)
        + 0.07 * ratio**2 * np.sin(half) ** 2
        + 0.717 * np.cos(half) ** 2
    )


def through_flow(incidence_deg: FloatArray, side_ratio: float = 1.0) -> FloatArray:
    """Air driven through openings in two facing walls, over that which the wind drives square on.

    Parameters
    ----------
    incidence_deg : float64 array
        Angle between the wind and the normal of either wall. [°]
    side_ratio : float

    Returns
    -------
    float64 array
        √(ΔCp / ΔCp at 0°): flow through an opening goes with the root of the pressure across it. 0 along the wall.

    Notes
    -----
    For a wall of side ratio 3 the fit makes the flow at 45–60° larger than at 0°, which nobody has measured to our
    knowledge: sitescreen uses 1, with which it never rises.
    """
    angle = np.abs((np.asarray(incidence_deg, dtype=np.float64) + 90.0) % 180.0 - 90.0)

    def difference(to_normal_deg: FloatArray) -> FloatArray:
        front = pressure_coefficient(to_normal_deg, side_ratio)
        return front - pressure_coefficient(180.0 - to_normal_deg, side_ratio)

    square_on = difference(np.zeros(1))[0]
    return np.asarray(np.sqrt(np.clip(difference(angle) / square_on, 0.0, None)))


@cache
def flow_from_bearing() -> FloatArray:
    """Through flow of a wind from due north, by the bearing of the long axis. Shape (180,).

    A wind from another whole bearing ``w`` has its flow for an axis ``a`` at ``(a − w) % 180``.
    """
    flow = through_flow(np.asarray(BEARINGS_DEG - 90.0, dtype=np.float64))
    flow.flags.writeable = False
    return flow


@cache
def flow_from_sectors(sectors: int = 16) -> FloatArray:
    """Through flow of a wind spread evenly over each sector, by the bearing of the long axis. Shape (sectors, 180).

    The mean over a sector's width, not the value at its centre: with the latter a wind that blows alike from all sides
    would favour the bearings between sectors.
    """
    middles = np.arange(round(180.0 / _STEP_DEG)) * _STEP_DEG + _STEP_DEG / 2.0
    fine = through_flow(np.asarray(middles - 90.0, dtype=np.float64))
    a_sector, a_degree = round(360.0 / sectors / _STEP_DEG), round(1.0 / _STEP_DEG)
    across = np.arange(a_sector) - a_sector // 2
    out = np.empty((sectors, BEARINGS_DEG.size))
    for sector in range(sectors):
        # an axis at a, wind from w: the angle between them is a − w
        first = BEARINGS_DEG * a_degree - sector * a_sector
        out[sector] = fine[(first[:, None] - across[None, :] - 1) % fine.size].mean(axis=1)
    out.flags.writeable = False
    return out
