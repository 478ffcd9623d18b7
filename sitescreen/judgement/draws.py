"""Readings of the plots under drawn terrain errors and nights: what the data's uncertainty does to each reading."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class ReadingDraws:
    """Readings of all plots in each draw.

    Parameters
    ----------
    values : mapping of reading to array, shape (plots, draws)
        Named as the columns of the readings' table, in the order of its rows: numbers as float64 (``slope_deg``,
        ``rise_m``, ``buildable_share``, ``pond_depth_m``, ``cold_pool_depth_m``, ``cold_excess_m``,
        ``cold_deficit_k``), words as object arrays (``cold_pool_kind``). Column d of every reading and every plot comes
        from the same realisation d of the terrain's error and of the night. NaN, or "" for words, where nothing was
        drawn for a plot: its reading in the run holds. A reading that is not named here does not vary.

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
