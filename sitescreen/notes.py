"""What a run has to say beside its numbers: assumptions, repairs, warnings."""

from dataclasses import dataclass
from typing import Literal

Level = Literal["info", "assumed", "warning"]


@dataclass(frozen=True)
class Note:
    """One sentence for the record, the terminal and the map's page of trust.

    Parameters
    ----------
    level : "info", "assumed" or "warning"
        ``assumed`` marks a default that stands in for an input nobody gave.
    where : str
        The input or stage it speaks of: "terrain", "shore", "plots", "wind", "climate", "sky", "cover", "judgement".
    text : str
        The sentence, in plain English, with figures and units.
    """

    level: Level
    where: str
    text: str
