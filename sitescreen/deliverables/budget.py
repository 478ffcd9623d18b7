"""How heavy the page may be, and which pictures go when it would be heavier."""

import json
from collections.abc import Sequence
from typing import Any

import numpy as np

PLOTS = (0, 40, 1_000, 10_000)
MEGABYTES = (3.0, 3.0, 4.0, 7.0)
"""What still opens at once and goes through a mail server: our choice. Linear between; 7 MB above."""

ORDER = ("own", "sun", "cold", "wind", "ground", "breeze")
"""The questions whose pictures go first. Before any question loses its last picture, all lose those of the zones with
fewest plots."""


def budget_bytes(plots: int) -> int:
    """The most that a page of so many plots may weigh."""
    return int(1e6 * np.interp(plots, PLOTS, MEGABYTES))


def fit_contours(finest_first: Sequence[list[dict[str, Any]]], room: int) -> tuple[list[dict[str, Any]], list[str]]:
    """The finest contours of cold air that fit: they are coarsened, and then go, before any picture does.

    Parameters
    ----------
    finest_first : sequence of list of dict
        As :func:`sitescreen.deliverables.cold_contours.cold_contours` gives them.
    room : int
        Bytes that are left.

    Returns
    -------
    contours : list of dict
        None of them where even the coarsest are too heavy.
    said : list of str
        A sentence where they are left out.
    """
    for contours in finest_first:
        if len(json.dumps(contours, separators=(",", ":"))) <= room or not contours:
            return contours, []
    said = ["The lines of cold-air depth are left out, to keep this page light enough to mail."]
    return [], said if finest_first else []


def fit_pictures(questions: list[dict[str, Any]], over: int) -> list[str]:
    """Take pictures away until so many bytes are saved.

    Parameters
    ----------
    questions : list of dict
        As the page has them; the pictures that go are set to None.
    over : int
        Bytes to be saved; nothing happens at 0 or less.

    Returns
    -------
    list of str
        A sentence for each picture that is left out.
    """
    by_name = {one["name"]: one["views"] for one in questions}
    extra = [(name, k) for name in ORDER for k in range(len(by_name.get(name, ())) - 1, 0, -1)]
    extra.sort(key=lambda at: -at[1])
    first = [(name, 0) for name in ORDER if by_name.get(name)]
    said = []
    for name, k in [*extra, *first]:
        if over <= 0:
            break
        view = by_name[name][k]
        over -= len(view["picture"] or "")
        view["picture"] = None
        said.append(f"The picture “{view['title']}” is left out, to keep this page light enough to mail.")
    return list(dict.fromkeys(said))
