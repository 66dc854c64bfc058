"""Files that other programs read: ECSV and CSV tables, and the record of the run.

In: a plan. Out: files in one folder, each written whole or not at all. Tables are astropy ECSV with
units and descriptions, readable by ``astropy.table.QTable.read`` and by pandas; the schedule is
also plain CSV, JSON, a calendar, printable night sheets and observing blocks. Times are UTC.
"""

from planner.export.advice_tables import (
    causes_table,
    helps_table,
    sensitivity_table,
    subsets_table,
)
from planner.export.blocks import blocks_table
from planner.export.calendar import calendar
from planner.export.depth_tables import epochs_table, opinions_table, time_table
from planner.export.night_sheet import night_sheets
from planner.export.run_record import run_json
from planner.export.schedule_json import schedule_json
from planner.export.standards import STANDARDS, Match, Standard, standards_for
from planner.export.tables import (
    forecast_table,
    lags_table,
    recommendation_table,
    schedule_table,
    scores_table,
    seasons_table,
    windows_table,
)
from planner.export.write import as_rows, write_csv, write_ecsv

__all__ = [
    "STANDARDS",
    "Match",
    "Standard",
    "as_rows",
    "blocks_table",
    "calendar",
    "causes_table",
    "epochs_table",
    "forecast_table",
    "helps_table",
    "lags_table",
    "night_sheets",
    "opinions_table",
    "recommendation_table",
    "run_json",
    "schedule_json",
    "schedule_table",
    "scores_table",
    "seasons_table",
    "sensitivity_table",
    "standards_for",
    "subsets_table",
    "time_table",
    "windows_table",
    "write_csv",
    "write_ecsv",
]
