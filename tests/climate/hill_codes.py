"""Codes' and guidelines' formulas for the wind over hills, as small functions: cross-checks, no part of the program.

Coefficients read in secondary sources that agree with one another; the standards' own text was not at hand.
"""

import math

TAYLOR_LEE = {"ridge": (2.0, 3.0), "hill": (1.6, 4.0), "escarpment": (0.8, 2.5)}
"""B and A of Taylor & Lee 1984, Climatol. Bull. 18(2):3–32, by the form of the ground."""


def taylor_lee_speed_up(height_m: float, half_length_m: float, z_m: float, form: str) -> float:
    """ΔS at the crest: B·H/L·exp(−A·z/L), with the half-length at half height; H/L at most 0.5."""
    most, decay = TAYLOR_LEE[form]
    return most * min(height_m / half_length_m, 0.5) * math.exp(-decay * z_m / half_length_m)


def en1991_orography(height_m: float, slope_length_m: float, z_m: float, x_m: float = 0.0) -> float:
    """c_o of EN 1991-1-4:2005, A.3 (hills and ridges), the factor on the mean wind speed.

    The length is that of the whole upwind slope, x from the crest (upwind negative, downwind slope as long).
    """
    phi = height_m / slope_length_m
    effective_m = slope_length_m if phi < 0.3 else height_m / 0.3
    t, x = z_m / effective_m, x_m / slope_length_m
    if not (-1.5 <= x <= 2.0 and 0.0 <= t <= 2.0):
        return 1.0
    a = 0.1552 * t**4 - 0.8575 * t**3 + 1.8133 * t**2 - 1.9115 * t + 1.0124
    b = 0.3542 * t**2 - 1.0577 * t + 2.6456 if x <= 0 else -0.3056 * t**2 + 1.0212 * t - 1.7637
    s = a * math.exp(b * x)
    if phi < 0.05:
        return 1.0
    return 1.0 + 2.0 * s * phi if phi < 0.3 else 1.0 + 0.6 * s


ASCE_K1_SLOPE = {"ridge": (1.30, 1.45, 1.55), "escarpment": (0.75, 0.85, 0.95), "hill": (0.95, 1.05, 1.15)}
"""K1/(H/Lh) in exposures B, C and D."""
ASCE_DECAY = {"ridge": 3.0, "escarpment": 2.5, "hill": 4.0}


def asce_k_zt(height_m: float, half_length_m: float, z_m: float, x_m: float = 0.0, form: str = "ridge") -> float:
    """K_zt of ASCE 7-16, 26.8, exposure C: it multiplies the pressure; the speed-up is √K_zt − 1."""
    steepness = min(height_m / half_length_m, 0.5)
    length = max(half_length_m, 2.0 * height_m)
    k1 = round(ASCE_K1_SLOPE[form][1] * steepness, 3)
    k2 = max(1.0 - abs(x_m) / (1.5 * length), 0.0)
    k3 = math.exp(-ASCE_DECAY[form] * z_m / length)
    return (1.0 + k1 * k2 * k3) ** 2
