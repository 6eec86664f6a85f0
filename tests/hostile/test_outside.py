"""Nothing outside the project folder is read, unless the user says so on the command line."""

import pytest
from small_campaigns import project, run_here, whole, write

from surveykit.checking import check
from surveykit.core import InputError
from surveykit.opening import open_file

NAME = "yard-outside"
SECRET = "time,sky,ground\nTOP SECRET,1,2\n"


@pytest.fixture
def place(tmp_path):
    """A project, and a folder beside it with what it must not read."""
    folder = project(tmp_path / "project", [])
    path = write(folder, NAME)
    beside = tmp_path / "beside"
    beside.mkdir()
    for name in ("pair_0.csv", "sheet.csv", "kit.yml", "other.yml"):
        (beside / name).write_text(SECRET, encoding="utf-8")
    return folder, path, beside


def edited(path, old, new):
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new), encoding="utf-8")


CASES = {
    "absolute folder": ("data_folder: data-of/yard-outside", "data_folder: {beside}"),
    "folder above": ("data_folder: data-of/yard-outside", "data_folder: ../beside"),
    "home": ("data_folder: data-of/yard-outside", "data_folder: ~/x"),
    "sheet above": ("field_sheet: sheet.csv", "field_sheet: ../../../beside/sheet.csv"),
    "log above": ("files: pair_*.csv", "files: ../../../beside/pair_*.csv"),
    "absolute log": ("files: pair_*.csv", "files: {beside}/pair_0.csv"),
    "earlier above": (
        "conditions:\n", "comparison: {{earlier: [../beside/other.yml]}}\nconditions:\n"),
    "linked folder": ("data_folder: data-of/yard-outside", "data_folder: linked"),
    "linked sheet": ("field_sheet: sheet.csv", "field_sheet: linked.csv"),
    "linked log": ("files: pair_*.csv", "files: linked*.csv"),
}


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("read", [open_file, check])
def test_what_leads_out_is_refused_and_nothing_of_it_told(place, case, read):
    folder, path, beside = place
    (folder / "linked").symlink_to(beside)
    (folder / "data-of" / NAME / "linked.csv").symlink_to(beside / "pair_0.csv")
    old, new = CASES[case]
    edited(path, old, new.format(beside=beside))
    with pytest.raises(InputError) as refused:
        read(path)
    text = "\n".join(refused.value.faults)
    assert "project folder" in text
    assert "SECRET" not in text


def test_the_option_lets_a_file_lie_outside(place, monkeypatch):
    folder, path, beside = place
    for file in (folder / "data-of" / NAME).iterdir():
        (beside / file.name).write_text(file.read_text(encoding="utf-8"), encoding="utf-8")
    edited(path, "data_folder: data-of/yard-outside", "data_folder: ../beside")
    monkeypatch.setenv("SURVEYKIT_ALLOW_OUTSIDE", "1")
    code, text = run_here(folder, [NAME])
    assert code == 0, text
    whole(folder, NAME)
    page = (folder / "reports" / NAME / "report.html").read_text(encoding="utf-8")
    assert "../beside/pair_0.csv" in page
    assert str(beside) not in page
