import json

import numpy as np
import pandas as pd
import pytest
from astropy.table import Column, QTable, Table

from planner.base.errors import OutputError
from planner.export import as_rows, run_json, write_csv, write_ecsv


@pytest.fixture
def table():
    return Table(
        {
            "target": Column(["Elm", '=HYPERLINK("x")', "a, b"], description="name"),
            "lag_obs": Column([12.5, np.nan, 3.0], unit="d"),
            "seasons": [1, 2, 1],
            "kept": [True, False, True],
        }
    )


def test_ecsv_comes_back_with_units_and_words(table, tmp_path):
    write_ecsv(table, tmp_path / "t.ecsv")
    back = QTable.read(tmp_path / "t.ecsv")
    assert back["lag_obs"].unit == "d"
    assert back["target"].info.description == "name"
    assert list(back["target"]) == list(table["target"])
    assert len(pd.read_csv(tmp_path / "t.ecsv", comment="#")) == 3


def test_csv_names_units_and_starts_no_formula(table, tmp_path):
    write_csv(table, tmp_path / "t.csv")
    frame = pd.read_csv(tmp_path / "t.csv")
    assert list(frame.columns) == ["target", "lag_obs [d]", "seasons", "kept"]
    assert list(frame["target"]) == ["Elm", '\'=HYPERLINK("x")', "a, b"]


def test_rows_are_plain_json(table):
    rows = as_rows(table)
    assert json.loads(json.dumps(rows, allow_nan=False)) == rows
    assert rows[0] == {"target": "Elm", "lag_obs": 12.5, "seasons": 1, "kept": True}
    assert rows[1]["lag_obs"] is None


@pytest.mark.parametrize("write", [write_ecsv, write_csv])
def test_a_folder_that_is_not_there_is_said(table, tmp_path, write):
    with pytest.raises(OutputError, match="cannot be written"):
        write(table, tmp_path / "gone" / "t")


def test_the_run_record_is_readable_json(tmp_path):
    run_json({"seed": 7, "campaign": "Érable"}, tmp_path / "run.json")
    assert json.loads((tmp_path / "run.json").read_text(encoding="utf-8"))["campaign"] == "Érable"
