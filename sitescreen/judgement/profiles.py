"""Zone profiles: what each climate zone wants of the ground, as checked data from ``config/zones/``."""

from collections.abc import Collection, Mapping
from functools import cached_property
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, Field, model_validator

from sitescreen.errors import ConfigError
from sitescreen.judgement.derived import DERIVED_READINGS
from sitescreen.judgement.sentences import check_template
from sitescreen.judgement.wind_slots import SLOT_OF, wind_column
from sitescreen.settings import Section, checked, config_folder, load_defaults, read_toml

Question = Literal["breeze", "wind", "cold", "sun", "ground", "own"]

Mark = Annotated[float, Field(ge=0, le=100)]
Text = Annotated[str, Field(min_length=1)]

MEASURED_READINGS = (
    "elevation_m",
    "slope_deg",
    "buildable_share",
    "rise_m",
    "shore_distance_km",
    "breeze_reach",
    "ventilation",
    "ridge_exposure",
    "sheltered_fraction",
    "worst_sector_exposure",
    "slow_wind_share",
    "driving_rain",
    "cold_pool_depth_m",
    "cold_deficit_k",
    "sky_view",
    "sun_cool_morning_h",
    "morning_sun_share",
    "sun_year_h",
    "west_load_kwh_m2",
    "cool_gain_kwh_m2",
    "night_flow_speed_m_s",
    "still_air",
    "pond_depth_m",
    "area_ha",
)
"""Readings of this version that a criterion may look at, beside those derived from them."""


KIND_READINGS: Mapping[str, tuple[str, ...]] = {
    "cold_pool_kind": ("none", "closed", "leaky", "moving"),
    "shore_kind": ("sea", "lake"),
}
"""Readings that are words, and the words that a criterion must give a mark to; any other word is unknown."""


def _rises(curve: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    if any(later[0] <= earlier[0] for earlier, later in pairwise(curve)):
        raise ValueError("a curve whose first numbers rise from point to point")
    return curve


RESERVED_NAMES = ("low", "high", "in_zone", "in_zone_2")
"""A criterion's column is ``mark_<name>``; these are taken by columns of the overall mark."""


def _not_reserved(name: str) -> str:
    if name in RESERVED_NAMES:
        raise ValueError(f"a name other than {', '.join(RESERVED_NAMES)}, which the overall mark's columns use,")
    return name


class Criterion(Section):
    """One thing that a zone wants, with its curve from reading to mark.

    Parameters
    ----------
    name : str
        The column ``mark_<name>``; unique in a profile, with one meaning in all profiles.
    reading : str
        The reading that it looks at.
    slot : str, optional
        For readings of the wind: the part of the year whose wind counts, "hot_afternoon", "hot_night", "cool_night" or
        "year". Left out, the one that the reading has in the table of plots.
    question : str
        The group that it belongs to.
    title, unit : str
        In words, for a client.
    weight : float
        Its part in the overall mark, relative to the others.
    weight_spread_pct : float
        How far experts would disagree about the weight, ± %.
    curve : points (value, mark)
        Linear between its points and level beyond them. Fixed: never stretched over the candidates.
    kinds : mapping of word to mark
        In place of a curve, for readings that are words, such as ``cold_pool_kind``: a mark for each of its kinds.
    ordinary_mark : float
        What an ordinary plot of the zone gets; reasons speak of what differs from it.
    source : str
        Where curve and weight come from, or that they come from nowhere.
    says : str
        A sentence for the reasons, for criteria that ``config/reasons.toml`` does not know.
    """

    name: Annotated[str, Field(pattern=r"^[a-z][a-z0-9_]*$"), AfterValidator(_not_reserved)]
    reading: Text
    slot: Literal["hot_afternoon", "hot_night", "cool_night", "year"] | None = None
    question: Question
    title: Text
    unit: str = "1"
    weight: Annotated[float, Field(gt=0, le=1000)]
    weight_spread_pct: Annotated[float, Field(ge=0, le=100)] = 30.0
    curve: Annotated[tuple[tuple[float, Mark], ...], Field(min_length=2, max_length=40), AfterValidator(_rises)]
    kinds: Mapping[str, Mark] = {}
    ordinary_mark: Mark = 60.0
    source: Text
    says: Annotated[str, AfterValidator(check_template)] = ""

    @model_validator(mode="before")
    @classmethod
    def _kinds_are_points_of_a_curve(cls, given: Any) -> Any:
        """The kinds' marks as a curve over the places of their words."""
        kinds = given.get("kinds") if isinstance(given, Mapping) else None
        if not isinstance(kinds, Mapping) or not kinds:
            return given
        points = [[float(place), mark] for place, mark in enumerate(kinds.values())]
        if "curve" in given and [[float(x), y] for x, y in given["curve"]] != points:
            raise ValueError("either a curve or kinds")
        return {**given, "curve": points}

    @model_validator(mode="after")
    def _kinds_fit_the_reading(self) -> "Criterion":
        wanted = KIND_READINGS.get(self.reading, ())
        if set(self.kinds) != set(wanted):
            each = f"kinds with a mark for each of {', '.join(wanted)}"
            raise ValueError(each if wanted else f"a curve, since {self.reading} is a number,")
        return self

    @model_validator(mode="after")
    def _only_the_wind_has_slots(self) -> "Criterion":
        if self.slot is not None and self.reading not in SLOT_OF:
            raise ValueError(f"a slot only with one of the readings {', '.join(SLOT_OF)}")
        return self

    @property
    def column(self) -> str:
        """The column of the plots' table that it looks at: its reading, in its slot."""
        return self.reading if self.slot is None else wind_column(self.reading, self.slot)

    @property
    def worst_mark(self) -> float:
        """The lowest mark that any reading could earn."""
        return min(mark for _, mark in self.curve)

    @property
    def best_mark(self) -> float:
        """The highest mark that any reading could earn."""
        return max(mark for _, mark in self.curve)

    def is_among(self, names: Collection[str]) -> bool:
        """Whether a list names this criterion, the column it looks at or its question."""
        return not {self.name, self.column, self.question}.isdisjoint(names)

    def curve_in_words(self) -> str:
        """The points as ``0.3 → 0, 1 → 70``, with the unit."""
        if self.kinds:
            return ", ".join(f"{kind} → {mark:g}" for kind, mark in self.kinds.items())
        points = ", ".join(f"{value:g} → {mark:g}" for value, mark in self.curve)
        return f"{points} ({self.unit})" if self.unit not in ("", "1") else points


class ZoneProfile(Section):
    """What one climate zone wants.

    Parameters
    ----------
    zone : str
        Its name in tables and briefs.
    title : str
        Its name in words.
    wants : str
        One plain sentence.
    criteria : tuple of Criterion
    """

    zone: Annotated[str, Field(pattern=r"^[a-z][a-z0-9_]*$")]
    title: Text
    wants: Text
    criteria: Annotated[tuple[Criterion, ...], Field(min_length=1)]

    @model_validator(mode="after")
    def _names_are_unique(self) -> "ZoneProfile":
        names = [criterion.name for criterion in self.criteria]
        if len(set(names)) < len(names):
            raise ValueError("a name of its own for each criterion")
        return self

    @cached_property
    def by_name(self) -> Mapping[str, Criterion]:
        """The criteria by name."""
        return {criterion.name: criterion for criterion in self.criteria}


def wind_slots(profiles: Mapping[str, ZoneProfile]) -> frozenset[tuple[str, str]]:
    """The readings of the wind that profiles ask for in another slot than their own, as (reading, slot)."""
    return frozenset(
        (one.reading, one.slot)
        for profile in profiles.values()
        for one in profile.criteria
        if one.slot is not None and one.column != one.reading
    )


def load_profiles(extra_folder: Path | None = None, own_readings: tuple[str, ...] = ()) -> dict[str, ZoneProfile]:
    """The zone profiles, in the order in which zones are always listed.

    Parameters
    ----------
    extra_folder : Path, optional
        A planner's own ``*.toml`` profiles. One that names a known zone replaces its profile; others are added.
    own_readings : tuple of str
        Names of further readings that criteria may look at.

    Returns
    -------
    dict of zone name to ZoneProfile

    Raises
    ------
    ConfigError
        If a file is wrong; the message names file, key and allowed range.
    """
    readings = (*MEASURED_READINGS, *KIND_READINGS, *DERIVED_READINGS, *own_readings)
    shipped = _read_folder(config_folder() / "zones", readings)
    profiles = {zone: shipped[zone] for zone in load_defaults().cold_air.strength_k if zone in shipped}
    profiles |= shipped
    if extra_folder is not None:
        own = _read_folder(Path(extra_folder), readings)
        if not own:
            raise ConfigError(
                f"the folder of profiles {extra_folder} holds no .toml file",
                "at least one zone profile is needed there",
                "Correct [judge] profiles in the brief, or leave it out",
            )
        profiles |= own
    return profiles


def _read_folder(folder: Path, readings: tuple[str, ...]) -> dict[str, ZoneProfile]:
    if not folder.is_dir():
        raise ConfigError(f"there is no folder {folder}", "a folder of zone profiles is needed", "Check the path")
    profiles: dict[str, ZoneProfile] = {}
    for path in sorted(folder.glob("*.toml")):
        profile = checked(read_toml(path), ZoneProfile, path.name)
        if profile.zone in profiles:
            raise ConfigError(
                f"{path.name} is a second profile for the zone {profile.zone!r}",
                "one profile a zone is needed",
                "Remove one of them, or give it another zone name",
            )
        for criterion in profile.criteria:
            if criterion.reading not in readings:
                raise ConfigError(
                    f"{path.name} has the criterion {criterion.name!r} look at {criterion.reading!r}",
                    f"one of the readings {', '.join(readings)} is needed",
                    "Correct its reading, or leave the criterion out",
                )
        profiles[profile.zone] = profile
    return profiles
