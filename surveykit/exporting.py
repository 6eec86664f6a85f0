"""`surveykit netcdf`: one NetCDF file of a report's passes and surfaces."""

from __future__ import annotations

from pathlib import Path
from tempfile import TemporaryDirectory

from surveykit import facts, pipeline
from surveykit.intake.params import find_root
from surveykit.opening import open_file
from surveykit.report.netcdf import write_netcdf
from surveykit.verifying import params_file, verify


def export(folder: Path) -> Path:
    """Write reports/ID.nc from a report that still belongs to its inputs; return its path.

    Raises
    ------
    InputError
        If the report does not belong to its inputs, or the extra `netcdf` is not installed.
    """
    verify(folder)
    survey = open_file(find_root(folder) / params_file(folder))
    with TemporaryDirectory(prefix=f".{folder.name}.", dir=folder.parent) as aside:
        made = write_netcdf(pipeline.all_tables(survey), Path(aside) / f"{folder.name}.nc",
                            facts.collect(survey))
        return made.replace(folder.parent / made.name)
