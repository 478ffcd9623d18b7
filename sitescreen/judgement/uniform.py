"""Even numbers for draws, each stream known by the seed and a word."""

import hashlib

import numpy as np
from numpy.typing import NDArray


def uniform(seed: int, about: str, count: int) -> NDArray[np.float64]:
    """Even numbers in (0, 1), the same for the same seed and word whatever else is drawn.

    Parameters
    ----------
    seed : int
    about : str
        What is drawn, such as a criterion's name: the key of a counter-based generator (Philox).
    count : int

    Returns
    -------
    float64 array, shape (count,)
    """
    key = int.from_bytes(hashlib.sha256(f"{seed}/{about}".encode()).digest()[:16], "big")
    # the generator's raw words, since how numpy makes floats of them might change
    words = np.random.Philox(key=key).random_raw(count)
    return np.asarray(((words >> np.uint64(12)).astype(np.float64) + 0.5) * 2.0**-52)
