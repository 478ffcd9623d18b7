"""What a screening hands over: the only place that writes results."""

from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import TYPE_CHECKING

from sitescreen.deliverables.folder import staged

if TYPE_CHECKING:
    from sitescreen.screening import Screening

__all__ = ["write_results"]


def write_results(screening: "Screening", folder: Path) -> None:
    """Write map, table, workbook, plots, shortlist for the phone, layers and record of a screening into a folder.

    Parameters
    ----------
    screening : Screening
    folder : Path
        Made if it is not there. Results of an earlier run stay whole until all new ones are written; files that are
        not ours stay as they are.

    Raises
    ------
    OutputError
        If the folder cannot be written to, or has no room left.
    """
    from sitescreen.deliverables.columns import columns_of
    from sitescreen.deliverables.map import write_map
    from sitescreen.deliverables.phone_files import write_phone_files
    from sitescreen.deliverables.plots_layer import write_plots
    from sitescreen.deliverables.record import NAME, outputs, write_record
    from sitescreen.deliverables.table import write_csv
    from sitescreen.deliverables.workbook import MOST_PLOTS, write_workbook

    table = screening.table
    columns = columns_of(table, screening.profiles)
    with staged(folder) as stage:
        write_csv(table, columns, stage / "ranking.csv")
        if len(table) <= MOST_PLOTS:
            write_workbook(table, columns, stage / "ranking.xlsx")
        write_phone_files(screening, stage)
        write_plots(table, columns, stage / "plots.gpkg", screening.patches)
        with ThreadPoolExecutor(max_workers=1) as beside:  # compressing layers leaves Python free to draw the map
            layered = beside.submit(_write_layers, screening, stage)
            write_map(screening, columns, stage / "map.html")
            layered.result()
        record = {
            **screening.record,
            "notes": [{"level": note.level, "where": note.where, "text": note.text} for note in screening.notes],
            "not_measured": screening.not_measured,
            "not_checked": screening.not_checked,
            "outputs": outputs(stage),
        }
        write_record(record, stage / NAME)


def _write_layers(screening: "Screening", stage: Path) -> None:
    from sitescreen.deliverables import layers

    if screening.brief.output.layers:
        (stage / layers.FOLDER).mkdir()
        layers.write_layers(screening.fields, stage / layers.FOLDER)
