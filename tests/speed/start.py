"""How long commands take to start, in times of what the libraries take: `python -m tests.speed.start`.

Each contestant is a Python of its own; the first one only imports numpy, pint, pydantic and yaml.
"""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from tempfile import TemporaryDirectory

from tests.speed.timing import ratios
from wavejob.cli.new import template

WANTED = {"--version": 1.0, "explain points": 2.0, "check FILE": 2.0}
IMPORTS = "import numpy, pint, pydantic, yaml"
ROOT = Path(__file__).parents[2]


def _python(*words: str) -> Callable[[int], None]:
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}

    def work(count: int) -> None:
        for _ in range(count):
            subprocess.run([sys.executable, *words], check=True, capture_output=True, env=environment)

    return work


def main() -> None:
    with TemporaryDirectory() as folder:
        job = Path(folder) / "first.yml"
        job.write_text(template(), encoding="utf-8")
        contestants = {"libraries alone": _python("-c", IMPORTS)}
        for words in WANTED:
            contestants[words] = _python("-m", "wavejob", *words.replace("FILE", str(job)).split())
        found = ratios(contestants, turns=5)
    print("| command | time / imports | wanted |")
    print("| --- | ---: | ---: |")
    for words, most in WANTED.items():
        print(f"| {words} | {found[words]:.2f} | {most} |")


if __name__ == "__main__":
    main()
