"""Clocks: from each logger's own time to the campaign's, with evidence or not at all.

Truth is UTC. A clock is declared, found from covers or from another logger's readings, or refused;
a refused clock takes its records out of every product and says why. `setting` decides for each
logger how its clock is set and is all that others call; `clock` holds the outcome. On the way,
`stretches` parts the records where the clock was set anew, `signals` picks readings that can tell
a time, `covers` sees covers in them, `finding` makes a clock of these, and `checking` holds every
clock against the sun, the other clocks and the date. `evidence` puts it in frames for the figures.
"""

from __future__ import annotations

from surveykit.intake.clocks.checking import check_days
from surveykit.intake.clocks.clock import REFUSED, Clock, Event, Piece
from surveykit.intake.clocks.setting import set_clock, set_clocks

__all__ = ["REFUSED", "Clock", "Event", "Piece", "check_days", "set_clock", "set_clocks"]
