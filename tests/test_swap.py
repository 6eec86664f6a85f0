"""The swap of report folders, stopped at each of its steps on purpose."""

import errno
import os
import stat

import pytest

from surveykit import swap
from surveykit.cli import main
from surveykit.locking import locked


@pytest.fixture
def reports(tmp_path):
    for name, text in (("yard", "old"), (".yard.new", "new")):
        (tmp_path / name).mkdir()
        (tmp_path / name / "report.html").write_text(text)
    return tmp_path


def names(folder):
    return sorted(p.name for p in folder.iterdir())


def content(folder):
    return (folder / "yard" / "report.html").read_text()


@pytest.mark.parametrize("offered", [True, False])
def test_the_new_folder_takes_the_place_of_the_old(reports, offered, monkeypatch):
    if not offered:
        monkeypatch.setattr(swap, "exchange", lambda a, b: False)
    swap.swap_in(reports, "yard")
    assert names(reports) == ["yard"]
    assert content(reports) == "new"


def test_the_first_report_needs_no_old_one(reports):
    (reports / "yard" / "report.html").unlink()
    (reports / "yard").rmdir()
    swap.swap_in(reports, "yard")
    assert content(reports) == "new"


class Stop(BaseException):
    """Stands for kill -9: nothing of the process's own runs after it."""


@pytest.mark.parametrize("offered", [True, False])
@pytest.mark.parametrize("step", [0, 1, 2])
def test_a_stop_at_any_step_leaves_a_whole_report(reports, offered, step, monkeypatch):
    if not offered:
        monkeypatch.setattr(swap, "exchange", lambda a, b: False)
    calls = {"n": 0}

    def stopping(real):
        def call(*arguments, **named):
            if calls["n"] == step:
                raise Stop
            calls["n"] += 1
            return real(*arguments, **named)
        return call

    monkeypatch.setattr(os, "rename", stopping(os.rename))
    monkeypatch.setattr(swap.shutil, "rmtree", stopping(swap.shutil.rmtree))
    finished = False
    try:
        swap.swap_in(reports, "yard")
        finished = True
    except Stop:
        pass
    assert not finished or calls["n"] <= step
    monkeypatch.undo()
    swap.heal(reports, "yard")
    assert content(reports) in ("old", "new")
    assert ".yard.old" not in names(reports)


def test_a_refused_rename_keeps_both_folders_and_says_where(reports, monkeypatch):
    monkeypatch.setattr(swap, "exchange", lambda a, b: False)

    def refuse(*arguments):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(os, "rename", refuse)
    with pytest.raises(swap.SwapError, match=r"\.yard\.new"):
        swap.swap_in(reports, "yard")
    monkeypatch.undo()
    assert content(reports) == "old"
    assert (reports / ".yard.new" / "report.html").read_text() == "new"


def test_every_command_heals_what_a_stopped_swap_left(project):
    """Old aside and none in place is put back before `verify` looks; a campaign under way waits."""
    aside = project / "reports" / ".yard.old"
    aside.mkdir(parents=True)
    (aside / "report.html").write_text("old", encoding="utf-8")
    (project / ".surveykit").mkdir(exist_ok=True)
    with locked(project, "yard"):
        assert main(["verify", str(project / "reports" / "yard")]) == 2
        assert aside.exists()
    assert main(["verify", str(project / "reports" / "yard")]) == 2  # no run.json: incomplete
    assert not aside.exists()
    assert (project / "reports" / "yard" / "report.html").read_text(encoding="utf-8") == "old"


def test_all_is_on_the_disk_before_the_folders_change_places(reports, monkeypatch):
    order = []
    real_sync, real_rename = os.fsync, os.rename
    monkeypatch.setattr(os, "fsync", lambda d: (order.append("sync"), real_sync(d))[1])
    monkeypatch.setattr(swap, "exchange", lambda a, b: False)
    monkeypatch.setattr(os, "rename", lambda a, b: (order.append("rename"), real_rename(a, b))[1])
    files = sum(1 for _ in (reports / ".yard.new").rglob("*"))
    swap.swap_in(reports, "yard")
    assert order == ["sync"] * (files + 1) + ["rename", "rename"]


def test_a_storage_that_cannot_sync_folders_still_takes_the_report(reports, monkeypatch):
    """Network folders answer fsync of a folder with EINVAL; for a file it is a fault."""
    real = os.fsync

    def sync(descriptor):
        if stat.S_ISDIR(os.fstat(descriptor).st_mode):
            raise OSError(errno.EINVAL, "Invalid argument")
        real(descriptor)

    monkeypatch.setattr(os, "fsync", sync)
    swap.swap_in(reports, "yard")
    assert content(reports) == "new"


def test_after_the_exchange_no_failure_says_that_the_old_one_still_stands(reports):
    """An aside that cannot be taken away must not turn a finished report into a failed one."""
    if not swap.exchange(reports / "yard", reports / ".yard.new"):
        pytest.skip("no exchange of folders here")
    swap.exchange(reports / "yard", reports / ".yard.new")
    (reports / ".yard.old").write_text("in the way")
    swap.swap_in(reports, "yard")
    assert content(reports) == "new"
