"""Parameter files: strict reading, models, located messages, cross checks and their schema."""

from surveykit.intake.params.amounts import Amount, Uncertain
from surveykit.intake.params.campaign import Campaign, Parameters
from surveykit.intake.params.channels import Channel
from surveykit.intake.params.heads import Calibration
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.loading import (
    is_kit_file,
    load,
    load_kit,
    read_plain,
    refuse_other_sections,
)
from surveykit.intake.params.partly import is_kit
from surveykit.intake.params.paths import find_root
from surveykit.intake.params.schema import campaign_schema, instruments_schema, write_schemas
from surveykit.intake.params.sections import LoggerUse
from surveykit.intake.params.settings import SettingRow, Settings
from surveykit.intake.params.timekeeping import Clock, Watch

__all__ = [
    "Amount", "Calibration", "Campaign", "Channel", "Clock", "Instrument", "LoggerUse",
    "Parameters", "SettingRow", "Settings", "Uncertain", "Watch", "campaign_schema", "find_root",
    "instruments_schema", "is_kit", "is_kit_file", "load", "load_kit",
    "read_plain", "refuse_other_sections", "write_schemas",
]
