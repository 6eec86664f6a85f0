"""Exit codes and messages of the commands where something is odd: names, folders, terminals."""

from __future__ import annotations

import os
import subprocess
import sys

import pytest
from small_campaigns import project, run_here, write
from small_survey import ALBEDO, DAY, KIT, lines, row, small

from surveykit import checking, cli, opening, packing, planner, runner
from surveykit.core import InputError

NAME = "yard-odd"
COMMANDS = (["run"], ["check"], ["verify"], ["netcdf"], ["pack"], ["plan"])


@pytest.fixture(scope="module")
def yard(tmp_path_factory):
    """A project with a finished report, in a folder whose name holds spaces and letters of ours."""
    folder = project(tmp_path_factory.mktemp("odd") / "über der Straße {1}", [NAME],
                     title="Hof über der Straße")
    code, text = run_here(folder, [NAME])
    assert code == 0, text
    return folder


def call(folder, *arguments, **environment):
    return subprocess.run([sys.executable, "-m", "surveykit.cli", *arguments], cwd=folder,
                          capture_output=True, check=False, env={**os.environ, **environment})


@pytest.mark.parametrize("number", ["0", "-1", "two", "1.5"])
def test_a_number_of_jobs_that_is_none_is_told_plainly(number, capsys):
    with pytest.raises(SystemExit) as caught:
        cli.main(["run", f"--jobs={number}", "params/yard.yml"])
    assert caught.value.code == 2
    told = capsys.readouterr().err
    assert f"--jobs: got '{number}'; write a whole number from 1 on" in told
    assert "_positive" not in told


def test_a_terminal_without_our_letters_gets_question_marks_not_a_traceback(yard):
    done = call(yard, "check", f"params/{NAME}.yml", PYTHONIOENCODING="ascii")
    assert done.returncode == 0, done.stderr
    assert b"Hof ?ber der Stra?e" in done.stdout


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
@pytest.mark.parametrize("name", ["params/absent.yml", "params", "no such/ort ä.yml"])
def test_a_name_that_is_no_file_is_the_users_fault(yard, command, name, monkeypatch, capsys):
    monkeypatch.chdir(yard)
    assert cli.main([*command, name]) == 2
    told = capsys.readouterr().err
    assert told.strip()
    assert "Traceback" not in told


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
def test_outside_any_project_every_command_says_so(command, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "a.yml").write_text("campaign: a\n", encoding="utf-8")
    assert cli.main([*command, "a.yml"]) == 2
    told = capsys.readouterr().err
    assert "no project folder" in told or "run.json: is missing" in told
    assert "Traceback" not in told


@pytest.mark.parametrize("command", [*COMMANDS, ["new"]], ids=" ".join)
def test_every_command_first_puts_back_an_old_report(yard, command, monkeypatch):
    """What a kill between the two steps of a swap leaves: the old one aside, none in its place."""
    monkeypatch.chdir(yard)
    (yard / "reports" / NAME).rename(yard / "reports" / f".{NAME}.old")
    cli.main([*command, "params/absent.yml"])
    assert (yard / "reports" / NAME / "report.html").is_file()


def test_what_lies_outside_may_be_verified_and_not_packed(tmp_path, monkeypatch, capsys):
    """The option that let a file in at the run does so at every later command."""
    folder = project(tmp_path / "project", [NAME])
    (folder / "data-of" / NAME).rename(tmp_path / "elsewhere")
    path = folder / "params" / f"{NAME}.yml"
    path.write_text(path.read_text(encoding="utf-8").replace(
        f"data_folder: data-of/{NAME}", "data_folder: ../elsewhere"), encoding="utf-8")
    monkeypatch.chdir(folder)
    monkeypatch.setenv("SURVEYKIT_ALLOW_OUTSIDE", "0")  # set by the option, put back by the test
    assert cli.main(["check", str(path)]) == 2
    assert cli.main(["check", "--allow-outside", str(path)]) == 0
    assert run_here(folder, [NAME])[0] == 0
    assert cli.main(["verify", "--allow-outside", f"reports/{NAME}"]) == 0
    capsys.readouterr()
    assert cli.main(["pack", "--allow-outside", str(path)]) == 2
    assert "../elsewhere/pair_0.csv: lies outside the project folder" in capsys.readouterr().err
    assert not (folder / "reports" / f"{NAME}.zip").exists()


def test_a_log_of_one_record_is_told_without_an_interval(tmp_path):
    log, kit = lines("pair"), {"pair": {k: v for k, v in KIT["pair"].items() if k != "interval_s"}}
    small(tmp_path, [row(**ALBEDO)], {"pair": [log[0], log[60]]}, kit=kit)
    (told,) = [line for line in checking.check(tmp_path / "params" / f"yard-{DAY}.yml")
               if "record" in line]
    assert told.startswith(f"  pair: 1 record in 1 file, {DAY} 12:00:59 to 12:00:59 UTC")


def test_a_full_disk_leaves_no_half_written_zip_or_plan(yard, monkeypatch, capsys):
    monkeypatch.chdir(yard)
    assert cli.main(["pack", f"params/{NAME}.yml"]) == 0
    before = (yard / "reports" / f"{NAME}.zip").read_bytes()

    def full(*arguments, **named):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(packing.zipfile.ZipFile, "writestr", full)
    assert cli.main(["pack", f"params/{NAME}.yml"]) == 1
    told = capsys.readouterr().err
    assert "No space left on device; make room or give access, then run again" in told
    assert (yard / "reports" / f"{NAME}.zip").read_bytes() == before
    assert not [p for p in (yard / "reports").iterdir() if p.name.startswith(".")]


def test_plan_says_what_a_stopped_kernel_or_a_full_disk_did(yard, monkeypatch, capsys):
    monkeypatch.chdir(yard)
    source = yard / "notebooks" / "00_plan.ipynb"
    before = source.read_text(encoding="utf-8")
    for words, told in (("raise OSError(28, 'No space left on device')", "No space left on device"),
                        ("import os; os.kill(os.getpid(), 9)", "the system stopped its kernel")):
        source.write_text(before.replace("made = planning.make(survey)", words), encoding="utf-8")
        assert cli.main(["plan", f"params/{NAME}.yml"]) == 1
        error = capsys.readouterr().err
        assert told in error
        assert "Traceback" not in error
        assert not [*(yard / "reports" / f"{NAME}.plan").glob("*")]
    source.write_text(before, encoding="utf-8")


def test_an_edited_page_template_makes_results_old(tmp_path, monkeypatch):
    """The key of a run covers whatever the package brings, not its modules alone."""
    (tmp_path / "page.py").write_text("pass")
    (tmp_path / "prose.toml").write_text("a = 1")
    (tmp_path / "__pycache__").mkdir()
    monkeypatch.setattr(opening, "__file__", str(tmp_path / "opening.py"))
    first = opening.code_digest.__wrapped__()
    (tmp_path / "__pycache__" / "page.pyc").write_text("x")
    assert opening.code_digest.__wrapped__() == first
    (tmp_path / "prose.toml").write_text("a = 2")
    assert opening.code_digest.__wrapped__() != first


def test_a_report_whose_earlier_campaign_changed_does_not_stand(tmp_path):
    """August compares with July, July with June: when June's sheet changes, July is run again."""
    folder = project(tmp_path / "project", [])
    for name, date, earlier in (("june", "2025-06-11", []), ("july", "2025-07-11", ["june"]),
                                ("august", "2025-08-11", ["july"])):
        write(folder, name, date=date, comparison={
            "earlier": [f"params/{one}.yml" for one in earlier], "control": "court"})
    assert run_here(folder, ["june", "july", "august"])[0] == 0
    july = opening.open_file(folder / "params" / "july.yml")
    assert runner.up_to_date(july)
    sheet = folder / "data-of" / "june" / "sheet.csv"
    sheet.write_text(sheet.read_text(encoding="utf-8") + "\n", encoding="utf-8")
    assert not runner.up_to_date(july)
    code, text = run_here(folder, ["august"])
    assert code == 0, text
    assert [line.split()[1] for line in text.splitlines() if line.startswith("  j")] == [
        "done", "done"]


def test_a_campaign_may_not_bear_a_name_that_some_systems_keep(yard):
    for name in ("con", "nul", "com1"):
        done = call(yard, "new", name)
        assert done.returncode == 2
        assert b"is a device on some systems" in done.stderr
        assert not (yard / "params" / f"{name}.yml").exists()


def test_new_leaves_nothing_half_written(yard, monkeypatch):
    from surveykit import starting

    monkeypatch.setattr(starting, "COLUMNS", ("entry", "\ud800"))  # the second file fails
    with pytest.raises(UnicodeEncodeError):
        starting.start("half", yard)
    assert not [p for p in yard.rglob("*half*") if p.is_file()]


def test_a_notebook_without_its_parameters_cell_is_refused(yard):
    source = yard / "notebooks" / "00_plan.ipynb"
    before = source.read_text(encoding="utf-8")
    source.write_text(before.replace('"parameters"', '"other"'), encoding="utf-8")
    with pytest.raises(InputError, match=r"00_plan\.ipynb: its parameters cell lacks params_file"):
        planner.plan(yard / "params" / f"{NAME}.yml")
    source.write_text(before, encoding="utf-8")
