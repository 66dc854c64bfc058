from dataclasses import replace

import numpy as np
import pytest

from planner.base.errors import OutputError
from planner.scoring import Store, key_of


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


def test_a_store_without_a_file_keeps_nothing():
    store = Store(None)
    store.put("k", {"a": np.zeros(1)})
    assert store.get("k") is None


@pytest.mark.parametrize(
    "content", [b"not a database" * 100, b"SQLite format 3\x00" + b"\xff" * 5000]
)
def test_a_damaged_store_is_set_aside(tmp_path, content):
    (tmp_path / "kept").write_bytes(content)
    store = Store(tmp_path / "kept")
    store.put("k", {"a": np.ones(1)})
    assert store.get("k")["a"] == 1
    assert (tmp_path / "kept.damaged").read_bytes() == content


def test_a_store_that_cannot_be_made_is_said(tmp_path):
    with pytest.raises(OutputError, match="cannot be opened"):
        Store(tmp_path / "missing" / "kept")


def test_the_key_depends_on_everything(prospect):
    (line,) = prospect.line
    changed = replace(line, flux_error=line.flux_error + 1e-12)
    keys = {
        key_of(1, prospect),
        key_of(2, prospect),
        key_of(1, replace(prospect, line=(changed,))),
        key_of(1, replace(prospect, seasons=())),
        key_of(1, replace(prospect, forecast=replace(prospect.forecast, lag_obs_d=12.25))),
    }
    assert len(keys) == 5


def test_equal_content_has_equal_keys(prospect):
    (line,) = prospect.line
    copy = replace(
        prospect,
        line=(replace(line, night=line.night.copy(), site="Rid" + "ge"),),
        forecast=replace(prospect.forecast),
    )
    assert key_of(prospect) == key_of(copy)
