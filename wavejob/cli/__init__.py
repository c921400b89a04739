"""The command line: `wavejob COMMAND ...`. Each command is a module of its own, imported when it is used."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence

# Threads of the linear algebra library gain nothing on the dot products here, and on a busy machine cost ten
# milliseconds each; it reads this when numpy is loaded.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from ..problems import JobFileError, RunError, WavejobError
from . import terminal
from .arguments import read
from .stopping import Terminated, stoppable

GOOD, FAILED, MISTAKEN, INTERRUPTED, TERMINATED = 0, 1, 2, 130, 143


def main(argv: Sequence[str] | None = None) -> int:
    """Runs one command and returns its exit code; errors are explained on standard error."""
    words = sys.argv[1:] if argv is None else list(argv)
    with terminal.prepared(), stoppable():
        try:
            return _carried_out(words)
        except KeyboardInterrupt as stop:
            terminal.say(str(stop) or "stopped")
            return TERMINATED if isinstance(stop, Terminated) else INTERRUPTED
        except JobFileError as error:
            terminal.say(str(error))
            return MISTAKEN
        except RunError as error:
            terminal.say(str(error))
            return FAILED
        except MemoryError:
            terminal.say("the memory is used up; give the job fewer points, or stop other programs")
            return FAILED


def _carried_out(words: list[str]) -> int:
    chosen = read(words)
    if isinstance(chosen, str):  # help or version, asked for
        terminal.show(chosen)
        return GOOD
    try:
        with terminal.logged(chosen.options):
            return chosen.run(chosen.options)
    except (WavejobError, MemoryError):
        raise
    except Exception as error:
        from .bugs import report

        report(error, verbose=chosen.options.verbose)
        return FAILED
