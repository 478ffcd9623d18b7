"""How far a terrain model may be off: as the brief says, by a preset for a published model, or assumed."""

import difflib
from collections.abc import Mapping
from functools import cache
from typing import Annotated, Literal, NamedTuple

from pydantic import Field

from sitescreen.brief import TerrainBrief
from sitescreen.errors import BriefError
from sitescreen.notes import Note
from sitescreen.settings import Section, config_folder, read_settings

Surface = Literal["bare", "canopy"]


class Assumed(Section):
    """What stands in where nothing is said."""

    vertical_error_m: Annotated[float, Field(gt=0, le=100)]
    error_range_m: Annotated[float, Field(gt=0, le=10_000)]


class Product(Section):
    """One published terrain model."""

    title: str
    vertical_error_m: Annotated[float, Field(gt=0, le=100)]
    source: str
    surface: Surface


class Products(Section):
    """``config/terrain_products.toml``."""

    assumed: Assumed
    products: Mapping[str, Product]


class TerrainError(NamedTuple):
    """One standard deviation of the heights [m], the reach of errors [m], what the model shows, what to say."""

    vertical_error_m: float
    error_range_m: float
    surface: Surface
    notes: tuple[Note, ...]


@cache
def load_products() -> Products:
    """The presets.

    Raises
    ------
    ConfigError
        If the file is missing or wrong.
    """
    return read_settings(config_folder() / "terrain_products.toml", Products)


def terrain_error(brief: TerrainBrief) -> TerrainError:
    """Error and surface of the terrain model: the brief's own figures before its product's, those before assumed ones.

    Parameters
    ----------
    brief : TerrainBrief

    Raises
    ------
    BriefError
        If it names a product that is not in the list.
    """
    presets = load_products()
    product = _product(brief.product, presets) if brief.product is not None else None
    notes = []
    if brief.vertical_error_m is not None:
        error_m = brief.vertical_error_m
    elif product is not None:
        error_m = product.vertical_error_m
        notes.append(
            _note("info", f"Vertical error {error_m:g} m (1 σ), the preset of {product.title}: {product.source}.")
        )
    else:
        error_m = presets.assumed.vertical_error_m
        notes.append(
            _note(
                "assumed",
                f"Nothing says how exact the heights are: a standard deviation of {error_m:g} m is taken. "
                "Set vertical_error_m or product under [terrain].",
            )
        )
    range_m = brief.error_range_m
    if range_m is None:
        range_m = presets.assumed.error_range_m
        notes.append(
            _note("assumed", f"Where a height is wrong, those within about {range_m:g} m are taken to be wrong alike.")
        )
    surface: Surface = brief.surface or (product.surface if product is not None else "bare")
    if brief.surface is None and product is None:
        notes.append(
            _note(
                "assumed",
                'The terrain is taken to show bare ground; if trees and roofs are in it, set surface = "canopy".',
            )
        )
    elif surface == "canopy":
        notes.append(
            _note("info", "The terrain shows tree tops and roofs: hollows and steep steps beside woods may be trees.")
        )
    return TerrainError(error_m, range_m, surface, tuple(notes))


def _note(level: Literal["info", "assumed"], text: str) -> Note:
    return Note(level, "terrain", text)


def _product(name: str, presets: Products) -> Product:
    """The preset by its name, whatever its case, dashes and blanks."""
    plain = {_plain(key): key for key in presets.products}
    if _plain(name) in plain:
        return presets.products[plain[_plain(name)]]
    near = difflib.get_close_matches(_plain(name), plain, n=1, cutoff=0.4)
    raise BriefError(
        f"[terrain] product is “{name}”",
        f"one of {', '.join(presets.products)} is needed",
        (f"Perhaps “{plain[near[0]]}” was meant; " if near else "")
        + "for another model leave it out and set vertical_error_m",
    )


def _plain(name: str) -> str:
    return "".join(sign for sign in name.lower() if sign.isalnum())
