"""One campaign's parameters: the model of the file, and what loading it gives."""

from __future__ import annotations

import os
from collections.abc import Hashable
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, Literal, get_args

from pydantic import Discriminator, Field, Tag

from surveykit.intake.params.base import (
    DATE_WRITE,
    TEXT_WRITE,
    DateText,
    Fault,
    Initials,
    Name,
    Notes,
    Strict,
    Text,
    key,
    twice,
)
from surveykit.intake.params.channels import Channel
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.sections import (
    Comparison,
    Conditions,
    Intervention,
    LoggerUse,
    RelevantChange,
    Site,
    Surface,
)
from surveykit.intake.params.settings import Settings
from surveykit.intake.params.timekeeping import Watch

CAMPAIGN_PATTERN = r"^[a-z0-9][a-z0-9-]{0,63}$"


Product = Literal["sri", "net_radiation", "longwave_up", "surface_minus_air",
                  "vegetation_fraction", "savi", "daily_albedo"]


class Caution(Strict):
    """A limit that the user enters with its source; the report never calls anything safe."""

    temperature_degC: float = key(  # noqa: N815 - the unit is written so
        "The temperature.", ge=30, le=120, write="a number from 30 to 120, in degC")
    source: Text = key("Where it comes from, with its edition.",
                       write="the standard or rule it comes from, plain text")


def _spelling(data: Any) -> Hashable:
    return "<inline>" if isinstance(data, dict) else "<path>"


Kit = Annotated[dict[Name, Instrument], Field(min_length=1)]


class Campaign(Strict):
    """Parameters of one campaign: one survey day at a site."""

    format: Literal[1] = key("Format of this file.", default=1,
                             write="1, the format this surveykit reads")
    campaign: str = key("Its name, the file's name without .yml.", pattern=CAMPAIGN_PATTERN,
                        write="lower-case letters, digits and -, at most 64, as the file's name")
    title: Text = key("Title of the report.", write=TEXT_WRITE)
    date: DateText = key("Day of the survey at the site.", write=DATE_WRITE)
    site: Site = key("The site.", write="{name, latitude, longitude, elevation_m, time_zone}")
    instruments: Annotated[
        Annotated[Text, Tag("<path>")] | Annotated[Kit, Tag("<inline>")],
        Discriminator(_spelling)] = key(
        "The kit: a file, from the project folder, or its entries here.",
        write="the path of the kit, such as params/instruments.yml")
    data_folder: Text = key("Folder of the raw files, from the project folder.",
                            write="a path such as data/mill-yard-2025-07-24")
    field_sheet: Text = key("The field sheet, in data_folder.",
                            write="a file name such as field_sheet.csv")
    loggers: dict[Name, LoggerUse] = key(
        "Files and clock of each logger used.", min_length=1,
        write="at least one logger: its name in the kit, then {files, clock}")
    surfaces: dict[Name, Surface] = key(
        "The surfaces surveyed.", min_length=1,
        write="at least one surface: its name, then {label, emissivity, around}")
    conditions: Conditions = key("The weather as noted.", default_factory=Conditions,
                                 write="{sky, rain_48h_mm}")
    settings: Settings = key("Defaults of the method that are changed.",
                             default_factory=Settings, write="keys of the settings")
    comparison: Comparison = key("Comparison with earlier campaigns.",
                                 default_factory=Comparison,
                                 write="{earlier, control, relevant_change}")
    interventions: Annotated[tuple[Intervention, ...], Field(strict=False)] = key(
        "What was done to surfaces, and when.", default=(), write="a list of {date, surface, text}")
    watch: Watch = key("The clock of the field sheet.", default={}, validate_default=True,
                       write="{offset_s, u_s}")
    crew: Annotated[tuple[Initials, ...], Field(strict=False, max_length=40)] = key(
        "Initials of those who did the survey.", default=(), write="a list such as [AB, CD]")
    notes: Notes = key("What else a reader should know of the day.", default="",
                       write="plain text, up to 2000 characters")

    derived: Annotated[tuple[Product, ...], Field(strict=False)] = key(
        "What is to be derived from the measured quantities.", default=(),
        write="a list of some of " + ", ".join(get_args(Product)))
    caution: Caution | None = key(
        "A surface temperature from which the report cautions.", default=None,
        write="{temperature_degC, source}")

    def faults(self) -> list[Fault]:
        """What is to be derived is named once."""
        return twice(("derived",), self.derived, "product")

    @property
    def relevant_change(self) -> RelevantChange:
        """The smallest differences that matter."""
        return self.comparison.relevant_change


@dataclass(frozen=True)
class Parameters:
    """A campaign's parameters, checked, with its kit.

    `files` are the parameter file and the kit file, for hashing; `notes` say what is worth
    knowing but no fault, such as a calibration that has run out.
    """

    path: Path
    root: Path
    campaign: Campaign
    kit: dict[str, Instrument]
    kit_path: Path | None
    files: tuple[Path, ...]
    notes: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        """The campaign's name."""
        return self.campaign.campaign

    def relative(self, path: Path) -> str:
        """Return how a file of the project is called on the page: from the project folder."""
        return Path(os.path.relpath(path.resolve(), self.root.resolve())).as_posix()

    @property
    def settings(self) -> Settings:
        """The campaign's settings."""
        return self.campaign.settings

    @property
    def data_folder(self) -> Path:
        """Folder of the raw files."""
        return self.root / self.campaign.data_folder

    @property
    def sheet_path(self) -> Path:
        """The field sheet."""
        return self.data_folder / self.campaign.field_sheet

    @property
    def earlier(self) -> tuple[Path, ...]:
        """Parameter files of the earlier campaigns."""
        return tuple(self.root / text for text in self.campaign.comparison.earlier)

    def channels(self, logger: str) -> tuple[Channel, ...]:
        """Return the channels of one logger, defaults from the campaign's settings.

        Raises
        ------
        KeyError
            If the kit has no such logger.
        """
        return self.kit[logger].channels(logger, self.settings)
