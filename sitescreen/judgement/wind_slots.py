"""Slots of the wind table that a profile's criteria may name: which there are, and what the reading is called then."""

SLOTS = ("hot_afternoon", "hot_night", "cool_night", "year")
"""As :data:`sitescreen.inputs.wind.SLOTS`, without loading what reads tables; a test holds the two alike."""

SLOT_OF = {
    "ventilation": "hot_afternoon",
    "ridge_exposure": "year",
    "worst_sector_exposure": "year",
    "sheltered_fraction": "year",
    "slow_wind_share": "year",
}
"""The wind's readings that have a slot, and the one that they have unless a criterion names another."""

IN_WORDS = {
    "hot_afternoon": "hot-afternoon winds",
    "hot_night": "hot-night winds",
    "cool_night": "cool-night winds",
    "year": "winds",
}
"""How sentences name the winds of a slot."""


def wind_column(reading: str, slot: str | None) -> str:
    """The column of a reading in a slot: its own name in its own slot, ``ventilation_hot_night`` in another."""
    return reading if slot is None or slot == SLOT_OF[reading] else f"{reading}_{slot}"


def slot_of_column(column: str) -> tuple[str, str] | None:
    """Reading and slot of a column that :func:`wind_column` names for another slot than its own; None otherwise."""
    found = [(reading, slot) for reading in SLOT_OF for slot in SLOTS if column == f"{reading}_{slot}"]
    return found[0] if found else None
