"""Workers on a Dask cluster: a scheduler and worker processes of this machine."""

import builtins
import importlib
import json
import os
import signal
import socket
import subprocess
import sys
import sysconfig
import threading
import time
from pathlib import Path

import pytest

from planner.base import cluster as module
from planner.base.errors import InputError, PlannerError
from planner.base.workers import Workers

sys.path.append(str(Path(__file__).parent))
todo = importlib.import_module("tasks_for_workers")
DASK = str(Path(sysconfig.get_path("scripts")) / "dask")
pytestmark = pytest.mark.slow


@pytest.fixture(autouse=True)
def no_network(monkeypatch):
    """Allow connections within this machine, unlike elsewhere, and no others."""
    original = socket.socket.connect

    def refuse(self, address, *_):
        if self.family in {socket.AF_INET, socket.AF_INET6} and address[0] != "127.0.0.1":
            raise AssertionError(f"connection to {address}")
        return original(self, address)

    monkeypatch.setattr(socket.socket, "connect", refuse)


def start_worker(address, folder, count=1):
    command = [DASK, "worker", address, "--no-dashboard", "--nworkers", str(count)]
    return subprocess.Popen(
        [*command, "--nthreads", "1", "--host", "127.0.0.1"], cwd=folder, stderr=subprocess.DEVNULL,
        env=os.environ | {"PYTHONPATH": str(Path(__file__).parent)},
    )  # fmt: skip


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("elsewhere")


def start_scheduler(folder):
    """Start a scheduler; return its process and address."""
    file = folder / "scheduler.json"
    file.unlink(missing_ok=True)
    process = subprocess.Popen(
        [DASK, "scheduler", "--host", "127.0.0.1", "--port", "0", "--no-dashboard",
         "--scheduler-file", str(file)],
        cwd=folder, stderr=subprocess.DEVNULL,
    )  # fmt: skip
    while not file.exists() or not file.read_text():
        assert process.poll() is None
        time.sleep(0.05)
    return process, json.loads(file.read_text())["address"]


@pytest.fixture(scope="module")
def address(folder):
    scheduler, address = start_scheduler(folder)
    worker = start_worker(address, folder, 2)
    yield address
    worker.terminate()
    worker.wait()
    scheduler.terminate()
    scheduler.wait()


@pytest.fixture
def crew(address):
    with Workers(cluster=address) as workers:
        yield workers


def test_each_task_is_done_once_elsewhere(crew, folder):
    found = list(crew.each(todo.where, range(200)))
    assert sorted(i for i, _ in found) == list(range(200))
    assert {place for _, (_, place) in found} == {str(folder)}
    assert os.getpid() not in {pid for _, (pid, _) in found}
    assert list(crew.each(todo.where, [])) == []


def test_functions_of_a_script_work_too(crew):
    def double(number):
        return 2 * number

    double.__module__ = "__main__"
    assert dict(crew.each(double, range(9))) == {i: 2 * i for i in range(9)}


def test_all_threads_of_the_cluster_are_used(crew):
    list(crew.each(todo.nap, [0.2] * 8))  # by then both workers are there
    crew._crew._asked_s = -1e9
    assert crew._crew.slots() == 2
    assert len(set(dict(crew.each(todo.nap, [0.1] * 20)).values())) == 2


def test_linear_algebra_has_one_thread_and_the_same_bytes(crew):
    for _, (counts, environment) in crew.each(todo.threads, [0, 1]):
        assert set(counts) == {1}
        assert environment == "1"
    assert dict(crew.each(todo.product, range(4))) == dict(Workers().each(todo.product, range(4)))


def test_an_error_of_the_work_comes_through(crew):
    with pytest.raises(ValueError, match="five") as caught:
        list(crew.each(todo.raise_at_five, range(40)))
    assert caught.value.args == ("five", 5)


def test_an_interruption_cancels_and_returns_at_once(crew):
    timer = threading.Timer(0.5, os.kill, (os.getpid(), signal.SIGINT))
    start = time.monotonic()
    timer.start()
    with pytest.raises(KeyboardInterrupt):
        list(crew.each(todo.nap, [1.5] * 60))
    assert time.monotonic() - start < 1.5
    results = crew.each(todo.nap, [0.01, *[1.5] * 60])
    next(results)
    start = time.monotonic()
    results.close()
    assert time.monotonic() - start < 1.0
    # The rest was cancelled, or this would take a minute and a half.
    start = time.monotonic()
    assert len(list(crew.each(todo.nap, [0.01] * 4))) == 4
    assert time.monotonic() - start < 15.0


def test_a_killed_worker_costs_nothing_but_time(crew, tmp_path):
    tasks = [(i, str(tmp_path / "mark") if i == 5 else "") for i in range(60)]
    assert dict(crew.each(todo.die_once, tasks)) == {i: i for i in range(60)}
    assert (tmp_path / "mark").exists()


def test_workers_that_die_more_often_than_dask_puts_up_with_are_given_up(crew, monkeypatch):
    from distributed import KilledWorker

    tried = []

    def submit(packed):
        tried.append(packed)
        from concurrent.futures import Future

        future = Future()
        future.set_exception(KilledWorker("task", None, 3))
        return future

    monkeypatch.setattr(crew._crew, "submit", submit)
    with pytest.raises(PlannerError, match="died 4 times"):
        list(crew.each(todo.nap, [0.0]))
    assert len(tried) == 4


def test_missing_workers_and_a_lost_scheduler_are_said(tmp_path, monkeypatch, capfd):
    monkeypatch.setattr(module, "CONNECT_S", 0.5)
    monkeypatch.setattr(module, "CENSUS_S", 0.1)
    monkeypatch.setattr(module, "DESERTED_S", 0.5)
    import dask

    scheduler, address = start_scheduler(tmp_path)
    started = [scheduler]
    try:
        with (
            dask.config.set({"distributed.comm.timeouts.connect": "1s"}),
            Workers(cluster=address) as workers,
        ):
            with pytest.raises(PlannerError, match="no workers"):
                list(workers.each(todo.nap, [0.0]))
            monkeypatch.setattr(module, "DESERTED_S", 60.0)
            started.append(start_worker(address, tmp_path))
            results = workers.each(todo.nap, [0.05] * 10000)
            next(results)
            scheduler.kill()
            with pytest.raises(InputError, match="no Dask scheduler answers"):
                list(results)
    finally:
        for process in reversed(started):
            process.kill() if process is scheduler else process.terminate()
            process.wait()
    assert capfd.readouterr().err == ""


@pytest.mark.parametrize("address", ["tcp://127.0.0.1:1", "nonsense", "foo://bar:1"])
def test_an_address_where_nobody_answers_is_said(address, monkeypatch, capfd):
    monkeypatch.setattr(module, "CONNECT_S", 0.5)
    with pytest.raises(InputError, match=f"no Dask scheduler answers at {address}"):
        Workers(cluster=address)
    assert capfd.readouterr().err == ""


def test_the_package_is_asked_for_when_it_is_missing(monkeypatch):
    original = builtins.__import__

    def refuse(name, *arguments, **options):
        if name.split(".")[0] == "distributed":
            raise ImportError(name)
        return original(name, *arguments, **options)

    monkeypatch.setattr(builtins, "__import__", refuse)
    with pytest.raises(InputError, match=r"pip install '\.\[cluster\]'") as caught:
        Workers(cluster="tcp://127.0.0.1:1")
    assert caught.value.exit_status == 2


def test_dask_is_loaded_only_for_a_cluster():
    code = (
        "import sys; from planner.base.workers import Workers; Workers(2).close();"
        "sys.exit(bool({'dask', 'distributed'} & set(sys.modules)))"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
