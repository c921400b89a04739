"""The job tree: ids, folders of jobs, paths that stay inside, and where runs go."""

from __future__ import annotations

import errno
import os
import pickle
from pathlib import Path

import pytest

from wavejob.problems import JobFileError
from wavejob.reading.tree import IGNORE_ALL, MARKER, JobTree, PathError, find_tree


def _write(root: Path, *names: str) -> None:
    for name in names:
        (root / name).parent.mkdir(parents=True, exist_ok=True)
        (root / name).write_text("job: x\n")


@pytest.fixture
def root(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A job tree with `.git`, as the current folder."""
    folder = tmp_path.resolve() / "tree"
    (folder / ".git").mkdir(parents=True)
    monkeypatch.chdir(folder)
    return folder


def test_tree_is_the_nearest_folder_with_git(root: Path) -> None:
    _write(root, "a/b/c.yml")
    assert find_tree(root / "a" / "b" / "c.yml") == JobTree(root)
    assert find_tree(Path("a/b")) == JobTree(root)
    (root / "a" / ".git").write_text("gitdir: elsewhere\n")  # as in a linked work tree
    assert find_tree(Path("a/b")).root == root / "a"


def test_without_git_it_is_the_folder_given_or_the_files_own(tmp_path: Path) -> None:
    _write(tmp_path, "a/b.yml")
    assert find_tree(tmp_path).root == tmp_path.resolve()
    assert find_tree(tmp_path / "a" / "b.yml").root == tmp_path.resolve() / "a"


def test_tree_may_be_named(root: Path) -> None:
    _write(root, "a/b.yml")
    assert find_tree(Path("a/b.yml"), Path("a")) == JobTree(root / "a", chosen=True)


@pytest.mark.parametrize(
    ("given", "override", "said"),
    [
        ("a/c.yml", None, "a/c.yml: there is no such file or folder; did you mean `b.yml`?"),
        ("a/b.yml", "a/b.yml", "a/b.yml: is no folder; give --tree a folder that holds the job files"),
        ("a/b.yml", "d", "a/b.yml: is not inside the tree `d`; give --tree a folder above it"),
    ],
)
def test_impossible_trees_are_explained(root: Path, given: str, override: str | None, said: str) -> None:
    _write(root, "a/b.yml", "d/e.yml")
    with pytest.raises(JobFileError) as caught:
        find_tree(Path(given), Path(override) if override else None)
    assert str(caught.value) == said


def test_ids_are_paths_without_ending(root: Path) -> None:
    _write(root, "a/b.c.yml", "d.yaml")
    tree = JobTree(root)
    assert tree.job_id(Path("a/b.c.yml")) == "a/b.c"
    assert tree.job_id(root / "d.yaml") == "d"


def test_a_linked_job_keeps_its_own_name(root: Path) -> None:
    _write(root, "a/b.yml")
    (root / "c.yml").symlink_to("a/b.yml")
    assert JobTree(root).job_id(Path("c.yml")) == "c"


def test_ids_outside_or_unprintable_are_refused(root: Path) -> None:
    with pytest.raises(PathError, match="is not inside the job tree"):
        JobTree(root).job_id(root.parent / "a.yml")
    with pytest.raises(PathError, match="can't be printed"):
        JobTree(root).job_id(root / "a\nb.yml")


def test_a_folder_stands_for_all_jobs_below(root: Path) -> None:
    wanted = ["a/b.yml", "a/c.yaml", "a/d/e.yml", "z.yml"]
    _write(root, *reversed(wanted))
    _write(root, "_base.yml", ".ci.yml", "_old/a.yml", ".github/b.yml", "a/readme.md", "runs/a/job.yml")
    (root / "runs" / MARKER).touch()
    found = JobTree(root).job_files(root)
    assert [f.relative_to(root).as_posix() for f in found] == wanted


def test_a_file_stands_for_itself_whatever_its_name(root: Path) -> None:
    _write(root, "_base.yml")
    assert JobTree(root).job_files(Path("_base.yml")) == [root / "_base.yml"]


def test_links_to_folders_are_not_followed(root: Path) -> None:
    _write(root, "a/b.yml")
    (root / "a" / "again").symlink_to(root)
    assert JobTree(root).job_files(root) == [root / "a/b.yml"]


@pytest.mark.parametrize("given", [".", "a/b.yml", "a/b.yaml"])
def test_two_files_of_one_id_are_an_error(root: Path, given: str) -> None:
    _write(root, "a/b.yml", "a/b.yaml")
    with pytest.raises(JobFileError) as caught:
        JobTree(root).job_files(Path(given))
    assert str(caught.value) == (
        "a/b.yaml: has the same job id as `b.yml`: `a/b`; rename one of them, or start its name with `_`"
    )


def test_all_unfit_files_are_named_at_once(root: Path) -> None:
    _write(root.parent, "secret.yml")
    (root / "a.yml").symlink_to("../secret.yml")
    (root / "b.yml").symlink_to("gone.yml")
    (root / "c.yml").symlink_to("c.yml")
    os.mkfifo(root / "d.yml")
    _write(root, "e\u200b.yml")
    with pytest.raises(JobFileError) as caught:
        JobTree(root).job_files(root)
    assert str(caught.value).splitlines() == [
        "a.yml: is a link that leaves the job tree; put the file itself here",
        "b.yml: is a link that leads nowhere; mend it or remove it",
        "c.yml: is a link that leads nowhere; mend it or remove it",
        "d.yml: is not a regular file; rename it, or start its name with `_`",
        "e\u200b.yml: has characters in its name that can't be printed; rename it",
    ]


def test_jobs_of_an_inner_tree_are_not_mixed_in(root: Path) -> None:
    _write(root, "inner/a.yml")
    (root / "inner" / ".git").mkdir()
    with pytest.raises(JobFileError, match="belongs to another job tree, `inner`"):
        JobTree(root).job_files(root)
    tree = find_tree(root, root)
    assert [tree.job_id(f) for f in tree.job_files(root)] == ["inner/a"]


@pytest.mark.parametrize("given", ["runs", "runs/a"])
def test_runs_are_no_jobs(root: Path, given: str) -> None:
    _write(root, "runs/a/job.yml")
    (root / "runs" / MARKER).touch()
    with pytest.raises(PathError, match="keeps runs, not jobs"):
        JobTree(root).job_files(Path(given))


def test_an_unreadable_folder_is_no_empty_folder(root: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    _write(root, "a/b.yml")
    scandir = os.scandir

    def refuse(path: str) -> object:
        if path == str(root / "a"):
            raise PermissionError(errno.EACCES, "Permission denied", path)
        return scandir(path)

    monkeypatch.setattr(os, "scandir", refuse)
    with pytest.raises(PathError) as caught:
        JobTree(root).job_files(root)
    assert str(caught.value) == "a: can't be searched: Permission denied; check its permissions"


def test_paths_are_relative_to_their_file(root: Path) -> None:
    _write(root, "a/b.yml", "a/data/v.csv", "masks/m.png")
    tree, base = JobTree(root), root / "a" / "b.yml"
    assert tree.inside("data/v.csv", base) == root / "a/data/v.csv"
    assert tree.inside("../masks/m.png", base) == root / "masks/m.png"


def test_a_link_inside_the_tree_is_followed(root: Path) -> None:
    _write(root, "b.yml", "data/v.csv")
    (root / "w.csv").symlink_to("data/v.csv")
    assert JobTree(root).inside("w.csv", root / "b.yml") == root / "data/v.csv"


@pytest.mark.parametrize(
    ("path", "message", "fix"),
    [
        ("", "`''` is no path", "write a path relative to this file"),
        ("a\0b", "`'a\\x00b'` is no path", "write a path relative to this file"),
        ("~/v.csv", "`~/v.csv`: `~` is not expanded", "write a path relative to this file"),
        (
            "/etc/hostname",
            "`/etc/hostname` is not a relative path",
            "write it relative to this file, with `/`",
        ),
        ("C:\\v.csv", "`C:\\v.csv` is not a relative path", "write it relative to this file, with `/`"),
        (
            "../secret.csv",
            "`../secret.csv` leaves the job tree",
            "move the file into the tree, or allow it with --trust-paths",
        ),
        (
            "../nothing-here",
            "`../nothing-here` leaves the job tree",
            "move the file into the tree, or allow it with --trust-paths",
        ),
        (
            "link.csv",
            "`link.csv` leaves the job tree",
            "move the file into the tree, or allow it with --trust-paths",
        ),
        (
            "out/secret.csv",
            "`out/secret.csv` leaves the job tree",
            "move the file into the tree, or allow it with --trust-paths",
        ),
        ("datta.csv", "there is no file `datta.csv`", "did you mean `data.csv`?"),
        ("folder/none/v.csv", "there is no file `folder/none/v.csv`", "check its name and folder"),
        ("data.csv/v", "there is no file `data.csv/v`", "check its name and folder"),
        ("folder", "`folder` is a folder", "name a file in it"),
        ("pipe", "`pipe` is not a regular file", "name a file, not a device or a pipe"),
        ("large.csv", "`large.csv` has 1001 bytes", "at most 1000 are read"),
        (
            "circle",
            "`circle` can't be opened: Too many levels of symbolic links",
            "check it and its folder",
        ),
        (
            "x" * 300,
            f"`{'x' * 300}` can't be opened: File name too long",
            "check it and its folder",
        ),
    ],
)
def test_paths_that_cannot_be_used(root: Path, path: str, message: str, fix: str) -> None:
    _write(root, "b.yml", "data.csv", "folder/v.csv")
    _write(root.parent, "secret.csv")
    (root / "link.csv").symlink_to("../secret.csv")
    (root / "out").symlink_to("..")
    (root / "circle").symlink_to("circle")
    (root / "large.csv").write_bytes(bytes(1001))
    os.mkfifo(root / "pipe")
    with pytest.raises(PathError) as caught:
        JobTree(root).inside(path, root / "b.yml", largest=1000)
    assert (caught.value.message, caught.value.fix) == (message, fix)


def test_trusted_paths_may_leave_but_must_be_files(root: Path) -> None:
    _write(root, "b.yml")
    _write(root.parent, "v.csv")
    tree = JobTree(root)
    assert tree.inside("../v.csv", root / "b.yml", trust=True) == root.parent / "v.csv"
    assert tree.inside(str(root.parent / "v.csv"), root / "b.yml", trust=True) == root.parent / "v.csv"
    with pytest.raises(PathError, match="is not a regular file"):
        tree.inside("/dev/zero", root / "b.yml", trust=True)


def test_path_errors_survive_pickling() -> None:
    error = pickle.loads(pickle.dumps(PathError("is wrong", "mend it", Path("a.yml"))))
    assert (error.message, error.fix, str(error)) == ("is wrong", "mend it", "a.yml: is wrong; mend it")


def test_runs_folder_is_made_with_marker_and_ignored_by_git(root: Path) -> None:
    runs = JobTree(root).runs_folder()
    assert runs == root / "runs"
    assert (runs / ".gitignore").read_text() == "*\n"
    assert (runs / MARKER).is_file()
    assert JobTree(root).runs_folder() == runs


def test_a_marked_folder_is_left_as_it_is(root: Path) -> None:
    runs = JobTree(root).runs_folder()
    (runs / ".gitignore").unlink()  # somebody wants to keep runs under version control
    _write(runs, "a/f1/series.csv")
    JobTree(root).runs_folder()
    assert sorted(os.listdir(runs)) == [MARKER, "a"]


@pytest.mark.parametrize("left", [None, "", IGNORE_ALL])
def test_an_empty_folder_is_adopted(root: Path, left: str | None) -> None:
    """Also where an earlier start, or one at the same time, has come as far as the ignore file."""
    (root / "out").mkdir()
    if left is not None:
        (root / "out" / ".gitignore").write_text(left)
    assert JobTree(root).runs_folder(Path("out")) == root / "out"
    assert (root / "out" / MARKER).is_file()
    assert (root / "out" / ".gitignore").read_text() == IGNORE_ALL


@pytest.mark.parametrize(
    ("name", "said"),
    [
        (
            "data",
            "data: holds other files, so runs are not written there; choose a new or an empty folder with --runs DIR",
        ),
        ("b.yml", "b.yml: is no folder, but runs need one; choose one with --runs DIR"),
        (
            "b.yml/runs",
            "b.yml/runs: can't keep runs: Not a directory; choose a folder you may write to with --runs DIR",
        ),
    ],
)
def test_somebodys_folder_is_refused(root: Path, name: str, said: str) -> None:
    _write(root, "b.yml", "data/v.csv")
    with pytest.raises(PathError) as caught:
        JobTree(root).runs_folder(Path(name))
    assert str(caught.value) == said
    assert os.listdir(root / "data") == ["v.csv"]
