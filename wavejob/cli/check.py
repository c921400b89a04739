"""Read job files or folders, report every mistake, forecast memory, time and disk. Runs nothing."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

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
        jobs = [job_entry(one.job.id, one.job.fingerprint, "checked", forecast=one.forecast) for one in ready]
        show_json("check", in_order(mistakes + warnings), jobs)
    else:
        for problem in in_order(mistakes + ([] if options.quiet else warnings)):
            terminal.say(problem.text())
        if not options.quiet:
            for one in ready:
                terminal.show(block(one))
            terminal.say(f"{counted(found.files, 'job file')} read: {tally(mistakes + warnings)}")
    if mistakes:
        return 2
    return 1 if options.strict and warnings else 0


def block(one: Ready) -> str:
    """What will be run, in a few lines."""
    job, plan, axis = one.job, one.plan, one.plan.axis
    ends = f"from {job.write(axis.low, 'length')} to {job.write(axis.high, 'length')}"
    spacing = job.write(axis.spacing, "length")
    frames = f", {count_of(plan.frames)} film frames" if plan.frames else ", no film"
    lines = [
        ("grid", f"{axis.points} points {ends}, {spacing} apart ({plan.notes['points']})"),
        (
            "step",
            f"{job.write(plan.step, 'time')}, {plan.steps} times, order {plan.splitting.order} ({_why(one)})",
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


def _why(one: Ready) -> str:
    """Why this step, without the order that stands before it."""
    return one.plan.notes["step"].partition(", ")[2] or one.plan.notes["step"]
