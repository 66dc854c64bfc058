"""Workers in this process and in children; every case holds for both where both can have it."""

import gc
import importlib
import os
import signal
import subprocess
import sys
import threading
import time
from pathlib import Path

import numpy as np
import pytest

from planner.base import workers as module
from planner.base.errors import PlannerError
from planner.base.process import one_thread, uninterrupted
from planner.base.workers import Workers

sys.path.append(str(Path(__file__).parent))
todo = importlib.import_module("tasks_for_workers")


@pytest.fixture(scope="module")
def crew():
    with Workers(2) as workers:
        yield workers


def alive(pid):
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


def test_each_task_is_done_once_here():
    assert list(Workers().each(str, [3, 4, 5])) == [(0, "3"), (1, "4"), (2, "5")]
    assert list(Workers(1).each(str, [])) == []


def test_each_task_is_done_once_by_children(crew):
    for count in (0, 1, 2, 7, 500):
        found = list(crew.each(str, range(count)))
        assert dict(found) == {i: str(i) for i in range(count)}
        assert len(found) == count


def test_children_live_over_many_calls(crew):
    pids = [set(dict(crew.each(todo.nap, [0.02] * 12)).values()) for _ in range(3)]
    assert pids[0] == pids[1] == pids[2]
    assert len(pids[0]) == 2
    assert os.getpid() not in pids[0]


def test_results_come_in_the_order_in_which_they_finish(crew):
    indices = [i for i, _ in crew.each(todo.nap, [0.5, 0.01, 0.01])]
    assert indices == [1, 2, 0]


def test_linear_algebra_has_one_thread_wherever_it_runs(crew, monkeypatch):
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "2")
    for workers in (Workers(), crew):
        for _, (counts, environment) in workers.each(todo.threads, [0, 1]):
            assert counts
            assert set(counts) == {1}
            assert environment == "1"
    assert os.environ["OPENBLAS_NUM_THREADS"] == "2"


def test_bytes_are_the_same_wherever_they_are_worked_out(crew):
    here = dict(Workers().each(todo.product, range(6)))
    assert dict(crew.each(todo.product, range(6))) == here


def test_threads_are_held_until_the_last_is_out(monkeypatch):
    monkeypatch.setenv("OMP_NUM_THREADS", "2")
    with one_thread:
        thread = threading.Thread(target=lambda: one_thread.__enter__() or one_thread.__exit__())
        thread.start()
        thread.join()
        assert os.environ["OMP_NUM_THREADS"] == "1"
    assert os.environ["OMP_NUM_THREADS"] == "2"


def test_short_tasks_go_in_batches_that_shrink_to_the_end(crew, monkeypatch):
    sizes = []
    pack = type(crew._crew).pack
    monkeypatch.setattr(crew._crew, "pack", lambda b: sizes.append(len(b[1])) or pack(b))
    assert len(list(crew.each(todo.nap, [0.001] * 1500))) == 1500
    assert sum(sizes) == 1500
    assert sizes[0] == sizes[-1] == 1
    assert max(sizes) > 20
    left = 1500 - np.cumsum([0, *sizes[:-1]])
    assert all(size == 1 or size <= rest / 8 for size, rest in zip(sizes, left, strict=True))


def test_long_tasks_go_one_by_one(crew, monkeypatch):
    sizes = []
    pack = type(crew._crew).pack
    monkeypatch.setattr(crew._crew, "pack", lambda b: sizes.append(len(b[1])) or pack(b))
    monkeypatch.setattr(module, "BATCH_S", 0.01)
    list(crew.each(todo.nap, [0.02] * 40))
    assert set(sizes) == {1}


def test_big_arguments_make_small_batches(crew, monkeypatch):
    sizes = []
    pack = type(crew._crew).pack
    monkeypatch.setattr(crew._crew, "pack", lambda b: sizes.append(len(b[1])) or pack(b))
    monkeypatch.setattr(module, "BATCH_BYTES", 1_000_000)
    tasks = [(i, np.full(25_000, 1.0 + i)) for i in range(100)]
    assert dict(crew.each(todo.total, tasks)) == {i: i + 25_000 * (1.0 + i) for i in range(100)}
    assert max(sizes) <= 5


def test_an_error_of_the_work_comes_through_and_ends_the_others(crew):
    with pytest.raises(ValueError, match="five") as caught:
        list(crew.each(todo.raise_at_five, range(40)))
    assert caught.value.args == ("five", 5)
    assert "raise_at_five" in str(caught.value.__cause__)  # where it happened in the child
    with pytest.raises(ValueError, match="five"):
        list(Workers().each(todo.raise_at_five, range(40)))
    assert dict(crew.each(str, range(5))) == {i: str(i) for i in range(5)}


def test_an_error_that_cannot_travel_is_told_in_words(crew):
    with pytest.raises(RuntimeError, match="FussyError: 0 and 0"):
        list(crew.each(todo.raise_fussily, [0, 0]))


def test_a_killed_child_costs_nothing_but_time(crew, tmp_path):
    tasks = [(i, str(tmp_path / "mark") if i in {7, 30} else "") for i in range(60)]
    assert dict(crew.each(todo.die_once, tasks)) == {i: i for i in range(60)}
    assert (tmp_path / "mark").exists()


def test_children_killed_from_outside_are_replaced(crew):
    found = {}
    for index, pid in crew.each(todo.nap, [0.02] * 60):
        found[index] = pid
        if len(found) == 10:
            os.kill(pid, signal.SIGKILL)
    assert sorted(found) == list(range(60))
    assert len(set(found.values())) > 2


def test_children_that_always_die_are_given_up(crew):
    with pytest.raises(PlannerError, match="died 4 times"):
        list(crew.each(todo.die, range(20)))
    assert dict(crew.each(str, range(5))) == {i: str(i) for i in range(5)}


@pytest.mark.slow
def test_a_child_killed_while_it_answers_is_noticed(crew):
    with pytest.raises(PlannerError, match="died 4 times"):
        list(crew.each(todo.die_while_sending, [0, 1]))


def test_closing_the_generator_kills_long_tasks(crew):
    results = crew.each(todo.nap, [0.01, *[300.0] * 9])
    _, pid = next(results)
    assert alive(pid)
    start = time.monotonic()
    results.close()
    assert time.monotonic() - start < 1.0
    assert not alive(pid)
    assert len(list(crew.each(todo.nap, [0.0] * 5))) == 5


def test_an_interrupted_consumer_returns_at_once(crew):
    start = time.monotonic()
    with pytest.raises(KeyboardInterrupt):
        list(crew.each(todo.interrupt_parent_then_nap, [300.0] * 4))
    assert time.monotonic() - start < 4.0  # most of it for children to start
    assert len(list(crew.each(todo.nap, [0.0] * 5))) == 5


def test_leaving_the_context_ends_children_at_work():
    with Workers(2) as workers:
        results = workers.each(todo.nap, [0.01, *[300.0] * 9])
        _, pid = next(results)
        start = time.monotonic()
    assert time.monotonic() - start < 1.0
    assert not alive(pid)
    workers.close()
    assert len(list(workers.each(todo.nap, [0.0] * 3))) == 3
    workers.close()


def test_children_leave_interrupts_to_the_parent(crew):
    assert dict(crew.each(todo.ignores_interrupts, range(4))) == dict.fromkeys(range(4), True)


def test_an_interruption_is_put_off_not_lost():
    reached = []
    with pytest.raises(KeyboardInterrupt), uninterrupted():
        signal.raise_signal(signal.SIGINT)
        time.sleep(0.05)
        reached.append(1)
    assert reached == [1]


def test_nothing_is_left_behind(crew):
    list(crew.each(str, range(50)))
    gc.collect()
    before = threading.active_count()
    for _ in range(2):
        list(crew.each(str, range(50)))
    assert threading.active_count() == before


SCRIPT = """
import sys
sys.path.append(sys.argv[1])
import tasks_for_workers as todo
from planner.base.workers import Workers
if __name__ == "__main__":
    try:
        with Workers(2) as workers:
            print("ready", flush=True)
            for _ in workers.each(todo.nap, [0.01] * 4 + [60.0] * 4):
                print("result", flush=True)
    except KeyboardInterrupt:
        print("interrupted", flush=True)
"""


@pytest.fixture
def script(tmp_path):
    path = tmp_path / "script.py"
    path.write_text(SCRIPT)
    running = []

    def start():
        process = subprocess.Popen(
            [sys.executable, str(path), str(Path(__file__).parent)],
            stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True,
        )  # fmt: skip
        running.append(process)
        return process

    yield start
    for process in running:
        process.kill()
        process.communicate()


@pytest.mark.slow
@pytest.mark.parametrize("delay_s", [0.0, 0.02, 0.05, 0.1, 0.2, 0.35, 0.6])
def test_ctrl_c_at_any_moment_is_quiet(script, delay_s):
    """A terminal sends Ctrl-C to the children too, at work or not yet started."""
    process = script()
    assert process.stdout.readline() == "ready\n"
    time.sleep(delay_s)
    os.killpg(process.pid, signal.SIGINT)
    out, errors = process.communicate(timeout=10)
    assert out.endswith("interrupted\n")
    assert errors == ""


@pytest.mark.slow
def test_children_do_not_outlive_a_killed_parent(script):
    process = script()
    assert process.stdout.readline() == "ready\n"
    assert process.stdout.readline() == "result\n"
    children = Path(f"/proc/{process.pid}/task/{process.pid}/children").read_text().split()
    assert len(children) >= 2
    process.kill()
    end = time.monotonic() + 5.0
    while any(alive(pid) for pid in children) and time.monotonic() < end:
        time.sleep(0.05)
    assert not any(alive(pid) for pid in children)
