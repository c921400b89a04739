"""A part of the catalogue that is quick: error bars hold against outside values, and shrink with step and spacing.

The tolerance of every value is its own error bar. The whole catalogue: `python -m tests.truth.catalogue`.
"""

from __future__ import annotations

import pytest

from tests.truth.cases import CASES
from tests.truth.catalogue import LEVELS, SHRINKING, WANTED, figures, shrinking, table, votes

NAMED = {case.name: case for case in CASES}
QUICK = (
    "step below its top, in the middle",
    "barrier between walls",
    "stairs",
    "sech2 barrier",
    "Gaussian hill, in the middle",
    "Gaussian hill in a cage",
    "Gaussian hill, short layers of 5",
    "Gaussian hill, ends that leak",
    "Morse oscillator",
    "bouncing packet",
    "free packet",
    "squeezed state",
    "forced oscillator",
    "moved trap",
    "pumped oscillator",
    "cage",
    "arrival",
    "levels, bouncer",
    "spectrum, oscillator",
)


def test_bars_hold():
    """Sources: those of the cases."""
    found = [vote for name in QUICK for accuracy in (1e-2, 1e-3) for vote in votes(NAMED[name], accuracy)]
    reached = figures(found)
    missed = [v for v in found if v.standing == "counted" and not v.error <= v.bar]
    assert reached["values"] >= 60
    assert reached["coverage"] >= WANTED["coverage"], table(missed)
    assert reached["three bars"] >= WANTED["three bars"], table(missed)


@pytest.mark.parametrize("setting", SHRINKING, ids=lambda setting: setting[0])
def test_bars_shrink_with_step_and_spacing(setting):
    """Sources: those of the cases. From the first setting to the last the spacing halves and the step falls to a
    quarter: errors of the lowest order there is fall to a quarter, and so must bars. In between they may waver."""
    name, *rest = setting
    levels = [vote for _, _, vote in shrinking(NAMED[name], *rest)]
    assert all(vote.error <= vote.bar for vote in levels)
    assert levels[-1].bar < levels[0].bar / 4
    assert len(levels) == LEVELS


def test_enough_cases():
    """Common practice: at least forty values in twenty-five jobs, a fifth of the jobs under hard conditions."""
    assert len(CASES) >= 25
    assert sum(case.harsh != "" for case in CASES) >= len(CASES) / 5
    assert sum(len(case.outside()) for case in CASES) >= 40
