"""The reference text: what holds for whole job files, run folders and commands, one page a topic.

What belongs to one key or kind stands in its model, and `wavejob explain` shows it from there; the pages only
point to it.
"""

from __future__ import annotations

from importlib.resources import files

# In the order in which they are best read; each is the name of a page, `<name>.md` beside this file.
TOPICS = (
    "job-file",
    "quantities",
    "job-tree",
    "bases",
    "variants",
    "choices",
    "time",
    "sharp-edges",
    "grid-ends",
    "measuring",
    "classical-companion",
    "error-bars",
    "verdict",
    "run-folder",
    "fingerprint",
    "batches",
    "compare",
    "prune",
    "pipelines",
    "commands",
)


def topics() -> dict[str, str]:
    """Name -> title of every page, in reading order."""
    return {name: text(name).partition("\n")[0].removeprefix("# ") for name in TOPICS}


def text(name: str) -> str:
    """The page called `name`, in Markdown. Raises KeyError where there is none."""
    if name not in TOPICS:
        raise KeyError(name)
    return files(__package__).joinpath(f"{name}.md").read_text(encoding="utf-8")
