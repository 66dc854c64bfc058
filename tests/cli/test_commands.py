"""Whole commands: what they print, what they write, how they end."""

import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from astropy.table import QTable, Table

from planner.cli.main import main

FILE = Path(__file__).with_name("small.yaml").read_text()

TABLES = (
    "lags", "windows", "seasons", "epochs", "scores", "recommendation", "opinions", "schedule",
    "time", "limits", "helps", "sensitivity", "lists", "blocks",
)  # fmt: skip


@pytest.fixture
def file(tmp_path):
    path = tmp_path / "small.yaml"
    path.write_text(FILE)
    return path


def run(*words, **options):
    """Run the command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "planner", *map(str, words)],
        capture_output=True, text=True, timeout=300, check=False, **options,
    )  # fmt: skip


@pytest.fixture(scope="module")
def planned(tmp_path_factory):
    """One whole plan, made in this process with one worker."""
    folder = tmp_path_factory.mktemp("planned")
    (folder / "small.yaml").write_text(FILE)
    out = folder / "plan"
    status = main(
        ["plan", str(folder / "small.yaml"), "--out", str(out), "--workers", "1", "--quiet"]
    )
    assert status == 0
    return out


def contents(folder):
    return {
        p.relative_to(folder).as_posix(): p.read_bytes()
        for p in sorted(folder.rglob("*"))
        if p.is_file() and not p.name.startswith(".")
    }


@pytest.mark.slow
def test_a_plan_holds_every_file_of_the_contract(planned):
    names = set(contents(planned))
    assert {f"{name}.ecsv" for name in TABLES} <= names
    assert {"report.html", "run.json", "schedule.csv", "schedule.ics", "schedule.json"} <= names
    assert {"blocks.csv", "nights.html"} <= names
    assert "figures/success-One.png" in names
    assert "figures/example-Two.png" in names
    assert "figures/visibility-Ridge.png" in names


@pytest.mark.slow
def test_tables_open_in_astropy_and_pandas(planned):
    for name in TABLES:
        table = QTable.read(planned / f"{name}.ecsv")
        frame = pd.read_csv(planned / f"{name}.ecsv", comment="#")
        assert list(frame.columns) == table.colnames
        assert len(frame) == len(table) > 0
        assert all(c.info.description for c in table.itercols())
    lags = QTable.read(planned / "lags.ecsv")
    assert lags["lag_obs"].unit == "d"
    assert (lags["lag_obs_lo"] < lags["lag_obs"]).all()


@pytest.mark.slow
def test_the_plan_says_sane_things(planned):
    advice = Table.read(planned / "recommendation.ecsv")
    rows = {row["target"]: row for row in advice}
    assert rows["One"]["success"] > 0.5
    assert rows["North"]["decision"] == "leave out"
    assert rows["North"]["why"] == "never observable within the limits"
    scores = Table.read(planned / "scores.ecsv")
    assert len(scores) == 3 * 8
    tried = scores[scores["trials"] > 0]
    assert set(tried["target"]) == {"One", "=Two"}
    assert set(tried["seasons"]) == {1}, "the campaign holds one season of each"
    assert ((scores["success_lo"] <= scores["success"]) | (scores["trials"] == 0)).all()
    schedule = Table.read(planned / "schedule.ecsv")
    assert set(schedule["target"]) == {"One", "=Two"}
    assert (schedule["airmass"] <= 2.01).all()
    assert (schedule["start_utc"] < schedule["end_utc"]).all()


@pytest.mark.slow
def test_scheduled_visits_stay_in_windows_and_apart(planned):
    schedule = Table.read(planned / "schedule.ecsv").to_pandas()
    windows = Table.read(planned / "windows.ecsv").to_pandas()
    merged = schedule.merge(windows, on=["target", "night"], suffixes=("", "_w"))
    inside = (merged["start_utc"] >= merged["start_utc_w"]) & (
        merged["end_utc"] <= merged["end_utc_w"]
    )
    assert inside.groupby([merged["target"], merged["stream"], merged["night"]]).any().all()
    assert len(merged.groupby(["target", "stream", "night"])) == len(schedule)
    for _, of_telescope in schedule.groupby("telescope"):
        visits = of_telescope.sort_values("start_utc")
        assert (visits["start_utc"].iloc[1:].values >= visits["end_utc"].iloc[:-1].values).all()


@pytest.mark.slow
def test_hours_and_nights_add_up_to_the_minute(planned):
    schedule = Table.read(planned / "schedule.ecsv").to_pandas()
    advice = Table.read(planned / "recommendation.ecsv")
    spent = Table.read(planned / "time.ecsv").to_pandas().set_index(["telescope", "stream"])
    minute = 1 / 60
    length = pd.to_datetime(schedule["end_utc"]) - pd.to_datetime(schedule["start_utc"])
    schedule["hours"] = length.dt.total_seconds() / 3600
    for key, visits in schedule.groupby(["telescope", "stream"]):
        row = spent.loc[key]
        assert row["visits"] == len(visits)
        assert row["nights"] == visits["night"].nunique()
        assert row["visit_hours"] == pytest.approx(visits["hours"].sum(), abs=minute)
        assert row["shutter_hours"] == pytest.approx(visits["exposure"].sum() / 3600, abs=minute)
        standards = row["nights"] * (0.25 if key[1] == "line" else 0.0)
        assert row["standards_hours"] == pytest.approx(standards, abs=minute)
        parts = row["visit_hours"] + row["standards_hours"] + row["minimum_hours"]
        assert row["clock_hours"] == pytest.approx(parts, abs=minute)
    nightly = schedule[schedule["telescope"] == "Big"].groupby("night")["hours"].sum() + 0.25
    missing = (2.0 - nightly).clip(lower=0).sum()
    assert spent["minimum_hours"].sum() == pytest.approx(missing, abs=minute)
    assert np.sum(advice["hours_scheduled"]) == pytest.approx(
        spent["clock_hours"].sum(), abs=minute
    )
    assert (advice["hours_shutter"] < advice["hours"])[advice["hours"] > 0].all()


@pytest.mark.slow
def test_no_cell_of_the_spreadsheet_can_start_a_formula(planned):
    text = (planned / "schedule.csv").read_text()
    assert ",'=Two," in text
    assert ",=Two," not in text


@pytest.mark.slow
def test_the_page_is_one_file_and_escapes_what_it_shows(planned):
    page = (planned / "report.html").read_text()
    assert "http://" not in page
    assert "https://" not in page
    assert "A plan is no permission" in page
    assert page.count("<img") == page.count('src="data:image/png;base64,') > 3
    assert page.count("alt=") == page.count("<img")
    assert len(page) < 5_000_000


@pytest.mark.slow
def test_the_run_can_be_repeated_from_its_record(planned):
    record = json.loads((planned / "run.json").read_text())
    assert record["seed"] == 7
    assert "UT1" in record["time_note"]
    assert {"numpy", "astropy", "python"} <= set(record["versions"])
    (digest,) = record["files"].values()
    assert len(digest) == 64


@pytest.mark.slow
def test_the_day_of_the_run_does_not_matter(planned, tmp_path):
    """The clock is moved 15 years ahead and every socket refused; the tables stay the same."""
    (tmp_path / "small.yaml").write_text(FILE)
    script = (
        "import time, socket, datetime, sys\n"
        "now = time.time\n"
        "time.time = lambda: now() + 15 * 365.25 * 86400\n"
        "class Later(datetime.datetime):\n"
        "    @classmethod\n"
        "    def now(cls, tz=None): return super().fromtimestamp(time.time(), tz)\n"
        "    @classmethod\n"
        "    def utcnow(cls): return super().fromtimestamp(time.time())\n"
        "datetime.datetime = Later\n"
        "def refuse(*_): raise RuntimeError('network')\n"
        "socket.socket.connect = refuse\n"
        "socket.getaddrinfo = refuse\n"
        "from planner.cli.main import main\n"
        "sys.exit(main(['plan', 'small.yaml', '--out', 'later', '--workers', '1', '--quiet']))\n"
    )
    done = subprocess.run(
        [sys.executable, "-W", "error::UserWarning", "-c", script],
        cwd=tmp_path, capture_output=True, text=True, timeout=300, check=False,
    )  # fmt: skip
    assert (done.returncode, done.stderr) == (0, "")
    one, two = contents(planned), contents(tmp_path / "later")
    assert [n for n in one if n != "run.json" and one[n] != two[n]] == []


def test_help_is_instant_and_loads_no_science():
    done = run("--help")
    assert done.returncode == 0
    assert "planner start mine" in done.stdout
    script = (
        "import sys; from planner.cli.main import main\n"
        "try: main(['--help'])\n"
        "except SystemExit: pass\n"
        "print([m for m in ('numpy', 'astropy', 'numba', 'matplotlib') if m in sys.modules])"
    )
    loaded = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True
    )
    assert loaded.stdout.splitlines()[-1] == "[]"


@pytest.mark.parametrize("command", ["check", "lags", "nights"])
def test_quick_commands_print_and_give_json(file, capsys, command):
    assert main([command, str(file)]) == 0
    assert "One" in capsys.readouterr().out
    assert main([command, str(file), "--json"]) == 0
    assert isinstance(json.loads(capsys.readouterr().out), dict)


def test_trace_names_inputs_formulas_and_sources(file, capsys):
    assert main(["trace", str(file), "One"]) == 0
    text = capsys.readouterr().out
    for words in ("V = 14.9 (given", "Bentz et al. 2013", "1 + z = 1.02", "One epoch of the line"):
        assert words in text
    assert "S/N 30 at V = 16" in text
    assert main(["trace", str(file), "North", "--json"]) == 0
    steps = json.loads(capsys.readouterr().out)
    assert steps["Seasons"][0]["value"] == "none"
    assert main(["trace", str(file), "Oen"]) == 2
    assert "no target Oen; expected one of One, =Two, North" in capsys.readouterr().err


def test_check_and_lags_tell_what_one_epoch_measures(file, capsys):
    for command in ("check", "lags"):
        assert main([command, str(file)]) == 0
        text = capsys.readouterr().out
        assert "flux error [%]" in text
        assert "no window holds a visit" in text, "of the target that never rises"


def test_start_gives_a_file_that_passes_the_check(tmp_path, capsys):
    assert main(["start", str(tmp_path / "mine")]) == 0
    assert main(["check", str(tmp_path / "mine" / "campaign.yaml")]) == 0
    assert "default: streams.line.overhead" in capsys.readouterr().out
    assert main(["start", str(tmp_path / "mine")]) == 2
    assert "exists already" in capsys.readouterr().err


@pytest.mark.slow
def test_compare_pairs_scenarios(file, tmp_path, capsys):
    other = tmp_path / "cloudy.yaml"
    other.write_text(FILE.replace("clear: 75 %", "clear: 40 %"))
    assert main(["compare", str(file), str(other), "--json", "--quiet", "--workers", "1"]) == 0
    first, second = json.loads(capsys.readouterr().out)["scenarios"]
    assert (first["name"], second["name"]) == ("small", "cloudy")
    assert second["lags"] < first["lags"]
    assert second["gain"] == pytest.approx(second["lags"] - first["lags"])


@pytest.mark.slow
def test_layouts_are_ranked_without_trials(file, capsys):
    assert main(["score", str(file), "--forecast", "--json", "--workers", "1", "--quiet"]) == 0
    rows = json.loads(capsys.readouterr().out)["forecast"]
    one = [row for row in rows if row["target"] == "One"]
    assert len(one) == 8
    shares = [row["success"] for row in one]
    assert shares == sorted(shares, reverse=True)
    long = {row["season_length"]: row for row in one if row["seasons"] == 1}
    assert long[120]["error"] < long[60]["error"]
    assert all(row["success"] == 0 for row in rows if row["target"] == "North")


@pytest.mark.slow
def test_second_opinions_stand_beside_the_recommendation(planned):
    rows = Table.read(planned / "opinions.ecsv").to_pandas().set_index(["target", "what"])
    assert rows.loc[("One", "likelihood"), "success"] > 0.5
    assert rows.loc[("One", "unrelated line"), "false_claims"] <= 0.25
    assert rows.loc[("One", "outliers"), "trials"] == 20
    page = (planned / "report.html").read_text()
    assert "recovered by likelihood" in page
    assert "disturbed: outliers" in page


@pytest.mark.slow
def test_score_and_schedule_print_tables(file, capsys):
    words = ["score", str(file), "--quiet", "--workers", "1"]
    assert main([*words, "--nights", "2"]) == 0
    told = capsys.readouterr().out
    assert "120 d" in told
    # Two nights of some ten dark hours; either target takes more than all of it, or one fits.
    assert "Best list for" in told
    assert "right lags" in told
    assert main([*words, "--hours", "5", "--json"]) == 0
    result = json.loads(capsys.readouterr().out)
    assert all(row["spent"] <= 5 for row in result["lists"])
    assert main(["schedule", str(file), "--quiet", "--workers", "1"]) == 0
    assert "A plan is no permission" in capsys.readouterr().out
