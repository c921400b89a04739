"""What one run can judge about itself, and whether it met its expectations."""

from __future__ import annotations

import math

import numpy as np

from .grid import fast_size
from .job import Job
from .plan import Plan
from .points import wave_numbers
from .recording import Watch
from .results import Check, Judgement, Result, Verdict
from .settings import ExpectKeys

ROUNDING = {"double": 2.3e-16, "single": 1.2e-7}
EDGE_LIMIT = 1e-6
HEAD_ROOM_LIMIT = 1e-6
REFLECTION_LIMIT = 1e-5
RESOLVED = 0.9


def judge_run(plan: Plan, watch: Watch, steps: int) -> list[Check]:
    """All checks of one run of `steps` steps."""
    checks = [_norm(plan, watch, steps), _resolved(plan), _head_room(plan, watch)]
    if plan.hamiltonian.parts or plan.hamiltonian.layers:  # a step of free flight is exact, however long
        checks.append(_phase(plan))
    if _wraps_by_default(plan):
        checks.append(_edges(plan, watch))
    checks += [_reflection(plan, index) for index in range(len(plan.endings))]
    return checks


def _norm(plan: Plan, watch: Watch, steps: int) -> Check:
    rounding = ROUNDING[plan.job.evolve.precision]
    limit = 10 * rounding * (100 + steps * plan.splitting.stages)
    passed = watch.norm_drift <= limit
    return Check(
        "norm",
        passed,
        watch.norm_drift,
        limit,
        "every step keeps norm + absorbed to rounding: ten rounding errors a transform pair",
        "" if passed else "set `evolve.precision: double`",
    )


def _resolved(plan: Plan) -> Check:
    reach = float(np.max(np.abs(wave_numbers(plan.axis, plan.psi)[0]))) / plan.axis.k_max
    passed = reach <= RESOLVED
    points = fast_size(math.ceil(plan.axis.points * reach / RESOLVED))
    return Check(
        "packet resolved",
        passed,
        reach,
        RESOLVED,
        "largest wave number of the initial state over the largest that the points hold",
        "" if passed else f"set `grid.x.points: {points}`",
    )


def _head_room(plan: Plan, watch: Watch) -> Check:
    passed = watch.head_room <= HEAD_ROOM_LIMIT
    points = 2 ** math.ceil(math.log2(plan.axis.points * 1.25))
    return Check(
        "momentum head-room",
        passed,
        watch.head_room,
        HEAD_ROOM_LIMIT,
        "probability beyond 0.8 of the largest wave number comes back as its alias",
        "" if passed else f"set `grid.x.points: {points}`",
    )


def _phase(plan: Plan) -> Check:
    phase = plan.kinetic_phase
    passed = phase <= math.pi * (1 + 1e-9)
    step = plan.job.write(plan.step * math.pi / phase, "time")
    return Check(
        "phase per step",
        passed,
        phase,
        math.pi,
        "beyond a kinetic phase of pi a step, errors no longer shrink with the step",
        "" if passed else f"set `evolve.step` to at most {step}, or leave it out",
    )


def _wraps_by_default(plan: Plan) -> bool:
    """An edge that the job asks to wrap may be crossed; one that wraps because nothing was said may not."""
    keys = plan.job.keys
    return "edges" not in keys.model_fields_set and plan.axis.transform == "periodic"


def _edges(plan: Plan, watch: Watch) -> Check:
    passed = watch.edge <= EDGE_LIMIT
    depth = plan.job.write(plan.axis.length / 8, "length")
    return Check(
        "edge leakage",
        passed,
        watch.edge,
        EDGE_LIMIT,
        "probability in the outermost hundredth of the grid comes in again at the other end",
        ""
        if passed
        else f"set `edges: {{x: {{absorb: {depth}}}}}`, or extend the grid, or say `edges: {{x: wrap}}` if it is meant",
    )


def _reflection(plan: Plan, index: int) -> Check:
    ending = plan.endings[index]
    predicted = ending.shape.reflected
    passed = predicted <= REFLECTION_LIMIT
    if math.isfinite(ending.recommended):
        cure = f"set `absorb: {plan.job.write(ending.recommended, 'length')}` at x.{ending.side}"
    else:
        cure = f"no depth absorbs waves this slow: give `energies:` at x.{ending.side}, or end before they arrive"
    return Check(
        f"absorber reflection x.{ending.side}",
        passed,
        predicted,
        REFLECTION_LIMIT,
        "what the layer sends back is counted as if it had never left (predicted, weighted with the packet's momenta)",
        "" if passed else cure,
    )


def judge_expectation(job: Job, expect: ExpectKeys, result: Result) -> Judgement:
    """Met, missed or undecided: |value - wanted| with the error bar against the tolerance."""

    def read(value: object) -> float:
        return job.units.read(value, result.dimension)  # type: ignore[arg-type]

    if result.value is None:
        return Judgement(expect.result, "missed", f"{expect.result} has no value: {result.note}")
    value, error = result.value, result.error or 0.0
    if expect.equals is not None:
        away, room = abs(value - read(expect.equals)), read(expect.tolerance)
        wanted = f"{expect.equals} within {expect.tolerance}"
    elif expect.below is not None:
        away, room = value, read(expect.below)
        wanted = f"below {expect.below}"
    elif expect.above is not None:
        away, room = -value, -read(expect.above)
        wanted = f"above {expect.above}"
    else:
        low, high = (read(bound) for bound in expect.within or [])
        away, room = abs(value - (low + high) / 2), (high - low) / 2
        wanted = f"from {(expect.within or ['', ''])[0]} to {(expect.within or ['', ''])[1]}"
    # A bound met on the nose is met, whatever the last bit says.
    slack = 4 * np.finfo(float).eps * max(abs(value), abs(room))
    if result.error is None and result.error_status == "not_converging":
        outcome = "undecided"  # nothing is known about its error
    elif away + error <= room + slack:
        outcome = "met"
    elif away - error > room + slack:
        outcome = "missed"
    else:
        outcome = "undecided"
    given = job.write(value, result.dimension) if result.dimension != "number" else f"{value:.6g}"
    bar = f" +- {job.write(error, result.dimension)}" if result.error is not None else ""
    said = f"{expect.result} is {given}{bar}, wanted {wanted}"
    if expect.source:
        said += f" ({expect.source})"
    return Judgement(expect.result, outcome, said)  # type: ignore[arg-type]


def verdict(checks: list[Check], judgements: list[Judgement]) -> Verdict:
    """trusted, doubtful or failed."""
    if any(j.outcome == "missed" for j in judgements):
        return "failed"
    if all(c.passed for c in checks) and all(j.outcome == "met" for j in judgements):
        return "trusted"
    return "doubtful"
