import contextlib
import os
import signal
import sqlite3
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import OutputError
from planner.scoring.store import LAYOUT, Store

ONE = {"a": np.ones(1)}


def many(count, start=0):
    return {f"k{i}": {"a": np.array([float(i)])} for i in range(start, start + count)}


def fill(path, count=300):
    """Keep many results in a new store, wide enough to fill many pages."""
    store = Store(path)
    rng = np.random.default_rng(1)
    store.put_many({f"k{i}": {"a": rng.random(60), "i": np.array(i)} for i in range(count)})
    store.close()


def right(found):
    return all(f"k{int(arrays['i'])}" == key for key, arrays in found.items())


@pytest.fixture
def said():
    return []


def test_what_is_put_comes_back(tmp_path):
    arrays = {"a": np.arange(6.0).reshape(2, 3), "b": np.array([True, False])}
    store = Store(tmp_path / "kept")
    assert store.get("k") is None
    store.put("k", arrays)
    store.close()
    again = Store(tmp_path / "kept").get("k")
    assert sorted(again) == ["a", "b"]
    assert np.array_equal(again["a"], arrays["a"])
    assert again["b"].dtype == bool


def test_many_come_back_at_once(tmp_path):
    store = Store(tmp_path / "kept")
    store.put_many(many(1200))
    found = store.get_many([f"k{i}" for i in range(-5, 1300)])
    assert {k: v["a"][0] for k, v in found.items()} == {f"k{i}": float(i) for i in range(1200)}


def test_a_damaged_row_is_missing_and_overwritten(tmp_path):
    store = Store(tmp_path / "kept")
    store.put_many(many(2))
    with sqlite3.connect(tmp_path / "kept") as other:
        other.execute("UPDATE done SET arrays = 'nonsense' WHERE key = 'k0'")
    other.close()
    assert list(store.get_many(["k0", "k1"])) == ["k1"]
    store.put_many(many(1))
    assert sorted(store.get_many(["k0", "k1"])) == ["k0", "k1"]


@pytest.mark.parametrize(
    "content",
    [b"not a database" * 100, b"SQLite format 3\x00" + b"\xff" * 5000, b"a line of text\n"],
)
def test_a_damaged_store_is_set_aside(tmp_path, said, content):
    (tmp_path / "kept").write_bytes(content)
    store = Store(tmp_path / "kept", said.append)
    store.put("k", ONE)
    assert store.get("k")["a"] == 1
    assert (tmp_path / "kept.damaged").read_bytes() == content
    (message,) = said
    assert "kept.damaged" in message


def test_without_a_listener_damage_is_said_on_stderr(tmp_path, capsys):
    (tmp_path / "kept").write_bytes(b"text" * 100)
    Store(tmp_path / "kept")
    assert capsys.readouterr().err.count("\n") == 1


def test_damaged_stores_are_numbered(tmp_path, said):
    for text in ("first", "second", "third"):
        (tmp_path / "kept").write_text(text * 100)
        Store(tmp_path / "kept", said.append).close()
    assert (tmp_path / "kept.damaged").read_text().startswith("first")
    assert (tmp_path / "kept.damaged2").read_text().startswith("second")
    assert (tmp_path / "kept.damaged3").read_text().startswith("third")
    assert len(said) == 3


def test_a_folder_in_its_place_is_set_aside(tmp_path, said):
    (tmp_path / "kept" / "inside").mkdir(parents=True)
    store = Store(tmp_path / "kept", said.append)
    store.put("k", ONE)
    assert (tmp_path / "kept.damaged" / "inside").is_dir()
    assert len(said) == 1


@pytest.mark.parametrize("size", [0, 1, 50, 100, 4096, 5000, 40960])
def test_a_truncated_store_gives_no_wrong_answer(tmp_path, said, size):
    fill(tmp_path / "kept")
    os.truncate(tmp_path / "kept", size)
    store = Store(tmp_path / "kept", said.append)
    found = store.get_many([f"k{i}" for i in range(300)])
    assert right(found)
    store.put_many(many(3, 1000))
    assert len(store.get_many([f"k{i}" for i in range(1000, 1003)])) == 3
    assert len(said) == (size > 1)  # SQLite takes one byte for an empty file


@pytest.mark.parametrize("seed", range(8))
def test_garbage_in_the_middle_gives_no_wrong_answer(tmp_path, said, seed):
    fill(tmp_path / "kept")
    rng = np.random.default_rng(seed)
    with (tmp_path / "kept").open("r+b") as file:
        size = file.seek(0, os.SEEK_END)
        file.seek(rng.integers(0 if seed == 0 else 4096, size - 8192))
        file.write(rng.bytes(8192))
    store = Store(tmp_path / "kept", said.append)
    assert right(store.get_many([f"k{i}" for i in range(300)]))
    store.put_many(many(200, 1000))
    kept = store.get_many([f"k{i}" for i in range(1000, 1200)])
    assert {k: v["a"][0] for k, v in kept.items()} == {
        k: v["a"][0] for k, v in many(200, 1000).items()
    }
    assert len(said) <= 1


@pytest.mark.parametrize("end", ["", "-wal"])
@pytest.mark.parametrize("harm", ["truncate", "garbage", "remove"])
def test_damage_while_open_is_survived(tmp_path, said, end, harm):
    path = tmp_path / "kept"
    fill(path)
    store = Store(path, said.append)
    store.put_many({f"k{i}": {"a": np.ones(60), "i": np.array(i)} for i in range(300, 400)})
    harmed = path.with_name(path.name + end)
    if harm == "truncate":
        os.truncate(harmed, 3000)
    elif harm == "garbage":
        harmed.write_bytes(np.random.default_rng(4).bytes(harmed.stat().st_size))
    else:
        harmed.unlink()
    for turn in range(3):
        assert right(store.get_many([f"k{i}" for i in range(400)]))
        store.put_many(many(50, 1000 + 50 * turn))
    store.close()
    again = Store(path, said.append)
    assert right(again.get_many([f"k{i}" for i in range(400)]))
    again.put("k", ONE)
    assert again.get("k")["a"] == 1
    assert len(said) <= 1


def test_leftover_logs_do_no_harm(tmp_path, said):
    fill(tmp_path / "other")
    store = Store(tmp_path / "other")
    store.put_many(many(50))
    for end in ("-wal", "-shm"):
        (tmp_path / f"kept{end}").write_bytes((tmp_path / f"other{end}").read_bytes())
    fresh = Store(tmp_path / "kept", said.append)
    assert fresh.get_many([f"k{i}" for i in range(300)]) == {}
    fresh.put_many(many(3))
    fresh.close()
    assert len(Store(tmp_path / "kept", said.append).get_many(["k0", "k1", "k2"])) == 3
    assert said == []


def test_damage_takes_its_log_along(tmp_path, said):
    Store(tmp_path / "kept").close()
    other = sqlite3.connect(tmp_path / "kept")  # keeps the log from being tidied away
    with contextlib.closing(other):
        other.execute("SELECT count(*) FROM done").fetchone()
        with (tmp_path / "kept").open("r+b") as file:
            file.write(b"garbage" * 1000)
        store = Store(tmp_path / "kept", said.append)
        store.put("k", ONE)
        assert {"kept.damaged", "kept.damaged-wal", "kept.damaged-shm"} <= set(os.listdir(tmp_path))
    assert store.get("k")["a"] == 1
    store.close()
    assert Store(tmp_path / "kept", said.append).get("k")["a"] == 1
    assert len(said) == 1


def test_an_older_layout_is_made_anew_without_a_word(tmp_path, said):
    with sqlite3.connect(tmp_path / "kept") as old:
        old.execute("CREATE TABLE done (key TEXT PRIMARY KEY, arrays BLOB)")
        old.execute("INSERT INTO done VALUES ('k', x'00')")
    old.close()
    store = Store(tmp_path / "kept", said.append)
    assert store.get("k") is None
    store.put("k", ONE)
    assert store.get("k")["a"] == 1
    assert said == []


def test_other_programs_may_read_it(tmp_path):
    store = Store(tmp_path / "kept")
    store.put_many(many(5))
    reader = sqlite3.connect((tmp_path / "kept").as_uri() + "?mode=ro", uri=True)
    with contextlib.closing(reader):
        assert reader.execute("SELECT count(*) FROM done").fetchone() == (5,)
        assert reader.execute("PRAGMA user_version").fetchone() == (LAYOUT,)
        store.put_many(many(5, 5))
        assert reader.execute("SELECT count(*) FROM done").fetchone() == (10,)
    store.close()
    assert os.listdir(tmp_path) == ["kept"]


def test_a_lock_that_is_held_long_is_said(tmp_path):
    store = Store(tmp_path / "kept", locked_s=0.3)
    store.put_many(many(2))
    holder = sqlite3.connect(tmp_path / "kept", isolation_level=None)
    with contextlib.closing(holder):
        holder.execute("BEGIN IMMEDIATE")
        with pytest.raises(OutputError, match="another process has held this file for 0 s"):
            store.put("k9", ONE)
        assert len(store.get_many(["k0", "k1"])) == 2
        holder.execute("ROLLBACK")
    store.put("k9", ONE)
    assert store.get("k9")["a"] == 1


def test_a_lock_that_is_let_go_is_waited_for(tmp_path):
    Store(tmp_path / "kept").close()
    code = (
        "import sqlite3, sys, time; d = sqlite3.connect(sys.argv[1], isolation_level=None);"
        "d.execute('BEGIN EXCLUSIVE'); print('held', flush=True); time.sleep(0.6);"
        "d.execute('COMMIT')"
    )
    command = [sys.executable, "-c", code, str(tmp_path / "kept")]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as holder:
        assert holder.stdout.readline() == "held\n"
        store = Store(tmp_path / "kept")
        store.put("k", ONE)
    assert store.get("k")["a"] == 1


# The store alone: the whole of its room takes seconds to import.
STORE = """
import importlib.util, os, sys, types
from pathlib import Path
import numpy as np
room = types.ModuleType("planner.scoring")
room.__path__ = [str(Path(importlib.util.find_spec("planner").origin).parent / "scoring")]
sys.modules["planner.scoring"] = room
from planner.base.errors import OutputError
from planner.scoring.store import Store
"""

WRITER = """
path, start, count, together = Path(sys.argv[1]), *map(int, sys.argv[2:])
store = Store(path)
print("open", flush=True)
for i in range(start, start + count, together):
    some = range(i, i + together)
    store.put_many({f"k{j}": {"a": np.arange(60.0) * j, "i": np.array(j)} for j in some})
    print(i, flush=True)
"""


def writer(path, *numbers):
    command = [sys.executable, "-c", STORE + WRITER, str(path), *map(str, numbers)]
    return subprocess.Popen(command, stdout=subprocess.PIPE, text=True)


@pytest.mark.slow
def test_two_processes_write_at_once(tmp_path):
    with writer(tmp_path / "kept", 1000, 400, 2) as other:
        assert other.stdout.readline() == "open\n"
        store = Store(tmp_path / "kept")
        for i in range(200):
            store.put(f"k{i}", {"i": np.array(i)})
        other.communicate()
    assert other.returncode == 0
    keys = [f"k{i}" for i in (*range(200), *range(1000, 1400))]
    found = store.get_many(keys)
    assert sorted(found) == sorted(keys)
    assert right(found)


@pytest.mark.slow
def test_a_killed_writer_loses_nothing_that_was_safe(tmp_path, said):
    rng = np.random.default_rng(6)
    safe, start = set(), 0
    for _ in range(4):
        with writer(tmp_path / "kept", start, 10**6, 5) as process:
            assert process.stdout.readline() == "open\n"
            time.sleep(rng.uniform(0.0, 0.2))
            process.send_signal(signal.SIGKILL)
            told = process.communicate()[0].split("\n")[:-1]
        safe |= {f"k{int(i) + j}" for i in told for j in range(5)}
        start += 10**6
        store = Store(tmp_path / "kept", said.append)
        found = store.get_many(sorted(safe))
        assert set(found) == safe
        assert right(found)
        store.close()
        with contextlib.closing(sqlite3.connect(tmp_path / "kept")) as database:
            assert database.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
            (count,) = database.execute("SELECT count(*) FROM done").fetchone()
            assert count % 5 == 0  # all or none of what was put together
    assert said == []
    assert safe


def test_a_full_disk_is_said_and_what_was_kept_stays(tmp_path, monkeypatch):
    connect = sqlite3.connect

    def small(*arguments, **options):
        database = connect(*arguments, **options)
        database.execute("PRAGMA max_page_count = 20")
        return database

    monkeypatch.setattr(sqlite3, "connect", small)
    store = Store(tmp_path / "kept")
    store.put_many(many(3))
    big = {f"b{i}": {"a": np.random.default_rng(i).random(200)} for i in range(100)}
    for _ in range(2):
        with pytest.raises(OutputError, match=r"kept: results cannot be kept: .*full"):
            store.put_many(big)
    assert len(store.get_many(["k0", "k1", "k2", "b0"])) == 3
    store.put_many(many(1, 9))
    assert store.get("k9") is not None


READ_ONLY = """
if os.geteuid() == 0:  # modes do not hold for root
    os.seteuid(65534)
store = Store(Path(sys.argv[1]), warn=sys.exit)
assert store.get("k1")["a"] == 1
try:
    store.put("k9", {"a": np.ones(1)})
except OutputError as error:
    print(error)
assert store.get("k1")["a"] == 1
"""


@pytest.mark.parametrize("folder_mode", [0o555, 0o755])
def test_a_store_that_cannot_be_written_can_be_read(folder_mode):
    folder = Path(tempfile.mkdtemp())
    try:
        store = Store(folder / "kept")
        store.put_many(many(3))
        store.close()
        (folder / "kept").chmod(0o444)
        folder.chmod(folder_mode)
        done = subprocess.run(
            [sys.executable, "-c", STORE + READ_ONLY, str(folder / "kept")],
            capture_output=True, text=True, check=False,
        )  # fmt: skip
    finally:
        folder.chmod(0o755)
        for file in folder.iterdir():
            file.unlink()
        folder.rmdir()
    assert (done.returncode, done.stderr) == (0, "")
    assert "results cannot be kept" in done.stdout


def test_a_store_that_cannot_be_made_is_said(tmp_path):
    with pytest.raises(OutputError, match="cannot be opened"):
        Store(tmp_path / "missing" / "kept")


def test_a_folder_that_goes_away_is_said(tmp_path):
    folder = tmp_path / "plan"
    folder.mkdir()
    store = Store(folder / "kept")
    store.put_many(many(2))
    folder.rename(tmp_path / "elsewhere")
    with pytest.raises(OutputError, match="there is no folder"):
        store.put("k", ONE)
    store.close()
    assert len(Store(tmp_path / "elsewhere" / "kept").get_many(["k0", "k1"])) == 2


def test_a_file_that_another_process_replaced_is_opened_anew(tmp_path, said):
    store = Store(tmp_path / "kept", said.append)
    store.put("old", ONE)
    for name in os.listdir(tmp_path):
        (tmp_path / name).rename(tmp_path / f"aside-{name}")
    store.put("new", ONE)
    store.close()
    again = Store(tmp_path / "kept")
    assert again.get("new")["a"] == 1
    assert again.get("old") is None
    assert said == []
