"""Which water is sea and which is lake, from the words of a file or of the brief."""

import re
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import InputError
from sitescreen.inputs.vector_files import column_named
from sitescreen.notes import Note

_WORDS = {
    "sea": "sea ocean coast coastline shoreline marine bay gulf strait saltwater sealine",
    "lake": "lake lakes reservoir dam pond lagoon inlandwater waterbody inlandwaterbody water freshwater lakeshore",
    "land": "land island islands mainland ground isle",
    "": "river rivers stream canal creek wetland swamp marsh riverbank ditch drain riverine",
}
_KIND_OF = {word: kind for kind, words in _WORDS.items() for word in words.split()}
_USUAL_COLUMNS = ("kind", "type", "class", "water", "water_type", "fclass", "natural", "featurecla")

WAY_OUT = (
    'Write kind = "sea" or "lake" under [shore] if they are water, kind = "land" if they are land (what is not land is '
    "then sea), or the column that holds these words; on the command line --shore-kind"
)


class Kinds(NamedTuple):
    """A kind a row – "sea", "lake", "land", or "" for water that makes no breeze – and what there is to say."""

    kinds: NDArray[np.object_]
    notes: tuple[Note, ...]


def kind_of(word: Any) -> str | None:
    """Sea, lake, land, "" for running or boggy water; None for a word that is not known."""
    return _KIND_OF.get(re.sub(r"[^a-z]", "", str(word).casefold()))


def shore_kinds(table: Any, kind: str | None, file: Path) -> Kinds:
    """The kind of every row.

    Parameters
    ----------
    table : GeoDataFrame
        Rows of the shore file.
    kind : str, optional
        A column, or one word for all rows. Without it a column with a usual name is taken if all its words are known.
    file : Path
        For messages.

    Raises
    ------
    InputError
        If it cannot be told which water is sea and which is lake.
    """
    columns = [str(name) for name in table.columns if name != table.geometry.name]
    if kind is None:
        for usual in _USUAL_COLUMNS:
            found = [name for name in columns if name.casefold() == usual]
            if len(found) == 1 and all(kind_of(value) is not None for value in table[found[0]].unique().tolist()):
                said = Note("info", "shore", f"The column “{found[0]}” of {file.name} tells sea from lake.")
                read = _from_column(table, found[0], file)
                return Kinds(read.kinds, (said, *read.notes))
        raise InputError(
            f"{file.name} does not say whether it holds sea, lakes or land",
            "that is needed, since sea and lakes make different breezes",
            WAY_OUT,
        )
    if kind in columns or (kind_of(kind) is None):
        return _from_column(table, column_named(kind, columns, file, "[shore] kind"), file)
    word = kind_of(kind)
    if not word:
        raise InputError(
            f"[shore] kind is “{kind}”",
            "sea, lake or land is needed; rivers and swamps make no breeze of their own",
            "Correct it in the brief",
        )
    return Kinds(np.full(len(table), word, dtype=object), _said({kind: word}, len(table)))


def _from_column(table: Any, column: str, file: Path) -> Kinds:
    values = table[column].tolist()
    words = ["" if value is None or value != value else str(value).strip() for value in values]
    unknown = sorted({word for word in words if kind_of(word) is None})
    if unknown:
        shown = ", ".join(f"“{word}”" if word else "nothing" for word in unknown[:8])
        raise InputError(
            f"the column “{column}” of {file.name} holds {shown}",
            "sea, lake or land is needed in every row",
            "Correct those rows, or name another column under [shore] kind in the brief",
        )
    read = {word: str(kind_of(word)) for word in dict.fromkeys(words)}
    dropped = sum(1 for word in words if read[word] == "")
    return Kinds(np.array([read[word] for word in words], dtype=object), _said(read, dropped))


def _said(read: dict[str, str], dropped: int) -> tuple[Note, ...]:
    notes = []
    other = [f"“{word}” as {kind}" for word, kind in read.items() if kind and word.casefold() != kind]
    if other:
        notes.append(Note("info", "shore", f"Words of the shore file were read so: {', '.join(other)}."))
    running = [f"“{word}”" for word, kind in read.items() if not kind]
    if running:
        text = f"{dropped} row(s) of the shore file ({', '.join(running)}) are no open water and were left out."
        notes.append(Note("info", "shore", text))
    return tuple(notes)


__all__ = ["WAY_OUT", "Kinds", "kind_of", "shore_kinds"]
