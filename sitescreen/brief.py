"""The brief: the TOML file that names the inputs and the choices of one screening.

Only ``[terrain] files`` and ``[plots] file`` are required. Paths are relative to the brief and are made absolute when
it is read; whether the files can be used is for ``inputs/`` to say. Keys that a later version will use are checked
already, and :meth:`Brief.not_used_yet` names them.
"""

import difflib
import tomllib
import typing
from collections.abc import Mapping, Sequence
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal, Self

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    ValidationError,
    ValidationInfo,
    model_validator,
)

from sitescreen.errors import BriefError

Level = Literal["note", "concern", "stop"]


def _absolute(given: Any, info: ValidationInfo) -> Path:
    """A path as the brief writes it, made absolute against the brief's folder."""
    if not isinstance(given, str | Path) or not str(given).strip():
        raise ValueError("a file name in quotes")
    folder = (info.context or {}).get("folder", Path.cwd())
    return Path(folder, Path(given).expanduser()).absolute()


def _files(given: Any, info: ValidationInfo) -> list[Path]:
    """File names as a list; one name may stand alone, and ``*`` and ``?`` stand for the files that match."""
    listed = [given] if isinstance(given, str | Path) else given
    if not isinstance(listed, list | tuple):
        raise ValueError('a list of file names, such as ["tile.tif"]')
    found: list[Path] = []
    for one in listed:
        path = _absolute(one, info)
        if any(sign in path.name for sign in "*?") and not path.exists():
            matching = sorted(path.parent.glob(path.name))
            if not matching:
                raise ValueError(f"file names; nothing matches {one!r}")
            found += matching
        else:
            found.append(path)
    if not found:
        raise ValueError("at least one file")
    if len(set(found)) < len(found):
        raise ValueError("each file once")
    return found


def _rising(points: list[tuple[float, float]]) -> list[tuple[float, float]]:
    if any(later[0] <= earlier[0] for earlier, later in pairwise(points)):
        raise ValueError("a curve whose first numbers rise from point to point")
    return points


FilePath = Annotated[Path, BeforeValidator(_absolute)]
FilePaths = Annotated[list[Path], BeforeValidator(_files)]
Text = Annotated[str, Field(strict=True, min_length=1)]
Number = Annotated[float, Field(strict=True, allow_inf_nan=False)]
CurvePoint = Annotated[tuple[Number, Annotated[Number, Field(ge=0, le=100)]], Field(strict=False)]
Curve = Annotated[list[CurvePoint], Field(min_length=2), AfterValidator(_rising)]


class _Part(BaseModel):
    """A checked, frozen part of the brief; a key that it does not know is an error."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


class TerrainBrief(_Part):
    """The terrain model. ``None`` stands for "the file or the product should say"."""

    files: FilePaths
    crs: Text | None = None
    vertical_unit: Literal["m", "ft"] | None = None
    surface: Literal["bare", "canopy"] | None = None
    vertical_error_m: Annotated[Number, Field(ge=0, le=100)] | None = None
    product: Text | None = None
    error_range_m: Annotated[Number, Field(gt=0, le=10_000)] | None = None
    canopy_height: FilePath | None = None


class ShoreBrief(_Part):
    """The shoreline layer."""

    file: FilePath
    kind: Text | None = None


class PlotsBrief(_Part):
    """The candidate plots.

    A point stands for a disc of 60 m: at 30 m that is 12 to 13 cells, and slope statistics need 9; 50 m has 8 or 9.
    """

    file: FilePath
    id: Text | None = None
    name: Text | None = None
    zone: Text | None = None
    crs: Text | None = None
    point_radius_m: Annotated[Number, Field(gt=0, le=5000)] = 60.0  # 12 cells of 30 m: slope needs 9
    footprint_m2: Annotated[Number, Field(gt=0, le=1e6)] = 400.0


class WindBrief(_Part):
    """The table of winds."""

    file: FilePath


class ClimateBrief(_Part):
    """The table of station normals."""

    stations: FilePath


class CoverClass(_Part):
    """What one class of ground cover means for the air."""

    roughness_m: Annotated[Number, Field(ge=0.0001, le=5)]
    canopy_m: Annotated[Number, Field(ge=0, le=100)]
    cold_air_factor: Annotated[Number, Field(ge=0, le=2)]


class CoverBrief(_Part):
    """The ground cover: a raster of whole numbers, or polygons with a column that holds the class."""

    file: FilePath
    column: Text | None = None
    classes: Annotated[dict[Text, CoverClass], Field(min_length=1, max_length=254)]


class SkyBrief(_Part):
    """The table of clear sky."""

    file: FilePath


class ZonesBrief(_Part):
    """Climate zones that somebody states: one for all plots, or a map of them."""

    force: Text | None = None
    polygons: FilePath | None = None

    @model_validator(mode="after")
    def _one_of_two(self) -> Self:
        if self.force is not None and self.polygons is not None:
            raise ValueError("either force or polygons, not both")
        return self


class JudgeBrief(_Part):
    """How to judge."""

    profiles: FilePath | None = None
    shortlist: Annotated[int, Field(strict=True, ge=1, le=10_000)] = 5
    seed: Annotated[int, Field(strict=True, ge=0, le=2**63 - 1)] = 20
    pairs: list[Text] = []


class OwnConstraint(_Part):
    """A layer that speaks against a plot."""

    name: Text
    file: FilePath
    buffer_m: Annotated[Number, Field(ge=0, le=100_000)] = 0.0
    level: Level = "concern"
    say: Text | None = None


class OwnCriterion(_Part):
    """A criterion of the planner's own: distance to a layer, or a column of the plots."""

    name: Text
    file: FilePath | None = None
    column: Text | None = None
    curve: Curve
    weight: Annotated[Number, Field(gt=0, le=1000)]

    @model_validator(mode="after")
    def _one_of_two(self) -> Self:
        if (self.file is None) == (self.column is None):
            raise ValueError("one of file and column")
        return self


class ContextLayer(_Part):
    """A layer that is drawn under the plots."""

    file: FilePath
    name: Text | None = None


class OutputBrief(_Part):
    """Where the results go. The folder is always set once a brief has been read."""

    folder: FilePath
    layers: Annotated[bool, Field(strict=True)] = True


class Brief(_Part):
    """One screening's inputs and choices; attributes are the sections and keys of the TOML file."""

    title: Annotated[str, Field(strict=True)] = "Candidate plots"
    terrain: TerrainBrief
    shore: ShoreBrief | None = None
    plots: PlotsBrief
    wind: WindBrief | None = None
    climate: ClimateBrief | None = None
    cover: CoverBrief | None = None
    sky: SkyBrief | None = None
    zones: ZonesBrief = ZonesBrief()
    judge: JudgeBrief = JudgeBrief()
    constraint: list[OwnConstraint] = []
    criterion: list[OwnCriterion] = []
    context: list[ContextLayer] = []
    output: OutputBrief

    @classmethod
    def from_files(
        cls,
        terrain: Sequence[Path],
        shore: Path | None,
        plots: Path,
        zone: str | None = None,
        out: Path | None = None,
        shore_kind: str | None = None,
    ) -> "Brief":
        """The brief that files named on the command line amount to; paths are relative to the current folder.

        Raises
        ------
        BriefError
            If something about them cannot be used.
        """
        content: dict[str, Any] = {"terrain": {"files": list(terrain)}, "plots": {"file": plots}}
        if shore is not None:
            content["shore"] = {"file": shore} | ({} if shore_kind is None else {"kind": shore_kind})
        if zone is not None:
            content["zones"] = {"force": zone}
        if out is not None:
            content["output"] = {"folder": out}
        return checked_brief(content, Path.cwd(), "the call")

    def with_choices(self, zone: str | None = None, out: Path | None = None) -> "Brief":
        """The same brief with a zone for all plots, or another folder for the results; None changes nothing."""
        changes: dict[str, Any] = {}
        if zone is not None:
            changes["zones"] = ZonesBrief(force=zone)
        if out is not None:
            changes["output"] = self.output.model_copy(update={"folder": Path(out).expanduser().absolute()})
        return self.model_copy(update=changes)

    def not_used_yet(self) -> list[str]:
        """Keys that were given and checked, but that this version does nothing with, as the brief writes them."""
        given = {
            "[terrain] canopy_height": self.terrain.canopy_height is not None,
            "[plots] footprint_m2": "footprint_m2" in self.plots.model_fields_set,
            "[cover]": self.cover is not None,
            "[sky]": self.sky is not None,
            "[[context]]": bool(self.context),
        }
        return [key for key, is_given in given.items() if is_given]


_NO_BRIEFS = (
    ("a raster", "--terrain", (".tif", ".tiff", ".vrt", ".img", ".asc", ".hgt", ".dem", ".bil", ".nc")),
    (
        "a table or a map layer",
        "--plots",
        (".csv", ".xlsx", ".gpkg", ".geojson", ".shp", ".fgb", ".kml", ".kmz", ".gpx"),
    ),
)
"""Files that are handed in where the brief belongs, and the option they belong to."""


def load_brief(path: Path) -> Brief:
    """Read a brief.

    Parameters
    ----------
    path : Path
        A TOML file in UTF-8.

    Raises
    ------
    BriefError
        If it cannot be read, is not TOML, lacks a required key, or holds a key or value that is not allowed; the
        message names the key.
    """
    path = Path(path).expanduser().absolute()
    for what, option, endings in _NO_BRIEFS:
        if path.suffix.lower() in endings:
            raise BriefError(
                f"{path.name} was given as the brief, and that is {what}",
                "a brief, which is a text file in TOML, or options that name the files are needed",
                f"Did you mean {option} {path.name}? Options go without a brief",
            )
    try:
        content = tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise BriefError(
            f"the brief {path.name} cannot be read ({error.strerror})",
            "a readable TOML file is needed",
            "Check the path",
        ) from error
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise BriefError(
            f"the brief {path.name} is not valid TOML: {error}",
            "a TOML file in UTF-8 is needed",
            "Correct that place; text stands in quotes, lists in [ ], and on Windows paths take / or single quotes",
        ) from error
    return checked_brief(content, path.parent, path.name)


def checked_brief(content: Mapping[str, Any], folder: Path, called: str) -> Brief:
    """Check the content of a brief whose paths are relative to a folder.

    Parameters
    ----------
    content : mapping
        As TOML gives it.
    folder : Path
    called : str
        What messages call the brief.

    Raises
    ------
    BriefError
        At the first fault.
    """
    output = content.get("output", {})
    if isinstance(output, Mapping) and "folder" not in output:
        content = {**content, "output": {**output, "folder": "out"}}
    try:
        return Brief.model_validate(content, context={"folder": folder})
    except ValidationError as error:
        raise _brief_error(error, called) from error


def _brief_error(error: ValidationError, called: str) -> BriefError:
    """The first fault; an unknown key before others, since a slip of the pen is often why another key is missing."""
    fault = sorted(error.errors(), key=lambda one: one["type"] != "extra_forbidden")[0]
    key = _as_written(fault["loc"])
    if fault["type"] == "extra_forbidden":
        return _unknown_key(called, key, fault["loc"])
    if fault["type"] == "missing":
        return BriefError(f"{called} has no {key}", "that key is needed", "Add it")
    given = repr(fault["input"])
    given = given if len(given) <= 60 else given[:57] + "…"
    return BriefError(f"{called} has {key} = {given}", f"{_needed(fault)} is needed", "Correct that value")


_MEANT = {
    ("shore", "polygons"): "file",
    ("shore", "lines"): "file",
    ("zones", "zone"): "force",
    ("zones", "file"): "polygons",
    ("plots", "plot"): "id",
    ("wind", "stations"): "file",
    ("climate", "file"): "stations",
}
"""Keys that belong to another section, by the key that does here what they seem to ask for."""


def _unknown_key(called: str, key: str, loc: tuple[int | str, ...]) -> BriefError:
    name, owner = str(loc[-1]), _model_at(loc[:-1])
    known = list(owner.model_fields)
    homes = [section for section, field in Brief.model_fields.items() if name in _fields_of(field.annotation)]
    near = difflib.get_close_matches(name.lower(), known, n=1)
    meant = _MEANT.get((str(loc[0]), name))
    if meant is not None:
        way_out = f"“{meant}” is what it is called there"
    elif near:
        way_out = f"Perhaps “{near[0]}” was meant"
    elif homes:
        way_out = f"It belongs under [{homes[0]}]"
    else:
        way_out = "Remove it, or correct its spelling"
    return BriefError(f"{called} has the unknown key {key}", f"known keys there are {', '.join(known)}", way_out)


def _model_in(annotation: Any) -> type[BaseModel] | None:
    """The model that an annotation is or holds, as ``list[Model]`` and ``Model | None`` do."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    found = (_model_in(inner) for inner in typing.get_args(annotation))
    return next((one for one in found if one is not None), None)


def _fields_of(annotation: Any) -> list[str]:
    model = _model_in(annotation)
    return list(model.model_fields) if model is not None else []


def _model_at(loc: tuple[int | str, ...]) -> type[BaseModel]:
    """The model at the end of a path; numbers and the keys of a table of classes stay with the model they hold."""
    model: type[BaseModel] = Brief
    for part in loc:
        if part in model.model_fields:
            model = _model_in(model.model_fields[str(part)].annotation) or model
    return model


def _as_written(loc: tuple[int | str, ...]) -> str:
    """A key as the brief writes it: ``[terrain] files``, ``[[constraint]] 2, level``; entries are counted from 1."""
    words = [str(part + 1) if isinstance(part, int) else part for part in loc]
    section = Brief.model_fields.get(words[0])
    if section is None or _model_in(section.annotation) is None:
        return " ".join(words)
    is_list = typing.get_origin(section.annotation) is list
    head = f"[[{words[0]}]]" if is_list else f"[{words[0]}]"
    return f"{head} {', '.join(words[1:])}".rstrip()


_PLAIN = {
    "string_type": "text in quotes",
    "string_too_short": "some text",
    "float_type": "a number without quotes",
    "int_type": "a whole number without quotes",
    "int_from_float": "a whole number",
    "finite_number": "an ordinary number",
    "bool_type": "true or false",
    "list_type": "a list in [ ]",
    "tuple_type": "a pair of numbers in [ ]",
    "dict_type": "a table of keys",
    "model_type": "a table of keys",
}
_BOUNDS = {"ge": "from {} up", "gt": "above {}", "le": "up to {}", "lt": "below {}"}


def _needed(fault: Any) -> str:
    """What a fault asks for, in plain words."""
    if fault["type"] == "value_error":
        return str(fault["ctx"]["error"])
    if fault["type"] == "literal_error":
        return f"one of {fault['ctx']['expected']}"
    if fault["type"] in _PLAIN:
        return _PLAIN[fault["type"]]
    for name, words in _BOUNDS.items():
        if name in fault.get("ctx", {}):
            return "a number " + words.format(f"{fault['ctx'][name]:g}")
    return str(fault["msg"]).replace("Input should be", "a value that is").rstrip(".")
