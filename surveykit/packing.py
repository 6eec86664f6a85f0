"""`surveykit pack`: one zip from which the same report is made elsewhere."""

from __future__ import annotations

import zipfile
from collections.abc import Mapping
from importlib.metadata import version
from pathlib import Path
from typing import BinaryIO

from surveykit.core import InputError
from surveykit.handover import save_whole
from surveykit.opening import open_file
from surveykit.verifying import verify

OLDEST = (1980, 1, 1, 0, 0, 0)  # a zip's first date: the same bytes whenever it is packed
READ_ME = """\
{title}
Campaign {name}, packed by surveykit {version}.

reports/{name}/report.html is the report; it opens in any browser, without a network.
To make it again: install surveykit {version} (constraints.txt holds the versions it was tested
with), unpack this file into a folder of its own, and there
    surveykit verify reports/{name}
    surveykit run params/{name}.yml
"""


def pack(path: Path) -> Path:
    """Write reports/ID.zip and return its path.

    It holds the parameter files, kits, field sheets and logs of the campaign and of the earlier
    ones it names, the notebooks, constraints.txt, and the report folder. Equal contents give an
    equal file.

    Raises
    ------
    InputError
        If the report is missing or does not belong to its inputs, or these lie outside the project.
    """
    survey = open_file(path)
    root, name = survey.parameters.root, survey.campaign.campaign
    report = root / "reports" / name
    if not report.is_dir():
        raise InputError(f"reports/{name}: there is no report to pack; first: surveykit run "
                         f"{survey.inputs[0]['path']}")
    verify(report)
    listed = [survey, *(open_file(earlier) for earlier in survey.parameters.earlier)]
    inputs = sorted({str(item["path"]) for one in listed for item in one.inputs})
    outside = [path for path in inputs if path.startswith("..")]
    if outside:
        raise InputError(*(f"{path}: lies outside the project folder and cannot be packed; copy it "
                           "into the project" for path in outside))
    files = {*(root / path for path in inputs), *(root / "notebooks").glob("*.ipynb"),
             *(p for p in report.rglob("*") if p.is_file() and ".ipynb_checkpoints" not in p.parts)}
    constraints = root / "constraints.txt"
    if constraints.is_file():
        files.add(constraints)
    target = report.with_name(f"{name}.zip")
    contents: dict[str, Path | bytes] = {p.relative_to(root).as_posix(): p for p in files}
    contents["README.txt"] = READ_ME.format(
        title=survey.campaign.title, name=name, version=version("surveykit")).encode()
    save_whole(target, lambda file: _zip(file, contents))
    return target


def _zip(file: BinaryIO, contents: Mapping[str, Path | bytes]) -> None:
    with zipfile.ZipFile(file, "w") as packed:
        for inside in sorted(contents):
            entry = zipfile.ZipInfo(inside, OLDEST)
            entry.external_attr = 0o644 << 16
            entry.compress_type = zipfile.ZIP_DEFLATED
            held = contents[inside]
            packed.writestr(entry, held if isinstance(held, bytes) else held.read_bytes())
