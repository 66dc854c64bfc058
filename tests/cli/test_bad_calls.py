"""Commands that cannot do what was asked: one message, the right status, nothing half-written."""

import errno
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from planner.cli.main import main

FILE = Path(__file__).with_name("small.yaml").read_text()

TABLES = (
    "lags", "windows", "seasons", "epochs", "scores", "recommendation", "schedule", "time",
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


def contents(folder):
    return {
        p.relative_to(folder).as_posix(): p.read_bytes()
        for p in sorted(folder.rglob("*"))
        if p.is_file() and not p.name.startswith(".")
    }


BAD_CALLS = {
    "no such file": (["check", "nowhere.yaml"], "nowhere.yaml: no such file"),
    "no such command": (["plam", "small.yaml"], "invalid choice: 'plam'"),
    "no file": (["plan"], "the following arguments are required: FILE"),
    "workers": (["plan", "small.yaml", "--workers", "0"], "found '0'; expected a whole number"),
    "seed": (["plan", "small.yaml", "--seed", "-3"], "expected"),
    "unknown option": (["plan", "small.yaml", "--fast"], "unrecognized arguments: --fast"),
    "one scenario": (["compare", "small.yaml"], "expected two or more campaign files"),
    "not our folder": (["lags", "small.yaml", "--out", "taken"], "not a plan (e.g. thesis.tex)"),
    "a file as folder": (["lags", "small.yaml", "--out", "small.yaml"], "cannot be used"),
    "typo in the file": (["plan", "typo.yaml"], "did you mean `cadence`?"),
    "curve without columns": (["recover", "curve.csv", "curve.csv"], "no column flux, flux_error"),
    "curve beyond all bounds": (["recover", "huge.csv", "huge.csv"], "a number below 1e100"),
    "curve without errors": (["recover", "sure.csv", "sure.csv"], "flux_error: found 0"),
    "curve with text": (["recover", "text.csv", "text.csv"], "text.csv:3: flux: found bright"),
}


@pytest.mark.parametrize("case", BAD_CALLS)
def test_bad_calls_end_with_one_message_and_status_2(file, tmp_path, monkeypatch, capsys, case):
    words, message = BAD_CALLS[case]
    (tmp_path / "typo.yaml").write_text(FILE.replace("cadence: 1", "cadance: 1"))
    (tmp_path / "taken").mkdir()
    (tmp_path / "taken" / "thesis.tex").write_text("")
    (tmp_path / "curve.csv").write_text("time\n1\n")
    (tmp_path / "huge.csv").write_text("time,flux,flux_error\n1,1e300,1\n2,3,1\n")
    (tmp_path / "sure.csv").write_text("time,flux,flux_error\n1,1,0\n2,3,1\n")
    (tmp_path / "text.csv").write_text("time,flux,flux_error\n1,2,0.1\n2,bright,0.1\n")
    before = contents(tmp_path)
    monkeypatch.chdir(tmp_path)
    try:
        status = main(words)
    except SystemExit as end:
        status = end.code
    printed = capsys.readouterr()
    assert status == 2
    assert message in printed.err
    assert "Traceback" not in printed.err
    assert printed.out == ""
    assert contents(tmp_path) == before


def test_an_earlier_plan_is_not_overwritten_by_another(file, tmp_path, capsys):
    out = str(tmp_path / "out")
    assert main(["lags", str(file), "--out", out]) == 0
    kept = contents(Path(out))
    file.write_text(FILE.replace("14.9", "15.9"))
    assert main(["lags", str(file), "--out", out]) == 2
    assert "--replace" in capsys.readouterr().err
    assert contents(Path(out)) == kept
    assert main(["lags", str(file), "--out", out, "--replace"]) == 0
    assert contents(Path(out)) != kept


def test_nothing_observable_is_status_1_with_advice(file, capsys, tmp_path):
    north = FILE.replace('"-32:15:00"', '"+85:00:00"').replace('"-20:00:00"', '"+85:00:00"')
    file.write_text(north)
    assert main(["plan", str(file), "--out", str(tmp_path / "out"), "--quiet"]) == 1
    assert "widen the limits" in capsys.readouterr().err
    assert contents(tmp_path / "out") == {}


@pytest.mark.parametrize("command", ["lags", "nights"])
def test_a_full_disk_is_one_message_and_leaves_nothing_half_written(
    file, tmp_path, monkeypatch, capsys, command
):
    out = tmp_path / "out"

    def full(_):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    assert main(["lags", str(file), "--out", str(out)]) == 0
    kept = contents(out)
    shutil.rmtree(out)
    monkeypatch.setattr("os.fsync", full)
    assert main([command, str(file), "--out", str(out)]) == 2
    printed = capsys.readouterr()
    assert "cannot be written: No space left on device" in printed.err
    assert printed.err.count("\n") == 1
    assert [p.name for p in out.iterdir()] == []
    monkeypatch.undo()
    assert main(["lags", str(file), "--out", str(out)]) == 0
    assert contents(out) == kept


def test_a_full_disk_on_stdout_is_no_traceback(file):
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "planner", "lags", str(file)],
            stdout=full, stderr=subprocess.PIPE, text=True, check=False,
        )  # fmt: skip
    assert "Traceback" not in done.stderr
    assert done.returncode == 2


def test_a_closed_pipe_is_no_traceback(file):
    done = subprocess.run(
        f"{sys.executable} -m planner check {file} | head -n 1",
        shell=True, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert "Traceback" not in done.stderr
