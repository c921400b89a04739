"""Propagation: splittings, transforms, the hot loop, and the loop over recorded steps.

Names are found when first asked for: planning a job needs the tables here, but not the transforms.
"""

from importlib import import_module
from typing import Any

_HOMES = {
    "SPLITTINGS": "splittings",
    "Kick": "splittings",
    "PlanError": "splittings",
    "Splitting": "splittings",
    "Schedule": "schedule",
    "Control": "loop",
    "Outcome": "loop",
    "Output": "loop",
    "evolve": "loop",
    "go_on": "loop",
    "Stepper": "stepper",
    "plan": "stepper",
}
__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f".{_HOMES[name]}", __name__), name)
