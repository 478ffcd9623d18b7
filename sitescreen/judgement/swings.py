"""What would change the answer: one input at a time at its low and at its high end, and what the first places do."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.breeze import sea_reach
from sitescreen.climate.roses import RoseSums, roses_at
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.climate.zones import ZoneShares
from sitescreen.inputs.wind import WindTable
from sitescreen.judgement.cautions import CautionRule
from sitescreen.judgement.certainty import listed, ranks_of
from sitescreen.judgement.drawn_marks import drawn_marks
from sitescreen.judgement.draws import ReadingDraws
from sitescreen.judgement.other_weights import low_marks, run_weights
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.judgement.wind_readings import wind_readings
from sitescreen.judgement.wind_slots import wind_column
from sitescreen.notes import Note
from sitescreen.settings import BreezeSettings, JudgementSettings, SwingSettings, WindSettings

FloatArray = NDArray[np.float64]


class Swing(NamedTuple):
    """One input at one end.

    ``input``: its name; ``says``: what is assumed, after "If …"; ``readings``: the readings it changes, each a float64
    array of all plots, NaN where the run's own holds.
    """

    input: str
    says: str
    readings: Mapping[str, FloatArray]


def _called(plots: Sequence[str]) -> str:
    return f"plot {plots[0]}" if len(plots) == 1 else f"plots {listed(plots)}"


@dataclass(frozen=True)
class Swung:
    """What the first places do if one input is at one end.

    Parameters
    ----------
    swing : Swing
    shortlist : int
    first : tuple of str
        Who is then first; several that share the place.
    is_first_new : bool
        Whether they are others than in the run.
    entered, left : tuple of str
        Plots that come onto the first k, and that leave it.
    mean_change : float
        Of the marks that ranks go by. [points]
    """

    swing: Swing
    shortlist: int
    first: tuple[str, ...]
    is_first_new: bool
    entered: tuple[str, ...]
    left: tuple[str, ...]
    mean_change: float

    @property
    def moves(self) -> bool:
        """Whether the first place or the shortlist changes."""
        return self.is_first_new or bool(self.entered) or bool(self.left)

    def sentence(self) -> str:
        """In plain words."""
        said = []
        if self.is_first_new:
            said.append(f"{_called(self.first)} would be first")
        if self.entered:
            said.append(f"{_called(self.entered)} would come onto the first {self.shortlist}")
        if self.left:
            said.append(f"{_called(self.left)} would leave the first {self.shortlist}")
        if not said:
            said.append(f"the first {self.shortlist} would stay the same plots")
        return f"If {self.swing.says}, {listed(said)}."

    def for_record(self) -> dict[str, Any]:
        """What ``record.json`` keeps of it."""
        return {
            "input": self.swing.input,
            "if": self.swing.says,
            "first": list(self.first),
            "entered": list(self.entered),
            "left": list(self.left),
            "mean_change_of_marks": round(self.mean_change, 2),
            "says": self.sentence(),
        }


def night_swings(readings: pd.DataFrame, settings: SwingSettings) -> list[Swing]:
    """Calm clear nights that cool less, and more."""
    if "cold_deficit_k" not in readings:
        return []
    deficit = readings["cold_deficit_k"].to_numpy(dtype=np.float64)
    return [
        Swing(
            "night",
            f"cold air on still nights were {_colder(factor)}",
            {"cold_deficit_k": deficit * factor},
        )
        for factor in settings.night
    ]


def _colder(factor: float) -> str:
    return f"{100 * (factor - 1):.0f} % colder" if factor > 1.0 else f"{100 * (1 - factor):.0f} % less cold"


def breeze_swings(readings: pd.DataFrame, breeze: BreezeSettings, settings: SwingSettings) -> list[Swing]:
    """A breeze that fades from nearer the shore, and from farther inland; screens and widths of lakes stay."""
    if not {"breeze_reach", "shore_distance_km"} <= set(readings):
        return []
    reach, km = (readings[name].to_numpy(dtype=np.float64) for name in ("breeze_reach", "shore_distance_km"))
    if np.isnan(reach).all():
        return []
    out = []
    for tail_from_km in settings.breeze_tail_from_km:
        other = breeze.model_copy(update={"tail_from_km": tail_from_km})
        with np.errstate(invalid="ignore", divide="ignore"):
            changed = reach * sea_reach(km, other) / sea_reach(km, breeze)
        says = f"the breeze began to fade {tail_from_km:g} km inland instead of {breeze.tail_from_km:g} km"
        out.append(Swing("breeze", says, {"breeze_reach": np.minimum(changed, 1.0)}))
    return out


def rose_swings(
    winds: SectorWinds,
    table: WindTable,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    wanted: Sequence[tuple[str, str]],
    settings: WindSettings,
) -> list[Swing]:
    """All winds from one sector further to either side; none where no wind is given, since all sides are then alike.

    Parameters
    ----------
    winds : SectorWinds, n plots
    table : WindTable
    lon_deg, lat_deg : float64 arrays, shape (n,)
    wanted : sequence of (reading, slot)
    settings : WindSettings
    """
    if table.assumed or not wanted:
        return []
    out = []
    for step, side in ((-1, "anticlockwise"), (1, "clockwise")):
        changed = {}
        for reading, slot in wanted:
            sums = roses_at(table, slot, lon_deg, lat_deg, settings.sectors)
            turned = RoseSums(*(np.roll(part, step, axis=-1) for part in (sums.time, sums.flow, sums.power)))
            changed[wind_column(reading, slot)] = getattr(wind_readings(winds, turned, settings), reading)
        says = f"all winds came from {360.0 / settings.sectors:g}° further {side}"
        out.append(Swing("rose", says, changed))
    return out


def terrain_swings(draws: ReadingDraws, columns: Sequence[str], settings: SwingSettings) -> list[Swing]:
    """The ground's readings at the low and at the high end of their draws, all of them at once."""
    numbers = {
        name: draws.values[name] for name in columns if name in draws.values and draws.values[name].dtype != object
    }
    if not numbers:
        return []
    out = []
    for share, end in zip(settings.terrain_quantiles, ("low", "high"), strict=True):
        place = min(int(share * draws.count), draws.count - 1)
        # NaN is sorted last, and a plot that was not drawn has nothing else
        ends = {name: np.sort(values, axis=1)[:, place].astype(np.float64) for name, values in numbers.items()}
        says = f"the terrain model's error put every reading of the ground at its {end} end"
        out.append(Swing("terrain", says, ends))
    return out


def swung(
    swings: Sequence[Swing],
    judged: Judged,
    zones: ZoneShares,
    profiles: Mapping[str, ZoneProfile],
    rules: Sequence[CautionRule],
    shortlist: int,
    settings: JudgementSettings,
) -> tuple[Swung, ...]:
    """Judge the ranked plots again for each swing, one at a time.

    Parameters
    ----------
    swings : sequence of Swing
        Of all plots.
    judged : Judged
    zones : ZoneShares
    profiles : mapping of zone to ZoneProfile
    rules : sequence of CautionRule
    shortlist : int
        k.
    settings : JudgementSettings
    """
    rows = np.flatnonzero(judged.table["rank"].notna().to_numpy())
    if not len(rows) or not swings:
        return ()
    names = {name for one in swings for name in one.readings}
    nothing = np.full(len(judged.table), np.nan)
    draws = ReadingDraws(
        {name: np.stack([one.readings.get(name, nothing) for one in swings], axis=1) for name in sorted(names)}
    )
    data = drawn_marks(judged, zones, profiles, rules, draws, rows)
    marks = low_marks(judged, zones, rows, run_weights(judged, len(swings)), data, np.arange(len(swings)))
    ranks = ranks_of(np.rint(marks / settings.mark_tie))
    now = judged.table["rank"].to_numpy(dtype=np.float64)[rows]
    run_marks = judged.table["mark_low"].to_numpy(dtype=np.float64)[rows]
    plots = [str(plot) for plot in judged.table.index[rows]]
    out = []
    for one, rank, mark in zip(swings, ranks, marks, strict=True):
        in_it = np.isfinite(mark)

        def those(which: NDArray[np.bool_]) -> tuple[str, ...]:
            return tuple(plots[k] for k in np.flatnonzero(which))

        best = (rank == 1) & in_it
        listed_now, listed_then = now <= shortlist, (rank <= shortlist) & in_it
        out.append(
            Swung(
                one,
                shortlist,
                those(best),
                not np.array_equal(best, now == 1),
                those(listed_then & ~listed_now),
                those(listed_now & ~listed_then),
                float(np.abs(mark - run_marks)[in_it].mean()) if in_it.any() else 0.0,
            )
        )
    return tuple(out)


def swing_notes(found: Sequence[Swung]) -> tuple[Note, ...]:
    """The swings in plain words, for everybody to read: those that move something one by one, the others together."""
    notes = [Note("info", "judgement", one.sentence()) for one in found if one.moves]
    still = [one for one in found if not one.moves]
    if still:
        ifs = "; if ".join(one.swing.says for one in still)
        notes.append(
            Note(
                "info",
                "judgement",
                f"Tried one at a time, the first {still[0].shortlist} stay the same plots if {ifs}.",
            )
        )
    return tuple(notes)
