"""Clocks: from each logger's own time to the campaign's, with evidence or not at all.

Truth is UTC. A clock is declared, found from covers (`covers`), from another logger's readings
(`finding`), or refused; declared ones are checked against the sun and against each other
(`checking`). A refused clock takes its records out of every product and says why.
"""

from __future__ import annotations

from surveykit.intake.clocks.clock import REFUSED, Clock, Event, Piece
from surveykit.intake.clocks.days import check_days
from surveykit.intake.clocks.setting import set_clock, set_clocks

__all__ = ["REFUSED", "Clock", "Event", "Piece", "check_days", "set_clock", "set_clocks"]
