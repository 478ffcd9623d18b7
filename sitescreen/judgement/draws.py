"""Readings of the plots under drawn terrain errors and nights: what the data's uncertainty does to each reading."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.cold_chance import WiderRun
from sitescreen.climate.cold_kinds import deficit_k
from sitescreen.climate.cold_layer import ColdLayer, NightGround
from sitescreen.grid import Field
from sitescreen.judgement.cold_draws import ColdDraws, cold_draws, near_cold
from sitescreen.judgement.coverage import cover
from sitescreen.judgement.ground_draws import ground_draws
from sitescreen.settings import Defaults
from sitescreen.terrain.ground import Ground, open_to_cold_air


@dataclass(frozen=True)
class ReadingDraws:
    """Readings of all plots in each draw.

    Parameters
    ----------
    values : mapping of reading to array, shape (plots, draws)
        Named as the columns of the readings' table, in the order of its rows: numbers as float64 (``slope_deg``,
        ``rise_m``, ``buildable_share``, ``pond_depth_m``, ``cold_pool_depth_m``, ``cold_deficit_k``), words as object
        arrays (``cold_pool_kind``). Column d of every reading and every plot comes from the same realisation d of the
        terrain's error and of the night; a plot on which the first draws agree repeats its own cold air of those. NaN,
        or "" for words, where nothing was drawn for a plot: its reading in the run holds. A reading that is not named
        here does not vary.

    Notes
    -----
    No noise is ever added to a reading or a mark: in each draw the ground is drawn and read again. With a terrain error
    of 0 nothing is drawn and every reading is that of the run.
    """

    values: Mapping[str, NDArray[Any]]

    @property
    def count(self) -> int:
        """How many draws there are; 0 if nothing varies."""
        return next((array.shape[1] for array in self.values.values()), 0)

    def of(self, reading: str, run: NDArray[Any]) -> NDArray[Any]:
        """A reading in each draw, with the run's own value wherever nothing was drawn.

        Parameters
        ----------
        reading : str
        run : array, shape (plots,)
            The reading in the run itself.

        Returns
        -------
        array, shape (plots, draws)
            One column if there are no draws at all.
        """
        own = np.asarray(run)[:, None]
        drawn = self.values.get(reading)
        if drawn is None:
            return np.repeat(own, max(self.count, 1), axis=1)
        missing = drawn == "" if drawn.dtype == object else np.isnan(drawn)
        return np.where(missing, own, drawn)


NO_DRAWS = ReadingDraws({})
"""Nothing varies."""


@dataclass(frozen=True)
class DrawableBlock:
    """What a measured block keeps so that its plots can be drawn once they are judged.

    ``rows``: its plots, as rows of the table of plots. ``geometry``: GeoSeries of the same, in the block's coordinate
    system. ``wider``: the block's own run. ``error``: the terrain's vertical error and its range. [m]
    """

    rows: NDArray[np.int64]
    geometry: Any
    wider: WiderRun
    error: tuple[float, float]


def drawable_block(
    rows: NDArray[np.int64],
    geometry: Any,
    ground: Ground,
    night: NightGround,
    layer: ColdLayer,
    cover: Field | None,
    error: tuple[float, float],
    settings: Defaults,
) -> DrawableBlock:
    """Keep of a measured block what its draws need; nothing is copied but the filled ground."""
    grid = ground.elevation.grid
    filled = Field(ground.elevation.values + ground.hollows.depth_m.values, grid, "m", "height with hollows filled")
    outlets = open_to_cold_air(ground.water_kind, grid.cell_size_m, settings.terrain.smallest_outlet_km2)
    wider = WiderRun(ground.elevation, filled, outlets, ground.sky_view, cover, layer, night.wet)
    return DrawableBlock(rows, geometry, wider, error)


@dataclass(frozen=True)
class PlotNights:
    """How often cold air lies on each plot in the drawn nights; one row a plot.

    ``chance``: 0–1, of a deficit above the settings' limit; NaN where it cannot be told or was not asked. ``word``:
    likely, possible or none by that chance, "" where it cannot be told. ``cold``, ``of``: how many of how many nights;
    0 of 0 where no night was drawn, since nothing was near a limit. ``depth_low_m``, ``depth_high_m``: between what the
    depth lies in eight of ten cold nights; NaN where no night was cold.
    """

    chance: NDArray[np.float64]
    word: NDArray[np.object_]
    cold: NDArray[np.int64]
    of: NDArray[np.int64]
    depth_low_m: NDArray[np.float64]
    depth_high_m: NDArray[np.float64]

    def for_record(self) -> dict[str, int]:
        """What ``record.json`` keeps of it."""
        return {
            "plots_drawn": int(np.count_nonzero(self.of)),
            "plots_in_doubt": int(np.count_nonzero((self.cold > 0) & (self.cold < self.of))),
            "nights": int(self.of.sum()),
            **{word: int(np.count_nonzero(self.word == word)) for word in ("likely", "possible", "none")},
        }


def draws_for(
    wanted: NDArray[np.int64],
    blocks: Sequence[DrawableBlock],
    values: pd.DataFrame,
    strength_k: NDArray[np.float64],
    seed: int,
    settings: Defaults,
    tell: Callable[[str], None],
) -> tuple[ReadingDraws, PlotNights]:
    """Draw the ground and the nights of the plots that matter.

    Parameters
    ----------
    wanted : int array, shape (m,)
        Rows of the plots worth the time: those that cheap exclusions leave, and of very many the best.
    blocks : sequence of DrawableBlock
    values : DataFrame, n rows
        The run's readings, with ``slope_deg``, ``sky_view`` and ``cold_deficit_k``.
    strength_k : float64 array, shape (n,)
        ΔT of each plot's climate, see :func:`sitescreen.climate.cold_strength.plot_strength_k`. [K]
    seed : int
    settings : Defaults
    tell : function
        Told how far the work is, in words.

    Returns
    -------
    ReadingDraws, PlotNights
    """
    count, draws = len(values), settings.judgement.data_draws
    limit_k = settings.cold_chance.cold_from_k
    deficit = values["cold_deficit_k"].to_numpy(dtype=np.float64)
    sky = values["sky_view"].to_numpy(dtype=np.float64)
    told = _Count(
        np.where(np.isnan(deficit), np.nan, (deficit > limit_k).astype(np.float64)),
        np.zeros(count, dtype=np.int64),
        np.zeros(count, dtype=np.int64),
        np.full(count, np.nan),
        np.full(count, np.nan),
    )
    if not draws or not any(block.error[0] > 0 for block in blocks):
        return NO_DRAWS, told.nights(settings)
    # whether the air is cold where nobody drew is known, but not how sure that is
    told.chance[np.setdiff1d(np.arange(count), wanted)] = np.nan
    drawn: dict[str, NDArray[Any]] = {
        "cold_pool_kind": np.full((count, draws), "", dtype=object),
        **{name: np.full((count, draws), np.nan) for name in ("cold_pool_depth_m", "cold_deficit_k")},
    }
    for block in blocks:
        here, rows = np.isin(block.rows, wanted), block.rows
        coverage = cover(block.geometry, block.wider.elevation.grid)
        near = here & near_cold(values.iloc[rows], coverage, block.wider, block.error, settings)
        # what the run cannot tell, a window of it cannot either
        near &= ~np.isnan(strength_k[rows] * sky[rows] * deficit[rows])
        cold = cold_draws(
            block.wider, block.geometry, near, strength_k[rows], sky[rows], block.error, seed, settings, tell
        )
        cooler = deficit_k(strength_k[rows, None], cold.fill, sky[rows, None], cold.cap_k)
        drawn["cold_pool_kind"][rows], drawn["cold_pool_depth_m"][rows] = cold.kind, cold.depth_m
        drawn["cold_deficit_k"][rows] = cooler
        told.add(rows, cold, cooler, limit_k)
        ground = ground_draws(block.wider, block.geometry, here, block.error, seed, settings, tell)
        for name, array in ground.items():
            known = np.ones(len(rows)) if name not in values else values[name].to_numpy(dtype=np.float64)[rows]
            drawn.setdefault(name, np.full((count, draws), np.nan))[rows] = np.where(
                np.isnan(known)[:, None], np.nan, array
            )
    return ReadingDraws(drawn), told.nights(settings)


def terrain_in_words(error_m: float, error_range_m: float, settings: Defaults) -> str:
    """What the draws of the ground vary, in words."""
    rules = settings.cold_chance
    return (
        f"the terrain's error of {error_m:g} m over {error_range_m:g} m, and calm nights that draw "
        f"{rules.heat_least_w_m2:g} to {rules.heat_most_w_m2:g} W/m² from air that grows {rules.deficit_least_k:g} to "
        f"{rules.deficit_most_k:g} °C colder"
    )


def with_chance(values: pd.DataFrame, nights: PlotNights) -> pd.DataFrame:
    """The readings with how sure the cold air is; what may be a clearing among trees is never called likely."""
    trees = np.zeros(len(values)) if "may_be_trees" not in values else values["may_be_trees"].to_numpy(dtype=np.float64)
    word = np.where((np.nan_to_num(trees) > 0) & (nights.word == "likely"), "possible", nights.word)
    more = {
        "cold_pool_chance": nights.chance,
        "cold_pool_sure": word,
        "cold_nights": np.where(nights.of > 0, nights.cold, np.nan),
        "cold_nights_of": np.where(nights.of > 0, nights.of, np.nan),
        "cold_depth_low_m": nights.depth_low_m,
        "cold_depth_high_m": nights.depth_high_m,
    }
    return values.assign(**more)


@dataclass(frozen=True)
class _Count:
    """Counts the cold nights block by block; the arrays of :class:`PlotNights` in the making."""

    chance: NDArray[np.float64]
    cold: NDArray[np.int64]
    of: NDArray[np.int64]
    depth_low_m: NDArray[np.float64]
    depth_high_m: NDArray[np.float64]

    def add(self, rows: NDArray[np.int64], drawn: ColdDraws, cooler: NDArray[np.float64], limit_k: float) -> None:
        """Count a block's nights; the depth is that of the kind of cold air that its cold nights mostly have."""
        for here, row in enumerate(rows):
            own = slice(drawn.nights[here])
            known = np.isfinite(cooler[here, own])
            self.of[row] = np.count_nonzero(known)
            if not self.of[row]:
                continue
            cold = known & (cooler[here, own] > limit_k)
            self.cold[row] = np.count_nonzero(cold)
            self.chance[row] = self.cold[row] / self.of[row]
            if cold.any():
                kinds, often = np.unique(drawn.kind[here, own][cold].astype(str), return_counts=True)
                usual = cold & (drawn.kind[here, own] == kinds[often.argmax()])
                depth = drawn.depth_m[here, own][usual]
                self.depth_low_m[row], self.depth_high_m[row] = np.quantile(depth, (0.1, 0.9))

    def nights(self, settings: Defaults) -> PlotNights:
        rules = settings.cold_chance
        words = [np.isnan(self.chance), self.chance >= rules.likely, self.chance >= rules.possible]
        word = np.select(words, ["", "likely", "possible"], "none").astype(object)
        return PlotNights(self.chance, word, self.cold, self.of, self.depth_low_m, self.depth_high_m)
