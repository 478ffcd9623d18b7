"""Landmarks: layers that are only drawn, so that people find their way on a map without street names."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

from sitescreen.brief import ContextLayer
from sitescreen.inputs.own_layers import read_placed
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.vector_files import column_named
from sitescreen.notes import Note

NAME_COLUMNS = ("name", "label", "title")
"""Columns taken for the names of things where the brief names none: our choice."""


@dataclass(frozen=True)
class Landmarks:
    """One layer to be drawn under the plots. It changes no reading.

    Parameters
    ----------
    name : str
        What the layer is called.
    shapes : object array of shapely geometries, shape (n,), EPSG:4326
    labels : tuple of str, length n
        Each thing's own name, "" where it has none.
    stamp : FileStamp
    notes : tuple of Note
    """

    name: str
    shapes: NDArray[np.object_]
    labels: tuple[str, ...]
    stamp: FileStamp
    notes: tuple[Note, ...]


def read_context(layers: Sequence[ContextLayer], outline: Any) -> tuple[Landmarks, ...]:
    """Read the layers that the brief's ``[[context]]`` parts name.

    Parameters
    ----------
    layers : sequence of ContextLayer
    outline : shapely geometry, EPSG:4326
        Of the terrain's data: a layer beside it is said.

    Raises
    ------
    InputError
        If one of them cannot be used.
    """
    return tuple(_read(one, outline) for one in layers)


def _read(layer: ContextLayer, outline: Any) -> Landmarks:
    placed = read_placed(layer.file, "context")
    columns = [str(name) for name in placed.table.columns if name != "geometry"]
    if layer.label is not None:
        column: str | None = column_named(layer.label, columns, layer.file, "[[context]] label")
    else:
        column = next((one for one in columns if one.strip().casefold() in NAME_COLUMNS), None)
    labels = ("",) * len(placed.shapes) if column is None else tuple(map(_word, placed.table[column].tolist()))
    notes = placed.notes
    if not shapely.intersects(placed.shapes, outline).any():
        beside = f"The layer of landmarks {layer.file.name} lies beside the terrain: nothing of it is drawn."
        notes = (*notes, Note("warning", "context", beside))
    return Landmarks(layer.name or layer.file.stem, placed.shapes, labels, stamp(layer.file, placed.crs), notes)


def _word(value: Any) -> str:
    is_known = value is not None and value == value  # NaN is not equal to itself
    return str(value).strip() if is_known else ""
