"""What is kept, bit by bit, and the keys under which it is kept."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from planner.scoring.rows import packed, unpacked
from planner.scoring.store import Digests, Store, digest_of, key_of

ONE = {"a": np.ones(1)}


KINDS = st.sampled_from(["<f8", ">f4", "?", "i1", "<i8", "u2", "c16", "<U3", "S2", "<M8[s]"])
ARRAYS = KINDS.flatmap(
    lambda kind: hnp.array_shapes(min_dims=0, max_dims=3, min_side=0, max_side=4).flatmap(
        lambda shape: (
            st.binary(
                min_size=(size := int(np.prod(shape)) * np.dtype(kind).itemsize), max_size=size
            ).map(lambda content: np.frombuffer(content, np.dtype(kind)).reshape(shape))
            if kind not in {"<U3", "?"}
            else hnp.arrays(np.dtype(kind), shape)
        )
    )
)  # any bytes: NaN with payloads, -0.0, infinities


@settings(max_examples=50)
@given(st.dictionaries(st.text(max_size=5), ARRAYS, max_size=4), st.text(max_size=70))
def test_every_bit_comes_back(arrays, key):
    back = unpacked(key, packed(key, arrays))
    assert list(back) == list(arrays)
    for name, array in arrays.items():
        assert (back[name].dtype, back[name].shape) == (array.dtype, array.shape)
        assert back[name].tobytes() == array.tobytes()
        assert back[name].flags.writeable


@given(st.integers(0, 10**6), st.integers(1, 255))
def test_a_changed_row_is_no_answer(place, change):
    row = bytearray(packed("k", {"a": np.arange(9.0), "b": np.zeros((2, 3), np.int8)}))
    row[place % len(row)] ^= change
    assert unpacked("k", bytes(row)) is None


@pytest.mark.parametrize("row", [None, 3, "text", b"", b"12345678", b"x" * 100])
def test_what_is_no_row_is_no_answer(row):
    assert unpacked("k", row) is None


def test_the_row_of_another_key_is_no_answer():
    assert unpacked("l", packed("k", ONE)) is None


@pytest.mark.parametrize(
    "array", [np.array([None]), np.zeros(2, [("a", float)])], ids=["object", "record"]
)
def test_what_cannot_be_kept_bit_by_bit_is_refused(tmp_path, array):
    with pytest.raises(TypeError, match="bad: arrays of"):
        Store(tmp_path / "kept").put("k", {"bad": array})


def test_a_usual_row_is_short():
    rng = np.random.default_rng(3)
    arrays = {f"some_name_{i}": np.zeros((1, 10)) for i in range(13)}
    for i in range(5):
        arrays[f"some_name_{i}"] = rng.random((1, 10))
    arrays["some_name_6"][:] = np.nan
    assert len(packed("k" * 64, arrays)) < 1000


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


def test_a_digest_stands_for_its_record(prospect):
    digests = Digests()
    (line,) = prospect.line
    assert digests.of(prospect) == digests.of(prospect) == digest_of(prospect)
    assert digests.of(replace(prospect)) == digests.of(prospect)
    assert digests.of(line) != digests.of(prospect)
    assert len({digests.of((float(i),)) for i in range(100)}) == 100  # short-lived records too


def test_a_store_without_a_file_keeps_nothing():
    store = Store(None)
    store.put("k", {"a": np.zeros(1)})
    assert store.get("k") is None
    store.close()
