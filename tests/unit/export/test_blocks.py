from dataclasses import replace

import pandas as pd
import pytest
from astropy.coordinates import Angle
from astropy.table import QTable

from planner.export import blocks_table, write_csv, write_ecsv
from planner.export.sexagesimal import dec_text, ra_text
from planner.model.observatory import Spectrograph


def test_one_row_for_each_target_stream_and_telescope(month):
    table = blocks_table(month.campaign, month.requests, month.visits)
    keys = list(zip(table["target"], table["stream"], table["telescope"], strict=True))
    assert sorted(keys) == sorted(
        [(t, s, p) for t in ("One", "Two") for s, p in (("line", "Big"), ("continuum", "Small"))]
    )
    assert table["visits"].sum() == len(month.visits)
    hours = sum(v.end_mjd - v.start_mjd for v in month.visits) * 24
    assert table["hours"].sum() == pytest.approx(hours, abs=0.002)
    line = table[table["stream"] == "line"]
    assert set(line["cadence"]) == {3.0}
    assert set(line["tolerance"]) == {1.5}
    assert set(line["exposure"]) == {1200.0}
    assert (line["signal_to_noise"] > 20).all()
    assert set(table["position_angle"][table["stream"] == "continuum"]) == {"any"}


def test_visits_lie_in_the_seasons_told(month):
    table = blocks_table(month.campaign, month.requests, month.visits)
    rows = month.schedule.to_pandas()
    for block in table:
        runs = [run.split(" to ") for run in block["seasons"].split("; ")]
        mine = rows[(rows["target"] == block["target"]) & (rows["stream"] == block["stream"])]
        assert len(mine) == block["visits"] > 0
        assert all(any(a <= n <= b for a, b in runs) for n in mine["night"])


@pytest.mark.parametrize(
    ("fibre", "angle_deg", "words"),
    [(False, None, "parallactic"), (False, 45.0, "45 deg"), (True, None, "any")],
)
def test_the_slit_is_turned_as_the_spectrograph_says(month, fibre, angle_deg, words):
    slit = Spectrograph(0.2, 1.3, 5.0, 2.0, fibre, angle_deg, 5000.0, 0.4, 4.0, 0.0)
    line = month.campaign.line
    feeds = (replace(line.feeds[0], instrument=slit, exposures=3),)
    campaign = replace(month.campaign, line=replace(line, feeds=feeds))
    table = blocks_table(campaign, month.requests, month.visits)
    of_line = table[table["stream"] == "line"]
    assert set(of_line["position_angle"]) == {words}
    assert set(of_line["frames"]) == {3}
    assert set(of_line["frame_exposure"]) == {400.0}


def test_files_come_back_and_start_no_formula(hostile, tmp_path):
    table = blocks_table(hostile.campaign, hostile.requests, hostile.visits)
    write_ecsv(table, tmp_path / "b.ecsv")
    write_csv(table, tmp_path / "b.csv")
    back = QTable.read(tmp_path / "b.ecsv")
    assert list(back["target"]) == list(table["target"])
    assert back["exposure"].unit == "s"
    frame = pd.read_csv(tmp_path / "b.csv", dtype={"dec": str, "target": str})
    for column in ("target", "dec", "seasons", "position_angle"):
        assert not frame[column].str.startswith(("=", "+", "-", "@", "\t", "\r")).any()
    assert list(frame["target"].str.lstrip("'")) == list(table["target"])


def test_a_plan_without_visits_has_an_empty_table(month, tmp_path):
    table = blocks_table(month.campaign, (), ())
    write_ecsv(table, tmp_path / "b.ecsv")
    assert len(QTable.read(tmp_path / "b.ecsv")) == 0


@pytest.mark.parametrize("degrees", [0.0, 1e-7, 15.0, 79.05, 83.6331, 187.277917, 359.9999999])
def test_right_ascension_reads_back(degrees):
    back = Angle(ra_text(degrees), unit="hourangle").deg
    assert abs((back - degrees + 180) % 360 - 180) <= 0.005 * 15 / 3600 * 1.001


@pytest.mark.parametrize("degrees", [0.0, -0.0001, -0.5, 12.345678, -45.9999999, 90.0, -90.0])
def test_declination_reads_back(degrees):
    text = dec_text(degrees)
    assert Angle(text, unit="deg").deg == pytest.approx(degrees, abs=0.05 / 3600 * 1.001)
    assert text[0] == ("-" if degrees < 0 else "+")


def test_seconds_carry():
    assert ra_text(359.99999999) == "00:00:00.00"
    assert ra_text(14.99999999) == "01:00:00.00"
    assert dec_text(-29.99999999) == "-30:00:00.0"
