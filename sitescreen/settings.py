"""The numbers that sitescreen works with, read from ``config/`` and checked.

Frozen models, one a section of ``config/defaults.toml``. Where each number comes from stands there, on the line above.
"""

import difflib
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib import resources
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal, TypeVar

import annotated_types
from pydantic import AfterValidator, BaseModel, ConfigDict, Field, ValidationError, model_validator

from sitescreen.errors import ConfigError

Model = TypeVar("Model", bound=BaseModel)

Share = Annotated[float, Field(ge=0, le=1)]
Positive = Annotated[float, Field(gt=0, le=1e6)]


def _is_curve(points: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    values = [value for value, _ in points]
    if any(later <= earlier for earlier, later in pairwise(values)):
        raise ValueError("a curve whose first numbers rise from point to point")
    return points


Ramp = Annotated[
    tuple[tuple[Annotated[float, Field(allow_inf_nan=False)], Share], ...],
    Field(min_length=2, max_length=20),
    AfterValidator(_is_curve),
]
"""Points (value, fit), the values rising; linear between them and level beyond them."""


class Section(BaseModel):
    """A checked, frozen group of settings; a key that it does not know is an error."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


class ReadingSettings(Section):
    """How plots take their readings from the cells under them."""

    known_share_least: Share
    cells_least: Annotated[float, Field(ge=1, le=1000)]
    flat_gradient: Share
    pool_share_least: Share


class TerrainSettings(Section):
    """The ground."""

    buildable_limit_pct: Annotated[float, Field(gt=0, le=100)]
    rise_radius_m: Annotated[float, Field(ge=100, le=10_000)]
    sky_azimuths: Annotated[int, Field(ge=4, le=360)]
    smallest_water_km2: Positive
    smallest_outlet_km2: Positive
    watercourse_least_km2: Positive
    watercourse_near_m: Annotated[float, Field(ge=0, le=1000)]


class ShoreSettings(Section):
    """Which waters count."""

    smallest_lake_km2: Annotated[float, Field(ge=0, le=1000)]


class BreezeSettings(Section):
    """The day's breeze from sea or lake."""

    front_speed_m_s: Annotated[float, Field(ge=0.5, le=20)]
    onset_h: Annotated[float, Field(ge=0, le=24)]
    end_h: Annotated[float, Field(ge=0, le=24)]
    tail_from_km: Positive
    tail_length_km: Positive
    lake_width_none_km: Annotated[float, Field(ge=0, le=100)]
    lake_width_full_km: Annotated[float, Field(gt=0, le=500)]
    open_fetch_m: Annotated[float, Field(ge=100, le=50_000)]
    open_sector_deg: Annotated[float, Field(ge=5, le=180)]
    open_share: Annotated[float, Field(gt=0, le=1)]
    path_most_m: Annotated[float, Field(ge=1000, le=12_000)]
    path_eye_m: Annotated[float, Field(ge=0, le=100)]
    sea_depth_m: Annotated[float, Field(ge=50, le=5000)]
    lake_depth_m: Annotated[float, Field(ge=50, le=5000)]
    screen_from_tangent: Share
    screen_span_tangent: Annotated[float, Field(gt=0, le=2)]
    screen_most: Share


class WindSettings(Section):
    """Exposure and shelter."""

    sectors: Literal[8, 16]
    shelter_reach_m: Annotated[float, Field(ge=100, le=12_000)]
    receptor_height_m: Annotated[float, Field(ge=0, le=100)]
    shelter_from_tangent: Share
    shelter_span_tangent: Annotated[float, Field(gt=0, le=2)]
    shelter_most: Share
    roughness_m: Annotated[float, Field(ge=0.001, le=2)]
    pad_km: Annotated[float, Field(ge=1, le=50)]
    long_cut_km: Annotated[float, Field(ge=0, le=200)]
    short_cut_m: Annotated[float, Field(ge=0, le=5000)]
    speed_up_least: Annotated[float, Field(ge=-1, le=0)]
    speed_up_most: Annotated[float, Field(ge=0, le=3)]
    slope_most: Annotated[float, Field(gt=0, le=2)]
    slow_ratio: Share
    worst_energy_least: Share
    place_high_m: Positive
    rose_days: Annotated[float, Field(ge=1, le=100_000)]
    canopy_displacement: Share
    windbreak_most: Share
    windbreak_full_heights: Annotated[float, Field(ge=0, le=20)]
    windbreak_span_heights: Annotated[float, Field(gt=0, le=50)]
    roughness_fetch_m: Annotated[float, Field(ge=50, le=3000)]


class SunSettings(Section):
    """Path and light of the sun."""

    step_h: Annotated[float, Field(ge=0.05, le=1)]
    linke_turbidity: Annotated[float, Field(ge=1, le=10)]
    ground_albedo: Share
    cell_deg: Annotated[float, Field(ge=0.01, le=1)]
    level_m: Annotated[float, Field(ge=1, le=1000)]
    eye_m: Annotated[float, Field(ge=0, le=100)]
    eye_errors: Annotated[float, Field(ge=0, le=5)]
    skyline_reach_m: Annotated[float, Field(ge=1000, le=200_000)]


class ColdAirSettings(Section):
    """Cold air on calm clear nights."""

    least_depth_m: Annotated[float, Field(ge=0, le=100)]
    noise_factor: Annotated[float, Field(ge=0, le=10)]
    mean_noise_factor: Annotated[float, Field(ge=0, le=10)]
    least_cells: Annotated[int, Field(ge=1, le=10_000)]
    fill_scale_m: Positive
    tree_pool_ha: Positive
    tree_rim_m: Positive
    assumed_clear_calm_nights: Annotated[float, Field(ge=0, le=31)]
    strength_k: Mapping[str, Annotated[float, Field(ge=0, le=30)]]


class ColdLayerSettings(Section):
    """The night's cold air as a layer in motion."""

    night_h: Annotated[float, Field(gt=0, le=24)]
    heat_w_m2: Annotated[float, Field(gt=0, le=200)]
    deficit_k: Annotated[float, Field(ge=1, le=30)]
    fill_m: Annotated[float, Field(ge=5, le=500)]
    friction: Annotated[float, Field(ge=0.001, le=1)]
    depth_bound_m: Annotated[float, Field(ge=100, le=1000)]
    step_share: Annotated[float, Field(ge=0.05, le=0.7)]
    temperature_k: Annotated[float, Field(ge=220, le=330)]
    gorge_depth_m: Annotated[float, Field(gt=0, le=100)]
    section_m: Annotated[float, Field(ge=5, le=200)]
    edge_differ_m: Annotated[float, Field(gt=0, le=50)]
    edge_differ_share: Annotated[float, Field(gt=0, le=1)]
    surroundings_m: Annotated[float, Field(ge=500, le=20_000)]
    least_excess_m: Annotated[float, Field(ge=0, le=50)]
    stagnant_froude: Annotated[float, Field(gt=0, le=1)]
    moving_speed_m_s: Annotated[float, Field(gt=0, le=10)]
    moving_share: Annotated[float, Field(gt=0, le=10)]


class ColdChanceSettings(Section):
    """How sure the night's cold air is, given the terrain's error and what nights differ in."""

    draws_first: Annotated[int, Field(ge=5, le=10_000)]
    cold_from_k: Positive
    likely: Share
    possible: Share
    nest_core_m: Annotated[float, Field(ge=900, le=20_000, multiple_of=90)]
    nest_margin_m: Annotated[float, Field(ge=900, le=20_000, multiple_of=90)]
    warm_up_h: Annotated[float, Field(gt=0, le=24)]
    feed_every_s: Annotated[float, Field(ge=10, le=3600)]
    ring_cells: Annotated[int, Field(ge=1, le=10)]
    depth_bound_m: Annotated[float, Field(ge=50, le=1000)]
    heat_least_w_m2: Annotated[float, Field(gt=0, le=200)]
    heat_most_w_m2: Annotated[float, Field(gt=0, le=200)]
    deficit_least_k: Annotated[float, Field(ge=1, le=30)]
    deficit_most_k: Annotated[float, Field(ge=1, le=30)]
    source_together: Share
    near_m: Annotated[float, Field(ge=0, le=100)]
    near_errors: Annotated[float, Field(ge=0, le=10)]


class ZoneFit(Section):
    """One zone's ramps. Each is a condition; a condition left out does not limit the zone."""

    t_mean_c: Ramp | None = None
    t_range_k: Ramp | None = None
    rh_mean: Ramp | None = None
    hottest_month_max_c: Ramp | None = None
    elevation_m: Ramp | None = None
    sea_km: Ramp | None = None
    lake_km: Ramp | None = None
    lake_km_per_width: Ramp | None = None
    lake_width_km: Ramp | None = None
    unless: tuple[str, ...] = ()

    def ramps(self) -> dict[str, Any]:
        """The conditions that are set, by the quantity they look at."""
        return {name: ramp for name in type(self).model_fields if name != "unless" and (ramp := getattr(self, name))}


class ZoneSettings(Section):
    """How well a plot fits each climate zone. The zones' order settles ties and which memberships are known first."""

    lapse_k_km: Annotated[float, Field(ge=0, le=10)]
    least_membership: Share
    station_height_km_per_100m: Annotated[float, Field(ge=0, le=1000)]
    station_far_km: Positive
    station_high_m: Positive
    with_normals: Mapping[str, ZoneFit]
    without_normals: Mapping[str, ZoneFit]

    @model_validator(mode="after")
    def _precedence_ends(self) -> "ZoneSettings":
        if list(self.with_normals) != list(self.without_normals):
            raise ValueError("the same zones with and without normals, in one order")
        for fits in (self.with_normals, self.without_normals):
            if any(other not in fits for fit in fits.values() for other in fit.unless):
                raise ValueError("names of zones in `unless`")
            in_order_of_precedence(fits)
        return self


def in_order_of_precedence(fits: Mapping[str, ZoneFit]) -> list[str]:
    """The zones, those that take precedence before those that give way to them."""
    done: list[str] = []
    waiting = list(fits)
    while waiting:
        ready = [zone for zone in waiting if all(other in done for other in fits[zone].unless)]
        if not ready:
            raise ValueError(f"an end to the circle of `unless` between {', '.join(waiting)}")
        done += ready
        waiting = [zone for zone in waiting if zone not in done]
    return done


class JudgementSettings(Section):
    """Marks and ranks."""

    assumed_weight_factor: Share
    mark_tie: Annotated[float, Field(ge=0, le=0.1)]
    reasons_shown: Annotated[int, Field(ge=1, le=10)]
    trials: Annotated[int, Field(ge=100, le=100_000)]
    data_draws: Annotated[int, Field(ge=0, le=1000)]
    told_apart: Annotated[float, Field(ge=0.5, le=1)]
    own_weight_spread_pct: Annotated[float, Field(ge=0, le=100)]
    trials_plots_most: Annotated[int, Field(ge=1, le=20_000)]
    trials_plots_least: Annotated[int, Field(ge=1, le=20_000)]


class SitingWeights(Section):
    """What sun and wind weigh against one another."""

    sun: Share
    wind: Share

    @model_validator(mode="after")
    def _sum_to_1(self) -> "SitingWeights":
        if abs(self.sun + self.wind - 1.0) > 1e-9:
            raise ValueError("weights of sun and wind that sum to 1")
        return self


class SunCounts(Section):
    """How much sun on the long faces counts against a bearing by season, and cool-season morning sun for it."""

    hot: Share
    between: Share
    cool: Share
    welcome_morning: Annotated[float, Field(ge=0, le=10)]


class AirWanted(Section):
    """Which wind counts, and whether it is to come in."""

    kind: Literal["breeze", "wanted", "unwanted"]
    slot: Literal["hot_afternoon", "hot_night", "cool_night", "year"]


class ZoneSiting(Section):
    """What the long axis of a house owes to sun and wind in one zone."""

    weights: SitingWeights
    sun: SunCounts
    air: AirWanted
    rows: Literal["air", "sun", "shade"]
    eaves: bool


class SitingSettings(Section):
    """The long axis, row spacing and eaves."""

    tie_cost: Annotated[float, Field(ge=0, le=0.1)]
    breeze_reach_least: Share
    wind_along_line_least: Share
    contour_from_pct: Annotated[float, Field(ge=0, le=100)]
    sun_hours: tuple[Annotated[float, Field(ge=0, le=24)], Annotated[float, Field(ge=0, le=24)]]
    eaves_height_m: Annotated[float, Field(gt=0, le=100)]
    shaded_wall_m: Annotated[float, Field(gt=0, le=100)]
    eave_most_m: Annotated[float, Field(gt=0, le=20)]
    gap_most_heights: Annotated[float, Field(gt=0, le=100)]
    air_gap_heights: Annotated[float, Field(ge=0, le=20)]
    zones: Mapping[str, ZoneSiting]
    own_zone: ZoneSiting


class SwingSettings(Section):
    """The low and the high end of inputs that are tried one at a time."""

    night: tuple[Annotated[float, Field(gt=0, le=5)], Annotated[float, Field(gt=0, le=5)]]
    breeze_tail_from_km: tuple[Positive, Positive]
    terrain_quantiles: tuple[Share, Share]


class Defaults(Section):
    """All sections of ``config/defaults.toml``."""

    readings: ReadingSettings
    terrain: TerrainSettings
    shore: ShoreSettings
    breeze: BreezeSettings
    wind: WindSettings
    sun: SunSettings
    cold_air: ColdAirSettings
    cold_layer: ColdLayerSettings
    cold_chance: ColdChanceSettings
    zones: ZoneSettings
    judgement: JudgementSettings
    swings: SwingSettings
    siting: SitingSettings


def config_folder() -> Path:
    """The folder of settings: inside the installed package, or beside it in a checkout."""
    inside = Path(str(resources.files("sitescreen") / "config"))
    return inside if inside.is_dir() else Path(__file__).resolve().parent.parent / "config"


@cache
def load_defaults() -> Defaults:
    """The shipped settings.

    Raises
    ------
    ConfigError
        If ``config/defaults.toml`` is missing or wrong; the message names file, key and allowed range.
    """
    return read_settings(config_folder() / "defaults.toml", Defaults)


def read_settings(path: Path, model: type[Model]) -> Model:
    """Read a TOML file into a checked model.

    Raises
    ------
    ConfigError
        If the file cannot be read, is not TOML, or holds a key or value that the model does not allow.
    """
    return checked(read_toml(path), model, path.name)


def read_toml(path: Path) -> dict[str, Any]:
    """The content of a TOML file.

    Raises
    ------
    ConfigError
        If the file cannot be read or is not TOML in UTF-8.
    """
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise ConfigError(
            f"the settings file {path} cannot be read ({error.strerror})",
            "a readable file is needed",
            "Check the path, or install sitescreen again if the file is its own",
        ) from error
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise ConfigError(
            f"{path.name} is not valid TOML: {error}",
            "a TOML file in UTF-8 is needed",
            "Correct that line; text stands in quotes, lists in [ ]",
        ) from error


def checked(values: Mapping[str, Any], model: type[Model], file_name: str) -> Model:
    """Check values against a model; the first fault becomes one line that names file, key and allowed range."""
    try:
        return model.model_validate(values)
    except ValidationError as error:
        raise _config_error(error, model, file_name) from error


def _config_error(error: ValidationError, model: type[BaseModel], file_name: str) -> ConfigError:
    faults = error.errors()
    # a misspelt key is also a missing one: its spelling is the thing to say
    fault = next((one for one in faults if one["type"] == "extra_forbidden"), faults[0])
    key = ".".join(str(part + 1) if isinstance(part, int) else part for part in fault["loc"])
    if fault["type"] == "extra_forbidden":
        known = _known_keys(model, fault["loc"])
        near = difflib.get_close_matches(str(fault["loc"][-1]), known, n=1)
        way_out = f"Perhaps {near[0]!r} was meant" if near else "Remove it, or correct its spelling"
        return ConfigError(f"{file_name} has the unknown key {key!r}", f"known keys are {', '.join(known)}", way_out)
    if fault["type"] == "missing":
        return ConfigError(f"{file_name} has no key {key!r}", "that key is needed", "Add it")
    if not key:
        return ConfigError(f"{file_name} does not hold together", f"{_in_words(fault)} is needed", "Correct that file")
    given = repr(fault["input"])
    given = given if len(given) <= 60 else given[:57] + "…"
    allowed = _allowed(model, fault["loc"]) or _in_words(fault)
    return ConfigError(f"{file_name} has {key} = {given}", f"{allowed} is needed", "Correct that value")


def _in_words(fault: Any) -> str:
    if fault["type"] == "value_error":
        return str(fault["ctx"]["error"])
    return str(fault["msg"]).replace("Input should be", "a value that is").rstrip(".")


def _known_keys(model: type[BaseModel], loc: tuple[int | str, ...]) -> list[str]:
    """Keys allowed beside the last part of a path into nested models."""
    owner = _owner(model, loc)
    return list(owner.model_fields) if owner else []


def _owner(annotation: Any, loc: tuple[int | str, ...]) -> type[BaseModel] | None:
    """The model that holds the last part of the path."""
    for part in loc[:-1]:
        if isinstance(annotation, type) and issubclass(annotation, BaseModel):
            field = annotation.model_fields.get(str(part))
            annotation = field.annotation if field else None
        elif inner := getattr(annotation, "__args__", ()):
            # a list's or a mapping's last argument is what it holds
            annotation = next((one for one in reversed(inner) if one not in (..., type(None))), None)
    return annotation if isinstance(annotation, type) and issubclass(annotation, BaseModel) else None


def _allowed(model: type[BaseModel], loc: tuple[int | str, ...]) -> str:
    """The range that a number may have, in words; "" where the path leads to something else."""
    owner = _owner(model, loc)
    field = owner.model_fields.get(str(loc[-1])) if owner else None
    low = high = None
    for rule in field.metadata if field else ():
        if isinstance(rule, annotated_types.Ge):
            low = f"from {rule.ge:g}"
        elif isinstance(rule, annotated_types.Gt):
            low = f"above {rule.gt:g}"
        elif isinstance(rule, annotated_types.Le):
            high = f"to {rule.le:g}"
    return f"a number {low} {high}" if low and high else ""
