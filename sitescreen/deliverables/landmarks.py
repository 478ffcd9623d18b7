"""Landmarks for the page: the layers of ``[[context]]`` cut to the map and thinned until they are light enough."""

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import shapely

from sitescreen.deliverables.sheet import Sheet
from sitescreen.deliverables.steps import in_steps

if TYPE_CHECKING:
    from sitescreen.inputs.context import Landmarks

MOST_CORNERS = 40_000
"""Of all layers together: about 300 kB of the page."""

FINEST_DEG, COARSEST_DEG = 0.00002, 0.002
"""Lines are thinned by 2 m at least, and by 200 m at most before a layer is left out. [°]"""


def landmarks(layers: Sequence["Landmarks"], sheet: Sheet) -> tuple[list[dict[str, Any]], list[str]]:
    """What the page draws under the plots, and what it leaves out.

    Parameters
    ----------
    layers : sequence of Landmarks
    sheet : Sheet

    Returns
    -------
    drawn : list of dict
        ``name`` and ``things`` of each layer that has something on the sheet; a thing has its ``label``, its ``kind``
        ("point", "line" or "area"), its ``parts`` in whole steps, as plots have, and an area the place ``at`` which its
        name may stand.
    left_out : list of str
        A sentence for each layer that is too heavy at the coarsest thinning; the last layers go first.
    """
    cut = [(layer.name, list(_on_sheet(layer, sheet))) for layer in layers]
    left_out = []
    while True:
        thinning = FINEST_DEG
        thinned = [_thinned(things, thinning) for _, things in cut]
        while sum(map(_corners, thinned)) > MOST_CORNERS and thinning < COARSEST_DEG:
            thinning = min(2 * thinning, COARSEST_DEG)
            thinned = [_thinned(things, thinning) for _, things in cut]
        if sum(map(_corners, thinned)) <= MOST_CORNERS:
            break
        name, _ = cut.pop()
        left_out.append(f"The landmarks “{name}” are too many for one page and are not drawn.")
    drawn = [
        {"name": name, "things": [_thing(label, shape, sheet) for label, shape in things]}
        for (name, _), things in zip(cut, thinned, strict=True)
        if things
    ]
    return drawn, left_out


def _on_sheet(layer: "Landmarks", sheet: Sheet) -> Iterator[tuple[str, Any]]:
    """Points, lines and polygons of a layer, one part at a time, cut off outside the sheet."""
    for label, shape in zip(layer.labels, layer.shapes, strict=True):
        for part in shapely.get_parts(shapely.clip_by_rect(shape, *sheet.bounds_deg)):
            for single in shapely.get_parts(part):  # a collection may hold collections
                if not single.is_empty:
                    yield label, single


def _thinned(things: list[tuple[str, Any]], degrees: float) -> list[tuple[str, Any]]:
    out = [(label, shapely.simplify(shape, degrees)) for label, shape in things]
    return [(label, shape) for label, shape in out if not shape.is_empty]


def _corners(things: list[tuple[str, Any]]) -> int:
    return int(sum(shapely.get_num_coordinates(shape) for _, shape in things))


def _thing(label: str, shape: Any, sheet: Sheet) -> dict[str, Any]:
    """One thing; a polygon is its edge, without what runs along the sheet's, and the place for its name."""
    kind = ("point", "line", "area")[int(shapely.get_dimensions(shape))]
    if kind != "area":
        return {"label": label, "kind": kind, "parts": [in_steps(np.asarray(shape.coords)[:, :2])]}
    rim = shapely.box(*sheet.bounds_deg).exterior.buffer(1e-9)
    edges = shapely.get_parts(shapely.line_merge(shapely.difference(shape.boundary, rim)))
    middle = shapely.maximum_inscribed_circle(shape, 0.0005).coords[0]
    return {
        "label": label,
        "kind": kind,
        "parts": [in_steps(np.asarray(edge.coords)[:, :2]) for edge in edges if not edge.is_empty],
        "at": in_steps(np.asarray([middle])[:, :2]),
    }
