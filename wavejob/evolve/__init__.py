"""Propagation: splittings, transforms, the hot loop, and the loop over recorded steps."""

from .loop import Control, Outcome, Output, Schedule, evolve, go_on
from .splittings import SPLITTINGS, Kick, PlanError, Splitting
from .stepper import Stepper, plan

__all__ = [
    "SPLITTINGS",
    "Control",
    "Kick",
    "Outcome",
    "Output",
    "PlanError",
    "Schedule",
    "Splitting",
    "Stepper",
    "evolve",
    "go_on",
    "plan",
]
