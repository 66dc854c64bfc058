import os
from zlib import crc32

import numpy as np
import pytest

from planner.base.errors import InputError, OutputError, PlanError, Problem
from planner.base.files import MARK, claim_folder, replacing, write_bytes
from planner.base.seeds import stream


def test_streams_depend_on_every_word_and_on_nothing_else():
    draws = {
        stream(seed, stage, *key).random()
        for seed in (1, 2)
        for stage in ("weather", "lag")
        for key in (("a", 0), ("a", 1), ("b", 0))
    }
    assert len(draws) == 12
    assert stream(1, "lag", "a", 1).random() == stream(1, "lag", "a", 1).random()


def test_a_stream_is_the_child_that_numpy_would_spawn():
    parent = np.random.SeedSequence(5, spawn_key=(crc32(b"lag"),))
    child = np.random.Generator(np.random.PCG64(parent.spawn(4)[3]))
    assert child.random() == stream(5, "lag", 3).random()


def test_problem_reads_as_one_line():
    problem = Problem("c.yaml", 7, "streams.line.cadance", "unknown key", "`cadence`")
    assert str(problem) == "c.yaml:7: streams.line.cadance: unknown key; expected `cadence`"
    assert str(InputError([problem, problem])).count("\n") == 1


def test_every_error_carries_its_exit_status():
    assert [e.exit_status for e in (InputError, OutputError, PlanError)] == [2, 2, 1]


def test_a_failed_write_leaves_the_old_file_and_nothing_else(tmp_path):
    path = tmp_path / "table"
    write_bytes(path, b"old")
    with pytest.raises(RuntimeError), replacing(path) as temporary:
        temporary.write_bytes(b"half")
        raise RuntimeError
    assert path.read_bytes() == b"old"
    assert os.listdir(tmp_path) == ["table"]


def test_a_full_disk_is_said_in_one_sentence(tmp_path):
    path = tmp_path / "table"
    with (
        pytest.raises(OutputError, match=r"table: cannot be written: No space left"),
        replacing(path) as temporary,
    ):
        temporary.write_bytes(b"half")
        raise OSError(28, "No space left on device")
    assert os.listdir(tmp_path) == []


def test_a_new_folder_is_taken_and_an_interrupted_run_goes_on(tmp_path):
    folder = tmp_path / "new" / "plan"
    claim_folder(folder, "abc", replace=False)
    claim_folder(folder, "abc", replace=False)
    assert (folder / MARK).read_text() == "abc\n"


def test_another_plan_is_kept_unless_replaced(tmp_path):
    claim_folder(tmp_path, "abc", replace=False)
    with pytest.raises(OutputError, match="--replace"):
        claim_folder(tmp_path, "def", replace=False)
    claim_folder(tmp_path, "def", replace=True)


def test_a_folder_with_other_files_is_refused_even_with_replace(tmp_path):
    (tmp_path / "thesis.tex").write_text("years of work")
    with pytest.raises(OutputError, match=r"thesis\.tex"):
        claim_folder(tmp_path, "abc", replace=True)
    assert sorted(os.listdir(tmp_path)) == ["thesis.tex"]


def test_a_file_in_the_folders_place_is_refused(tmp_path):
    (tmp_path / "plan").write_text("")
    with pytest.raises(OutputError, match="cannot be used"):
        claim_folder(tmp_path / "plan", "abc", replace=False)
