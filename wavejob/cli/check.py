"""Read job files or folders, report every mistake, forecast memory, time and disk. Runs nothing."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Sequence
from itertools import groupby
from typing import Any

from ..plan import Plan, make_plan
from ..problems import in_order
from . import terminal
from .annotations import annotate
from .arguments import add_paths, add_reading
from .gathering import gather, tally
from .json_report import job_entry, show_json
from .preparing import Ready, prepare
from .sizes import counted, duration, size
from .words import count_of, paragraph


def add_arguments(parser: ArgumentParser) -> None:
    add_paths(parser)
    add_reading(parser)


def run(options: Namespace) -> int:
    found = gather(options)
    ready, refused = prepare(found.jobs, options.memory, options.limit)
    warnings = [warning for one in ready for warning in one.warnings]
    mistakes = in_order(found.problems + refused)
    annotate(in_order(mistakes + warnings), quiet=options.quiet)
    if options.format == "json":
        jobs = [_entry(one) for one in ready]
        show_json("check", in_order(mistakes + warnings), jobs)
    else:
        for problem in in_order(mistakes + ([] if options.quiet else warnings)):
            terminal.say(problem.text())
        if not options.quiet:
            for _, group in groupby(ready, key=lambda one: one.job.path):
                variants = list(group)
                terminal.show(block(variants[0]) if not variants[0].job.variant else family_block(variants))
            terminal.say(f"{counted(found.files, 'job file')} read: {tally(mistakes + warnings)}")
    if mistakes:
        return 2
    return 1 if options.strict and warnings else 0


def _entry(one: Ready) -> dict[str, Any]:
    job = one.job
    variant = {varied.key: varied.text for varied in job.variant}
    return job_entry(job.id, job.fingerprint, "checked", forecast=one.forecast, variant=variant)


def family_block(variants: Sequence[Ready]) -> str:
    """What a varied job will run, in a few lines; its forecast is for all variants one after another."""
    first, last = variants[0].job, variants[-1].job
    title = first.keys.job or first.id
    lines = [("variants", counted(len(variants), "job"))]
    for place, (low, high) in enumerate(zip(first.variant, last.variant, strict=True)):
        texts = dict.fromkeys(one.job.variant[place].text for one in variants)
        few = ", ".join(texts) if len(texts) <= 6 else f"{len(texts)} values from {low.text} to {high.text}"
        lines.append((low.key, few))
    seconds, disk = sum(one.forecast.seconds for one in variants), sum(one.forecast.disk for one in variants)
    memory = max(one.forecast.memory for one in variants)
    said = f"{duration(seconds)} in all, {size(memory)} of memory at most each, {size(disk)} on disk (rough)"
    lines.append(("forecast", said))
    wide = max(10, *(len(name) + 1 for name, _ in lines))
    head = f"{first.id}: {title}" if title != first.id else first.id
    return "\n".join([head, *(paragraph(text, f"  {name:<{wide}}", " " * (wide + 2)) for name, text in lines), ""])


def block(one: Ready) -> str:
    """What will be run, in a few lines."""
    job, plan = one.job, one.plan or make_plan(one.job)
    axis = plan.axis
    ends = f"from {job.write(axis.low, 'length')} to {job.write(axis.high, 'length')}"
    spacing = job.write(axis.spacing, "length")
    frames = f", {count_of(plan.frames)} film frames" if plan.frames else ", no film"
    lines = [
        ("grid", f"{axis.points} points {ends}, {spacing} apart ({plan.notes['points']})"),
        (
            "step",
            f"{job.write(plan.step, 'time')}, {plan.steps} times, order {plan.splitting.order} ({_why(plan)})",
        ),
        (
            "rows",
            f"{count_of(plan.recorded)}, one every {job.write(plan.record * plan.step, 'time')}{frames}",
        ),
        (
            "forecast",
            f"{duration(one.forecast.seconds)}, {size(one.forecast.memory)} of memory, "
            f"{size(one.forecast.disk)} on disk (rough)",
        ),
    ]
    for ending in plan.endings:
        depth, sent_back = job.write(ending.shape.depth, "length"), ending.shape.reflected
        lines.insert(-2, (f"x.{ending.side}", f"absorbs over {depth}, predicted to send back {sent_back:.1e}"))
    title = f"{job.id}: {job.title}" if job.title != job.id else job.id
    return "\n".join([title, *(paragraph(text, f"  {name:<10}", " " * 12) for name, text in lines), ""])


def _why(plan: Plan) -> str:
    """Why this step, without the order that stands before it."""
    return plan.notes["step"].partition(", ")[2] or plan.notes["step"]
