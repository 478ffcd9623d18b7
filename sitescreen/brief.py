"""The brief: the TOML file that names the inputs and the choices of one screening.

Only ``[terrain] files`` and ``[plots] file`` are required. Paths are relative to the brief and are made absolute when
it is read; whether the files can be used is for ``inputs/`` to say.
"""

import re
import tomllib
from collections.abc import Mapping, Sequence
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal, Self

from pydantic import (
    AfterValidator,
    BaseModel,
    ConfigDict,
    Field,
    ValidationError,
    model_validator,
)

from sitescreen.brief_faults import first_fault
from sitescreen.brief_paths import FilePath, FilePaths, at_home
from sitescreen.errors import BriefError

Level = Literal["note", "concern", "stop"]


def _once(months: list[int]) -> list[int]:
    if len(set(months)) < len(months):
        raise ValueError("each month once")
    return months


def _rising(points: list[tuple[float, float]]) -> list[tuple[float, float]]:
    if any(later[0] <= earlier[0] for earlier, later in pairwise(points)):
        raise ValueError("a curve whose first numbers rise from point to point")
    return points


def _tile_address(address: str) -> str:
    if not re.fullmatch(r"https://[A-Za-z0-9.-]+(:[0-9]+)?/[A-Za-z0-9._~/?&=%+@:{}-]*", address) or any(
        slot not in address for slot in ("{z}", "{x}", "{y}")
    ):
        raise ValueError("an address that begins with https://, names its server plainly and holds {z}, {x} and {y}")
    return address


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
    without: list[Text] = []


class WindBrief(_Part):
    """The table of winds, and which of its places serves a plot: the nearest, or all by inverse squared distance."""

    file: FilePath
    places: Literal["nearest", "inverse_distance"] = "nearest"


Months = Annotated[
    list[Annotated[int, Field(strict=True, ge=1, le=12)]], Field(min_length=1, max_length=12), AfterValidator(_once)
]


class ClimateBrief(_Part):
    """The table of station normals; the months of the cool and hot seasons, for where there is no such table."""

    stations: FilePath | None = None
    cool_months: Months | None = None
    hot_months: Months | None = None


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
    """The table of clear sky, and the clock that times of sun are told by."""

    file: FilePath | None = None
    utc_offset_h: Annotated[Number, Field(ge=-12, le=14)] | None = None


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
    """A layer that is drawn under the plots: roads, rivers, places. It changes no reading.

    ``name``: what the layer is called, else its file's name. ``label``: the column with the things' own names, else a
    column called name, label or title.
    """

    file: FilePath
    name: Text | None = None
    label: Text | None = None


class OutputBrief(_Part):
    """Where the results go. The folder is always set once a brief has been read.

    ``online_map``: address of map pictures that the page may ask for once its reader says so, with {z}, {x} and {y};
    ``online_credit``: whom to name for them.
    """

    folder: FilePath
    layers: Annotated[bool, Field(strict=True)] = True
    online_map: Annotated[str, Field(strict=True), AfterValidator(_tile_address)] | None = None
    online_credit: Text | None = None


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

    def with_choices(
        self,
        zone: str | None = None,
        out: Path | None = None,
        without: Sequence[str] = (),
        seed: int | None = None,
    ) -> "Brief":
        """The same brief with choices of the call; None and () change nothing.

        Parameters
        ----------
        zone : str, optional
            For all plots.
        out : Path, optional
            Another folder for the results.
        without : sequence of str
            Plots to leave out beside those that the brief leaves out.
        seed : int, optional
            Another start of the trials.
        """
        changes: dict[str, Any] = {}
        if without:
            changes["plots"] = self.plots.model_copy(update={"without": [*self.plots.without, *without]})
        if seed is not None:
            changes["judge"] = self.judge.model_copy(update={"seed": seed})
        if zone is not None:
            changes["zones"] = ZonesBrief(force=zone)
        if out is not None:
            changes["output"] = self.output.model_copy(update={"folder": _called(out, "--out")})
        return self.model_copy(update=changes)


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
    path = _called(path, "the brief")
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
        raise first_fault(error, called, Brief) from error


def _called(given: Path, what: str) -> Path:
    """A path of the call, made absolute."""
    try:
        return at_home(given).absolute()
    except ValueError as error:
        shown = f"{str(given)!r:.60}"
        raise BriefError(f"{what} is {shown}", f"{error} is needed", "Correct the call") from error
