"""When outputs see the state, what ends a run, and that a resumed run is the same run."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import dataclass, field

import numpy as np
import pytest

from tests.evolve.test_order import AXIS, X, driven, static, tent
from wavejob.evolve import SPLITTINGS, Outcome, Schedule, Stepper, evolve, plan
from wavejob.grid import Grid
from wavejob.hamiltonian import Hamiltonian, Part
from wavejob.problems import RunError
from wavejob.state import Look


@dataclass
class Watcher:
    schedule: Schedule
    seen: list[int] = field(default_factory=list)
    times: list[float] = field(default_factory=list)

    def see(self, look: Look) -> None:
        self.seen.append(look.n)
        self.times.append(look.t)


def stepper(**options: object) -> Stepper:
    hamiltonian = Hamiltonian(Grid((AXIS,)), (1.0,), (static(), driven()), tent(AXIS, 32, 2.0))
    psi0 = np.exp(-((X + 4) ** 2) / 4 + 1.5j * X)
    return plan(hamiltonian, SPLITTINGS["chin_4a"], 0.1, psi0, start=-2.0, **options)


def test_outputs_see_every_due_step_once():
    """Both schedules, the last step included though 20 is no multiple of 6 or 7."""
    often, seldom = Watcher(Schedule(6, 20)), Watcher(Schedule(7, 20))
    assert evolve(stepper(), steps=20, outputs=[often, seldom]) == Outcome(20)
    assert often.seen == [0, 6, 12, 18, 20]
    assert seldom.seen == [0, 7, 14, 20]
    assert often.times == [-2.0 + n * 0.1 for n in often.seen]


def test_two_outputs_share_one_look():
    """Derived quantities are computed once for all that look."""
    looks: list[Look] = []

    class Keeper:
        schedule = Schedule(5, 5)

        def see(self, look: Look) -> None:
            looks.append(look)

    evolve(stepper(), steps=5, outputs=[Keeper(), Keeper()])
    assert [look.n for look in looks] == [0, 0, 5, 5]
    assert looks[0] is looks[1]
    assert looks[2].amplitudes is looks[3].amplitudes


def test_control_ends_the_run_and_every_output_sees_the_end():
    often, seldom = Watcher(Schedule(2, 100)), Watcher(Schedule(50, 100))
    outcome = evolve(
        stepper(), steps=100, outputs=[often, seldom], control=lambda look: "enough" if look.n >= 6 else None
    )
    assert outcome == Outcome(6, "enough")
    assert often.seen == [0, 2, 4, 6]
    assert seldom.seen == [0, 6]


def test_a_resumed_run_has_the_same_bits():
    """Checkpoints fall on recorded steps, where the step is complete: nothing else needs to be kept."""
    through = stepper(reproducible=True)
    evolve(through, steps=20, outputs=[Watcher(Schedule(5, 20))])
    half = stepper(reproducible=True)
    evolve(half, steps=10, outputs=[Watcher(Schedule(5, 20))])
    resumed, watcher = stepper(reproducible=True), Watcher(Schedule(5, 20))
    resumed.psi[...] = half.psi
    for name, taken in half.absorbed.items():
        resumed.absorbed[name][...] = taken
    evolve(resumed, steps=20, first=10, outputs=[watcher])
    assert watcher.seen == [15, 20]
    np.testing.assert_array_equal(resumed.psi, through.psi)
    assert {name: taken.tolist() for name, taken in resumed.absorbed.items()} == {
        name: taken.tolist() for name, taken in through.absorbed.items()
    }


def test_a_run_that_is_finished_does_nothing():
    watcher = Watcher(Schedule(5, 10))
    assert evolve(stepper(), steps=10, first=10, outputs=[watcher]) == Outcome(10)
    assert watcher.seen == []


def test_non_finite_values_stop_the_run():
    part = Part("position", lambda _: np.where(np.abs(X) < 1, np.inf, 0.0))
    with np.errstate(invalid="ignore"):
        broken = plan(Hamiltonian(Grid((AXIS,)), (1.0,), (part,)), SPLITTINGS["strang"], 0.1, np.exp(-(X**2)) + 0j)
        with pytest.raises(RunError, match=r"no longer finite at step 4 \(time 0\.4\)"):
            evolve(broken, steps=8, outputs=[Watcher(Schedule(4, 8))])


BITS = """
import hashlib
from tests.evolve.test_loop import stepper
made = stepper(reproducible=True)
made.advance(0, 50)
print(hashlib.sha256(made.psi.tobytes()).hexdigest())
"""


def test_reproducible_gives_the_same_bits_in_fresh_processes():
    """Measured plans differ from process to process at rounding level; estimated ones do not."""
    runs = [subprocess.run([sys.executable, "-c", BITS], capture_output=True, text=True, check=True) for _ in "ab"]
    assert runs[0].stdout == runs[1].stdout != ""
