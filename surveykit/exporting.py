"""`surveykit netcdf`: one NetCDF file of a report's passes and surfaces."""

from __future__ import annotations

from pathlib import Path

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
    return write_netcdf(pipeline.all_tables(survey), folder.with_name(f"{folder.name}.nc"),
                        facts.collect(survey))
