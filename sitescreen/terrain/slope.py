"""How steep the ground is and which way it falls, from Horn's 3 × 3 window."""

from typing import Any, NamedTuple

import numpy as np

from sitescreen.grid import Field
from sitescreen.terrain._slope_kernel import horn_gradient, horn_slope_aspect
from sitescreen.terrain.threads import in_bands


class Gradient(NamedTuple):
    """Rise of the ground per metre walked: ``east`` to the grid's east, ``north`` to its north."""

    east: Field
    north: Field


class SlopeAspect(NamedTuple):
    """Steepest slope and the bearing it falls to, both in degrees."""

    slope_deg: Field
    aspect_deg: Field


def gradient(elevation: Field) -> Gradient:
    """Rise per metre to the grid's east and north, from Horn's 3 × 3 window [1]_.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] NaN where unknown.

    Returns
    -------
    Gradient
        Each field of shape (rows, cols). [1] NaN on the outer ring and wherever any of the nine cells is NaN.

    References
    ----------
    .. [1] B. K. P. Horn, "Hill shading and the reflectance map," Proc. IEEE, vol. 69, pp. 14–47, 1981.
       doi:10.1109/PROC.1981.11918
    """
    east, north = _empty(elevation), _empty(elevation)
    grid = elevation.grid
    in_bands(horn_gradient, grid.rows, elevation.values, grid.cell_size_m, east, north)
    return Gradient(
        Field(east, grid, "1", "rise of the ground per metre eastward"),
        Field(north, grid, "1", "rise of the ground per metre northward"),
    )


def slope_deg(elevation: Field) -> Field:
    """Steepest slope of each cell. [°] 0 = level; NaN as in :func:`gradient`.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    """
    values = _empty(elevation)
    _slope_aspect(elevation, values, _NOTHING)
    return Field(values, elevation.grid, "°", "slope")


def aspect_deg(elevation: Field) -> Field:
    """The bearing each cell falls to. [°] Clockwise from grid north, 0 ≤ bearing < 360.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]

    Returns
    -------
    Field
        NaN on level cells, which face nowhere, and as in :func:`gradient`.
    """
    values = _empty(elevation)
    _slope_aspect(elevation, _NOTHING, values)
    return Field(values, elevation.grid, "°", "bearing that the ground falls to, from grid north")


def slope_and_aspect(elevation: Field) -> SlopeAspect:
    """Both of :func:`slope_deg` and :func:`aspect_deg` in one pass over the heights."""
    slope, aspect = _empty(elevation), _empty(elevation)
    _slope_aspect(elevation, slope, aspect)
    return SlopeAspect(
        Field(slope, elevation.grid, "°", "slope"),
        Field(aspect, elevation.grid, "°", "bearing that the ground falls to, from grid north"),
    )


_NOTHING = np.empty((0, 0), dtype=np.float32)


def _slope_aspect(elevation: Field, slope: Any, aspect: Any) -> None:
    grid = elevation.grid
    in_bands(horn_slope_aspect, grid.rows, elevation.values, grid.cell_size_m, slope, aspect)


def _empty(elevation: Field) -> Any:
    """An array like the field's, its outer ring NaN and the rest yet to be written."""
    values = np.empty(elevation.grid.shape, dtype=np.float32)
    values[[0, -1], :] = np.nan
    values[:, [0, -1]] = np.nan
    return values
