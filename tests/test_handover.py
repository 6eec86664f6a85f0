"""What stages hand to one another on disk."""

from __future__ import annotations

import json

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from surveykit import core, handover

any_text = st.text(max_size=8).filter(lambda text: not text.endswith("\0"))
settings_ = settings(suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)


def frame_of(rows: int) -> pd.DataFrame:
    """Return a table with every kind of column."""
    return pd.DataFrame({
        "surface": pd.Series((["", "lawn", "Rasen, nass ü", "lawn"] * rows)[:rows], dtype=object),
        "start_utc": pd.to_datetime(np.arange(rows) * 10**15 + 1, utc=True).as_unit("ns"),
        "value": np.resize([np.nan, -0.0, np.inf, 0.1 + 0.2], rows),
        "records": np.arange(rows, dtype=np.int64) - 2**62,
        "file": np.arange(rows, dtype=np.int16),
        "used": np.arange(rows) % 2 == 0,
    })


@pytest.mark.parametrize("rows", [0, 1, 7])
def test_table_comes_back_exactly(tmp_path, rows):
    frame = frame_of(rows)
    handover.save_table(tmp_path / "t.npz", frame)
    back = handover.load_table(tmp_path / "t.npz")
    pd.testing.assert_frame_equal(back, frame, check_exact=True)
    assert np.array_equal(np.signbit(back["value"]), np.signbit(frame["value"]))


@pytest.mark.parametrize("name", core.TABLES)
def test_every_empty_table_of_the_contract_comes_back(tmp_path, name):
    frame = core.table(name, [])
    handover.save_table(tmp_path / "t.npz", frame)
    pd.testing.assert_frame_equal(core.require(handover.load_table(tmp_path / "t.npz"), name),
                                  frame, check_index_type=False)


@settings_
@given(st.lists(st.tuples(any_text, st.floats(), st.integers(-2**63, 2**63 - 1), st.booleans())))
def test_any_rows_come_back(tmp_path, rows):
    frame = pd.DataFrame(rows, columns=["text", "x/y", "n", "words text"])
    frame = frame.astype({"text": object, "x/y": "f8", "n": "i8", "words text": bool})
    handover.save_table(tmp_path / "t.npz", frame)
    pd.testing.assert_frame_equal(handover.load_table(tmp_path / "t.npz"), frame,
                                  check_exact=True, check_index_type=False)


@settings_
@given(st.dictionaries(any_text, arrays(np.float64, st.integers(0, 5)), max_size=4))
def test_any_arrays_come_back(tmp_path, given_):
    handover.save_arrays(tmp_path / "a.npz", given_)
    back = handover.load_arrays(tmp_path / "a.npz")
    assert list(back) == list(given_)
    for name, array in given_.items():
        assert np.array_equal(back[name], array, equal_nan=True)


def test_arrays_keep_kind_and_shape(tmp_path):
    # names that would collide with the writer's own arguments
    given_ = {"file": np.zeros((2, 0, 3), np.int8), "arr_0": np.array(["a", "", "bc"]),
              "t": np.array([0, 1], "datetime64[ns]"), "flag": np.array(True)}
    handover.save_arrays(tmp_path / "deep" / "a.npz", given_)
    back = handover.load_arrays(tmp_path / "deep" / "a.npz")
    for name, array in given_.items():
        assert (back[name].dtype, back[name].shape) == (array.dtype, array.shape)
        assert np.array_equal(back[name], array)


def test_facts_come_back_and_equal_facts_give_equal_bytes(tmp_path):
    facts = {"title": "Höfe", "seed": 1, "u": 0.1 + 0.2, "none": None, "list": [1, "", {"b": []}]}
    handover.save_facts(tmp_path / "a.json", facts)
    handover.save_facts(tmp_path / "b.json", dict(reversed(facts.items())))
    assert handover.load_facts(tmp_path / "a.json") == facts
    assert (tmp_path / "a.json").read_bytes() == (tmp_path / "b.json").read_bytes()
    assert list(json.loads((tmp_path / "a.json").read_bytes())) == sorted(facts)


def test_equal_tables_give_equal_bytes(tmp_path):
    for name in ("a.npz", "b.npz"):
        handover.save_table(tmp_path / name, frame_of(5))
    assert (tmp_path / "a.npz").read_bytes() == (tmp_path / "b.npz").read_bytes()


def test_nothing_needs_pickle(tmp_path):
    handover.save_table(tmp_path / "t.npz", frame_of(5))
    with np.load(tmp_path / "t.npz", allow_pickle=False) as held:
        assert not any(held[name].dtype.hasobject for name in held.files)


def test_a_stopped_writer_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "t.npz"
    handover.save_table(path, frame_of(3))
    before = path.read_bytes()

    def stop(file, *arrays):
        file.write(b"half")
        raise KeyboardInterrupt

    monkeypatch.setattr(np, "savez", stop)
    with pytest.raises(KeyboardInterrupt):
        handover.save_table(path, frame_of(5))
    assert path.read_bytes() == before
    assert [held.name for held in tmp_path.iterdir()] == ["t.npz"]


@pytest.mark.parametrize("column", [
    pd.Series(["a", None], dtype=object), pd.Series(["a", 1], dtype=object),
    pd.Series(["a", np.nan], dtype=object), pd.Series([{}, {}], dtype=object),
    pd.to_datetime(pd.Series(["2025-07-24", "2025-07-25"])),
    pd.Series([1, None], dtype="Int64"), pd.Series([1j, 2j]), pd.Series(["a\0", "b"]),
])
def test_what_is_no_column_of_ours_is_refused(tmp_path, column):
    with pytest.raises(TypeError, match="t.npz: column 'odd'"):
        handover.save_table(tmp_path / "t.npz", pd.DataFrame({"odd": column}))
    assert not list(tmp_path.iterdir())


def test_refusals(tmp_path):
    frame = frame_of(3)
    for odd in (frame.iloc[1:], pd.concat([frame, frame], axis=1), frame.set_index("surface")):
        with pytest.raises(ValueError, match="rows numbered from 0"):
            handover.save_table(tmp_path / "t.npz", odd)
    with pytest.raises(TypeError, match="array 'x' holds Python objects"):
        handover.save_arrays(tmp_path / "a.npz", {"x": np.array([None])})
    with pytest.raises(ValueError, match="JSON compliant"):
        handover.save_facts(tmp_path / "a.json", {"x": float("nan")})
    with pytest.raises(FileNotFoundError):
        handover.load_table(tmp_path / "none.npz")
    assert not list(tmp_path.iterdir())
