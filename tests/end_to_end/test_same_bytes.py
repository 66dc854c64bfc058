"""One campaign planned in every way that must make no difference: the same bytes come out."""

import json
import os
import random
import signal
import subprocess
import sys
import sysconfig
import time
from pathlib import Path

import pytest

SMALL = (Path(__file__).parents[1] / "cli" / "small.yaml").read_text()
FEWER = {
    "cadence: [3 nights, 6 nights]": "cadence: 3 nights",
    "trials: 20, resamples: 30": "trials: 10, resamples: 20",
    "false_alarm_below: 10 %}  # 5 % needs more trials than these": "false_alarm_below: 20 %}",
}
DASK = str(Path(sysconfig.get_path("scripts")) / "dask")
pytestmark = pytest.mark.slow


def command(folder, *words):
    """Return the command that plans a small campaign whose file lies beside the folder."""
    text = SMALL
    for old, new in FEWER.items():
        assert old in text
        text = text.replace(old, new)
    file = folder.parent / "small.yaml"
    file.write_text(text)
    return [
        sys.executable, "-m", "planner", "plan", str(file), "--out", str(folder), "--quiet", *words
    ]  # fmt: skip


def plan(folder, *words):
    subprocess.run(command(folder, *words), check=True, stdout=subprocess.DEVNULL)
    return contents(folder)


def contents(folder):
    """Return the bytes of every result; kept trials are no result."""
    return {
        str(path.relative_to(folder)): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        # run.json names the input file as it was given
        if path.is_file() and not path.name.startswith(".") and path.name != "run.json"
    }


@pytest.fixture(scope="module")
def expected(tmp_path_factory):
    return plan(tmp_path_factory.mktemp("one") / "plan", "--workers", "1")


def test_two_workers(expected, tmp_path):
    assert plan(tmp_path / "plan", "--workers", "2") == expected


def test_killed_five_times_and_resumed(expected, tmp_path):
    """SIGKILL leaves no time to tidy up; what was finished is used, what was not is done again."""
    moments, killed = random.Random(11), 0
    for _ in range(5):
        run = subprocess.Popen(
            command(tmp_path / "plan", "--workers", "2"),
            stdout=subprocess.DEVNULL,
            start_new_session=True,
        )
        try:
            run.wait(moments.uniform(1.5, 5.0))
        except subprocess.TimeoutExpired:
            os.killpg(run.pid, signal.SIGKILL)
            killed += 1
        run.wait()
    assert killed >= 3
    assert plan(tmp_path / "plan", "--workers", "2") == expected


def test_interrupted_by_hand(tmp_path):
    """Ctrl-C ends within two seconds, says how to go on, and prints no traceback."""
    run = subprocess.Popen(
        command(tmp_path / "plan", "--workers", "2"),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    kept = tmp_path / "plan" / ".trials.sqlite"
    while not kept.exists() and run.poll() is None:
        time.sleep(0.05)
    time.sleep(3.0)
    started = time.monotonic()
    os.killpg(run.pid, signal.SIGINT)
    out, err = run.communicate(timeout=20)
    assert time.monotonic() - started < 2.0
    assert run.returncode == 130
    assert err == "planner: interrupted; the same command goes on from here\n"
    assert out == ""
    assert not (tmp_path / "plan" / "report.html").exists()


@pytest.fixture
def cluster(tmp_path):
    """A scheduler and three worker processes on this machine; yields address and processes."""
    file = tmp_path / "scheduler.json"
    scheduler = subprocess.Popen(
        [DASK, "scheduler", "--host", "127.0.0.1", "--port", "0", "--no-dashboard",
         "--scheduler-file", str(file)],
        cwd=tmp_path, stderr=subprocess.DEVNULL,
    )  # fmt: skip
    while not file.exists() or not file.read_text():
        assert scheduler.poll() is None
        time.sleep(0.05)
    address = json.loads(file.read_text())["address"]
    workers = [
        subprocess.Popen(
            [DASK, "worker", address, "--no-dashboard", "--nthreads", "1", "--no-nanny",
             "--host", "127.0.0.1"],
            cwd=tmp_path, stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL,
        )
        for _ in range(3)
    ]  # fmt: skip
    yield address, workers
    for process in (*workers, scheduler):
        process.kill()
        process.wait()


def test_a_cluster_of_three_processes_one_of_which_dies(expected, cluster, tmp_path):
    address, workers = cluster
    assert plan(tmp_path / "whole", "--cluster", address) == expected
    run = subprocess.Popen(
        command(tmp_path / "plan", "--cluster", address), stdout=subprocess.DEVNULL
    )
    kept = tmp_path / "plan" / ".trials.sqlite"
    while not kept.exists() and run.poll() is None:
        time.sleep(0.05)
    time.sleep(1.0)
    assert run.poll() is None
    workers[0].kill()
    assert run.wait() == 0
    assert contents(tmp_path / "plan") == expected
