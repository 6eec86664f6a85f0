"""What the quality stage looks at, and what it found so far."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from surveykit.accounting import BIT, CHECKS, Mask, counted
from surveykit.core import BoolArray, IntArray
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.footprints import sees_foreign_ground
from surveykit.intake.loggers import Records
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.params.quality import QualitySettings
from surveykit.intake.passes import Pass
from surveykit.intake.paths import turns
from surveykit.physics.sun import Sun

Masks = dict[str, dict[str, Mask]]
LIGHT = ("shortwave_down", "shortwave_up", "red_down", "red_up", "nir_down", "nir_up")
HEAT = ("brightness_temperature", "longwave_down", "longwave_up")
MAIN = (*LIGHT, *HEAT)
GROUND = ("brightness_temperature", "shortwave_up", "longwave_up", "red_up", "nir_up")
CLEAR_MAXIMUM = 0.99  # quantile of a head's readings that stands for its clear maximum


@dataclass
class Study:
    """Records, field sheet and passes; the checks noted; what was flagged, record by record.

    `flagged` holds, per logger and column, by flag, which records it concerns.
    """

    parameters: Parameters
    records: dict[str, Records]
    sheet: Sheet
    passes: tuple[Pass, ...]
    channels: dict[str, dict[str, Channel]]
    sun: dict[str, Sun]
    checks: list[dict[str, Any]] = field(default_factory=list)
    flagged: dict[tuple[str, str], dict[str, BoolArray]] = field(default_factory=dict)

    @property
    def every_channel(self) -> list[Channel]:
        """Return the channels of all loggers, in the order of the loggers."""
        return [channel for columns in self.channels.values() for channel in columns.values()]

    @property
    def quality(self) -> QualitySettings:
        """Return the settings of the checks."""
        return self.parameters.campaign.settings.quality

    def note(self, check: str, severity: str, message: str, source: str, *, logger: str = "",
             column: str = "", surface: str = "", pass_: str = "", records: int = 0) -> None:
        """Add a row to the table of checks."""
        self.checks.append({
            "campaign": self.parameters.campaign.campaign, "check": check, "logger": logger,
            "column": column, "surface": surface, "pass": pass_, "severity": severity,
            "records": records, "message": message, "source": source})

    def found(self, check: str, hit: BoolArray, mask: Mask, *, logger: str, column: str = "",
              told: bool = True) -> None:
        """Do what `accounting` decides where a check hits: set its bit in `mask`, or flag.

        Flagged records are told of pass by pass; excluded ones here, once a channel.
        """
        count = int(np.count_nonzero(hit))
        if not count:
            return
        reason = CHECKS[check]
        if reason.action == "flag":
            held = self.flagged.setdefault((logger, column), {})
            held[check] = held[check] | hit if check in held else hit
            return
        mask |= np.where(hit, BIT[check], np.uint32(0))
        if told:
            self.note(check, reason.action, f"{counted(count, 'record')}: {reason.sentence}",
                      reason.source, logger=logger, column=column, records=count)

    def off_patch(self, this: Pass, time_ns: IntArray) -> Mask:
        """Return the bits of times [ns UTC] at a pass's edges, in turns, or beside its patch."""
        edge = (time_ns < this.from_ns) | (time_ns >= this.to_ns)
        mask = np.where(edge, BIT["pass edge"], np.uint32(0))
        mask |= np.where(sees_foreign_ground(this, time_ns, self.parameters) & ~edge,
                         BIT["foreign ground in view"], np.uint32(0))
        if self.parameters.campaign.settings.passes.exclude_turns:
            mask |= np.where(turns(this, time_ns, self.parameters) & ~edge, BIT["turn"],
                             np.uint32(0))
        return mask.astype(np.uint32)

    def spans(self, channel: Channel, *kinds: str) -> list[tuple[int, int]]:
        """Return the written windows [ns] of the passes that a channel serves.

        `kinds` keeps those of these kinds or, where a pass has none, quantities.
        """
        return [(p.start_ns, p.stop_ns) for p in self.passes
                if (not kinds or (p.kind or p.quantity) in kinds)
                and any((c.logger, c.column) == (channel.logger, channel.column)
                        for c in p.channels.values())]
