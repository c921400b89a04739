"""What is installed, and what the README and continuous integration promise."""

from __future__ import annotations

import importlib
import importlib.metadata
import os
import re
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest

import wavejob

ROOT = Path(__file__).parents[1]


@pytest.fixture(scope="module")
def project() -> dict[str, Any]:
    return tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def test_installed_version_is_the_one_in_the_source() -> None:
    assert importlib.metadata.version("wavejob") == wavejob.__version__


def test_types_are_shipped() -> None:
    assert (Path(wavejob.__file__).parent / "py.typed").is_file()


def test_the_command_is_there(project: dict[str, Any]) -> None:
    module, _, name = project["project"]["scripts"]["wavejob"].partition(":")
    assert callable(getattr(importlib.import_module(module), name))


def test_no_dependency_is_bounded_above(project: dict[str, Any]) -> None:
    extras = project["project"]["optional-dependencies"]
    wanted = [*project["project"]["dependencies"], *extras["test"], *extras["dev"]]
    assert [name for name in wanted if re.search(r"<|==|~=|!=", name)] == []


@pytest.mark.parametrize("mark", ["run", "test"])
def test_readme_has_one_line_commands(mark: str) -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    blocks = re.findall(rf"^<!-- command: {mark} -->\n```sh\n(.*?)^```$", text, flags=re.MULTILINE | re.DOTALL)
    assert len(blocks) == 1
    assert blocks[0].count("\n") == 1


SKIPS = """
import pytest
def test_good(): pass
def test_skipped(): pytest.skip("no such machine")
@pytest.mark.skip
def test_marked(): pass
@pytest.mark.xfail
def test_expected(): raise ValueError
"""
SKIPPED_MODULE = "import pytest\npytest.importorskip('no_such_library')\n"


@pytest.mark.parametrize(
    ("ci", "source", "outcome"),
    [
        ("true", SKIPS, "1 failed, 1 passed, 1 xfailed, 1 error"),
        ("", SKIPS, "1 passed, 2 skipped, 1 xfailed"),
        ("true", SKIPPED_MODULE, "1 error"),
        ("", SKIPPED_MODULE, "1 skipped"),
    ],
)
def test_a_skipped_test_fails_in_continuous_integration(tmp_path: Path, ci: str, source: str, outcome: str) -> None:
    """Rather than being counted and forgotten; an expected failure is no skip."""
    (tmp_path / "conftest.py").write_bytes((ROOT / "tests" / "conftest.py").read_bytes())
    (tmp_path / "test_some.py").write_text(source)
    environment = {**os.environ, "CI": ci}
    command = [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", "--rootdir", str(tmp_path)]
    done = subprocess.run(command, check=False, capture_output=True, text=True, cwd=tmp_path, env=environment)
    assert f"\n{outcome} in " in done.stdout
