"""The job tree: which files are jobs, what they are called, what they may read, where runs go."""

from __future__ import annotations

import difflib
import os
import stat
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from ..problems import JobFileError, Place, Problem

ENDINGS = (".yml", ".yaml")
MARKER = ".wavejob-runs"  # a folder that holds it keeps runs, and is never searched for jobs
MARKER_TEXT = "Runs of wavejob are kept here. While this file stands, no job files are looked for below.\n"
IGNORE_ALL = "*\n"
LARGEST_FILE = 2 * 1024**3  # bytes; a larger table or image would fill the memory before it is refused


class PathError(JobFileError):
    """A path that can't be used, and why. Whoever reads the key adds the place to its message and fix."""

    def __init__(self, message: str, fix: str = "", path: Path | None = None) -> None:
        self.message, self.fix = message, fix
        super().__init__([Problem(message, fix, place=Place(shown(path)) if path else None)])
        self.args = (message, fix, path)  # what pickling hands to this constructor


@dataclass(frozen=True)
class JobTree:
    """The folder that job ids and the paths inside job files are measured against.

    `chosen` tells that the user named it: then folders with a `.git` of their own belong to it too.
    """

    root: Path
    chosen: bool = False

    def job_id(self, path: Path) -> str:
        """The path of a job file below the tree, without its ending, with `/` between names."""
        file = self._placed(path)
        name = file.relative_to(self.root).with_suffix("").as_posix()
        if not name.isprintable():
            raise PathError("has characters in its name that can't be printed", "rename it", path)
        return name

    def job_files(self, given: Path) -> list[Path]:
        """The job file `given`, or all of a folder, sorted by name; two with one id are an error."""
        start = self._placed(given)
        problems: list[Problem] = []
        files = [start]
        if start.is_dir():
            self._refuse_runs(start, given)
            files = sorted(self._candidates(start))
            problems = [wrong for file in files if (wrong := self._unfit(file))]
        problems += self._doubled(files)
        if problems:
            raise JobFileError(problems)
        return files

    def inside(self, path: str, base_file: Path, *, trust: bool = False, largest: int = LARGEST_FILE) -> Path:
        """The regular file that `path`, written in the job file `base_file`, stands for.

        Relative to the folder of `base_file`. Unless `trust`, it must lie inside the tree once all links
        are followed. Raises PathError; nothing is said about files outside the tree, not even that
        they exist.
        """
        if not path or not path.isprintable():
            raise PathError(f"`{path!r}` is no path", "write a path relative to this file")
        if path.startswith("~"):
            raise PathError(f"`{path}`: `~` is not expanded", "write a path relative to this file")
        if not trust and (Path(path).is_absolute() or "\\" in path):
            raise PathError(f"`{path}` is not a relative path", "write it relative to this file, with `/`")
        file = Path(os.path.realpath(base_file.parent / path))
        if not trust and not file.is_relative_to(self.root):
            raise PathError(
                f"`{path}` leaves the job tree", "move the file into the tree, or allow it with --trust-paths"
            )
        return _readable(file, path, largest)

    def runs_folder(self, override: Path | None = None) -> Path:
        """The folder that keeps all runs, made and marked where it is not there yet."""
        runs = override.absolute() if override else self.root / "runs"
        try:
            runs.mkdir(parents=True, exist_ok=True)
            if is_marked(runs):
                return runs
            if any(not _ours(entry) for entry in runs.iterdir()):
                raise PathError(
                    "holds other files, so runs are not written there",
                    "choose a new or an empty folder with --runs DIR",
                    runs,
                )
            (runs / ".gitignore").write_text(IGNORE_ALL, encoding="utf-8")
            (runs / MARKER).write_text(MARKER_TEXT, encoding="utf-8")
        except FileExistsError:
            raise PathError("is no folder, but runs need one", "choose one with --runs DIR", runs) from None
        except OSError as error:
            raise PathError(
                f"can't keep runs: {error.strerror}", "choose a folder you may write to with --runs DIR", runs
            ) from error
        return runs

    def _placed(self, path: Path) -> Path:
        """`path` in full, below the root of the tree."""
        full = located(path)
        if not full.is_relative_to(self.root):
            outside = f"is not inside the job tree `{shown(self.root)}`"
            raise PathError(outside, "name a file below it, or give --tree DIR", path)
        return full

    def _candidates(self, folder: Path) -> Iterator[Path]:
        """Files named like jobs, below `folder`, in any order; links to folders are not followed."""
        for name, folders, files in os.walk(folder, onerror=_unsearchable):
            here = Path(name)
            folders[:] = [f for f in folders if not f.startswith(("_", ".")) and not is_marked(here / f)]
            yield from (here / f for f in files if f.endswith(ENDINGS) and not f.startswith(("_", ".")))

    def _unfit(self, file: Path) -> Problem | None:
        """What keeps a file found in a folder from being a job file of this tree."""
        place = Place(shown(file))
        if not file.relative_to(self.root).as_posix().isprintable():
            return Problem("has characters in its name that can't be printed", "rename it", place=place)
        try:
            target = file.resolve(strict=True)
        except (OSError, RuntimeError):
            return Problem("is a link that leads nowhere", "mend it or remove it", place=place)
        if not target.is_relative_to(self.root):
            return Problem("is a link that leaves the job tree", "put the file itself here", place=place)
        if not target.is_file():
            return Problem("is not a regular file", "rename it, or start its name with `_`", place=place)
        nearest = _holder_of_git(file.parent)
        if nearest and nearest != self.root and nearest.is_relative_to(self.root) and not self.chosen:
            return Problem(
                f"belongs to another job tree, `{shown(nearest)}`, which has its own `.git`",
                f"name that folder by itself, or take both as one tree with --tree {shown(self.root)}",
                place=place,
            )
        return None

    def _doubled(self, files: list[Path]) -> list[Problem]:
        """One problem for each file that differs from another by its ending only."""
        pairs = {(f.with_suffix(".yaml"), f.with_suffix(".yml")) for f in files if f.suffix in ENDINGS}
        doubled = sorted(pair for pair in pairs if all(file.exists() for file in pair))
        return [
            Problem(
                f"has the same job id as `{yml.name}`: `{self.job_id(yml)}`",
                "rename one of them, or start its name with `_`",
                place=Place(shown(yaml)),
            )
            for yaml, yml in doubled
        ]

    def _refuse_runs(self, folder: Path, given: Path) -> None:
        below = [folder, *folder.parents]
        if any(is_marked(f) for f in below if f.is_relative_to(self.root)):
            raise PathError("keeps runs, not jobs", "name a folder or file with jobs", given)


def find_tree(given: Path, override: Path | None = None) -> JobTree:
    """The job tree of a file or folder: `override`, or the nearest folder at or above that holds `.git`.

    Without either, the folder given, or the file's own. Raises PathError.
    """
    try:
        start = located(given)
        if not start.exists():
            raise PathError("there is no such file or folder", _near(start), given)
    except OSError as error:
        raise PathError(f"can't be opened: {error.strerror}", "check it and its folder", given) from None
    folder = start if start.is_dir() else start.parent
    if override is None:
        return JobTree(_holder_of_git(folder) or folder)
    root = override.resolve()
    if not root.is_dir():
        raise PathError("is no folder", "give --tree a folder that holds the job files", override)
    if not folder.is_relative_to(root):
        raise PathError(f"is not inside the tree `{shown(override)}`", "give --tree a folder above it", given)
    return JobTree(root, chosen=True)


def is_marked(folder: Path) -> bool:
    """Whether runs are kept in `folder`."""
    return (folder / MARKER).is_file()


def located(path: Path) -> Path:
    """`path` with the links of its folder followed, but not its own: a linked job keeps its name."""
    return path.resolve() if path.is_dir() else path.parent.resolve() / path.name


def shown(path: Path) -> str:
    """`path` as a message shows it: from the current folder where it lies below."""
    full = path.absolute()
    here = Path.cwd()
    return (full.relative_to(here) if full.is_relative_to(here) else path).as_posix()


def _unsearchable(error: OSError) -> None:
    raise PathError(f"can't be searched: {error.strerror}", "check its permissions", Path(error.filename))


def _holder_of_git(folder: Path) -> Path | None:
    return next((f for f in (folder, *folder.parents) if (f / ".git").exists()), None)


def _ours(entry: Path) -> bool:
    """Whether a file of a folder without marker may be from an earlier start that was cut short."""
    return entry.name == ".gitignore" and entry.read_text(encoding="utf-8", errors="replace") in (
        "",
        IGNORE_ALL,
    )


def _readable(file: Path, path: str, largest: int) -> Path:
    """`file`, if it is a regular file of at most `largest` bytes that can be opened."""
    try:
        found = file.stat()
    except (FileNotFoundError, NotADirectoryError):
        raise PathError(f"there is no file `{path}`", _near(file)) from None
    except OSError as error:
        raise PathError(f"`{path}` can't be opened: {error.strerror}", "check it and its folder") from None
    if stat.S_ISDIR(found.st_mode):
        raise PathError(f"`{path}` is a folder", "name a file in it")
    if not stat.S_ISREG(found.st_mode):
        raise PathError(f"`{path}` is not a regular file", "name a file, not a device or a pipe")
    if found.st_size > largest:
        raise PathError(f"`{path}` has {found.st_size} bytes", f"at most {largest} are read")
    if not os.access(file, os.R_OK):
        raise PathError(f"`{path}` may not be read", "check its permissions")
    return file


def _near(file: Path) -> str:
    """A suggestion from the names that are there, for a name that is not."""
    try:
        names = os.listdir(file.parent)
    except OSError:
        names = []
    near = difflib.get_close_matches(file.name, names, 1, 0.75)
    return f"did you mean `{near[0]}`?" if near else "check its name and folder"
