"""Locks: who waits for whom, what a refused run takes away, one byte for all on every system."""

from __future__ import annotations

import errno
import os
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from types import SimpleNamespace

import pytest

from surveykit import locking
from surveykit.core import InputError
from surveykit.locking import locked


def soon(true, limit_s=20.0):
    limit = time.monotonic() + limit_s
    while not true() and time.monotonic() < limit:
        time.sleep(0.02)
    assert true()


def test_a_waiting_run_gets_its_turn_when_a_refused_one_takes_its_lock_away(tmp_path):
    """The refused run leaves nothing behind, not even .surveykit; the waiting one makes it anew."""
    said: list[str] = []

    def second():
        with locked(tmp_path, "yard", say=said.append):
            return (tmp_path / ".surveykit" / "yard.lock").is_file()

    def first():
        with locked(tmp_path, "yard"):
            waiting.append(pool.submit(second))
            soon(lambda: said)
            raise InputError("a fault")

    waiting: list = []
    with ThreadPoolExecutor(1) as pool:
        with pytest.raises(InputError, match="a fault"):
            first()
        assert waiting[0].result(timeout=30)


def test_who_is_waited_for_is_the_run_that_holds_the_lock_now(tmp_path):
    """A later campaign reads this one; the process that ran it last is long gone."""
    (tmp_path / ".surveykit").mkdir()
    (tmp_path / ".surveykit" / "june.lock").write_text("process 999999 on gone\n")
    said: list[str] = []

    def june():
        with locked(tmp_path, "june", say=said.append):
            return True

    with ThreadPoolExecutor(1) as pool:
        with locked(tmp_path, "july", ("june",)):
            again = pool.submit(june)
            soon(lambda: said)
        assert again.result(timeout=30)
    assert "999999" not in said[0]
    assert f"process {os.getpid()} on " in said[0]


def test_an_earlier_campaign_named_twice_is_locked_once(tmp_path, monkeypatch):
    """Where the system knows exclusive locks alone, the second would wait for the first."""
    taken = []
    real = locking._take
    monkeypatch.setattr(locking, "_take", lambda d, shared: (taken.append(shared),
                                                             real(d, shared))[1])
    with locked(tmp_path, "july", ("june", "june")):
        assert taken == [False, True]


def test_where_only_bytes_can_be_locked_everyone_locks_the_same_one(tmp_path, monkeypatch):
    """Not at the place in the file: it stands at the end of whatever the last holder wrote."""
    places: dict[int, int] = {}

    def lock(descriptor, mode, count):
        at = os.lseek(descriptor, 0, os.SEEK_CUR)
        if places and at in places.values():
            raise OSError(errno.EACCES, "held")
        places[descriptor] = at

    monkeypatch.setattr(sys, "platform", "win32")
    monkeypatch.setattr(locking, "msvcrt", SimpleNamespace(locking=lock, LK_NBLCK=2), raising=False)
    with locked(tmp_path, "yard") as own:
        with (tmp_path / ".surveykit" / "yard.lock").open("a+b") as other:
            assert not locking._take(other.fileno(), False)
            other.seek(0)
            assert other.read().startswith(b"process ")  # no byte of the text is locked
        assert places[own] > 1000
