"""What README.md, DEVELOPERS.md and the reference pages say can be done, can be done."""

from __future__ import annotations

import re
import subprocess
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.test_layers import LAYERS, PACKAGE
from wavejob import reference
from wavejob.cli.arguments import Chosen, read
from wavejob.cli.explain import explanations
from wavejob.evidence import bars
from wavejob.kinds import FAMILIES
from wavejob.loading import load, parse
from wavejob.plan import make_plan

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
PAGES = {"README.md": README, "DEVELOPERS.md": DEVELOPERS} | {
    f"{name}.md": reference.text(name) for name in reference.TOPICS
}
FENCE = re.compile(r"^```(\w*)\n(.*?)^```$", re.MULTILINE | re.DOTALL)


def marked(mark: str) -> str:
    """The code block that follows the comment `mark`."""
    found = re.findall(rf"^<!-- {re.escape(mark)} -->\n```\w*\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)
    assert len(found) == 1
    return str(found[0])


def quoted_commands() -> Iterator[tuple[str, str]]:
    """Every command line of wavejob that a page quotes, without the placeholder `wavejob COMMAND`."""
    for page, text in PAGES.items():
        lines = [line for _, block in FENCE.findall(text) for line in block.splitlines()]
        found = [line.removeprefix("$ ") for line in lines if line.startswith("$ wavejob ")]
        found += [part.strip() for line in lines for part in line.split("&&") if "bin/wavejob " in part]
        found += [" ".join(span.split()) for span in re.findall(r"`([^`]+)`", FENCE.sub("", text))]
        for command in found:
            words = command.split()
            if words[0].removeprefix(".venv/bin/") == "wavejob" and len(words) > 1 and words[1] != "COMMAND":
                yield page, " ".join(words[1:])


QUOTED = list(quoted_commands())
COMMANDS = sorted({command for _, command in QUOTED})


@pytest.mark.parametrize("mark", ["run", "test"])
def test_commands_are_found_as_continuous_integration_finds_them(mark: str) -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    (search,) = re.findall(r"^command=\$\((sed .*)\)$", script, re.MULTILINE)
    search = search.replace("command: test", f"command: {mark}")
    done = subprocess.run(["bash", "-c", search], cwd=ROOT, capture_output=True, text=True, check=True)
    assert done.stdout == marked(f"command: {mark}")
    subprocess.run(["bash", "-n", "-c", done.stdout], check=True)


def test_commands_are_quoted_everywhere() -> None:
    assert {page for page, _ in QUOTED} >= {"README.md", "DEVELOPERS.md", "fingerprint.md"}
    assert {command.split()[0] for command in COMMANDS} == {
        "check", "run", "compare", "prune", "explain", "schema", "new",
    }  # fmt: skip


@pytest.mark.parametrize("command", COMMANDS)
def test_the_command_line_takes_what_pages_quote(command: str) -> None:
    assert isinstance(read(command.split()), Chosen)


@pytest.mark.parametrize("command", [command for command in COMMANDS if command.startswith("explain ")])
def test_every_word_to_be_explained_is_known(command: str) -> None:
    word = command.removeprefix("explain ")
    assert word in ("KEY", "WORD", "TOPIC") or explanations(word)


def test_the_job_of_the_tour_can_be_run() -> None:
    plan = make_plan(parse(marked("job: barrier.yml"), name="barrier"))
    assert plan.job.id == "barrier"
    (expect,) = plan.job.keys.expect
    (said,) = re.findall(r"closed form gives ([0-9.]+);", README)
    assert float(said) == expect.equals


def test_figures_are_those_that_the_first_job_expects() -> None:
    """Expected values and tolerances: from the outside sources that the job file states."""
    block = marked("figures: first_light")
    job = load(ROOT / "jobs" / "first_light.yml")
    assert job.keys.expect
    assert "\n  trusted, in runs/jobs/first_light/" in block
    for expect in job.keys.expect:
        (value,) = re.findall(rf"^ *{re.escape(expect.result)} +(\S+) \+- \S+ ", block, re.MULTILINE)
        dimension = job.figures[expect.result].dimension
        wanted, tolerance = (
            job.units.to_file(job.units.read(written, dimension), dimension)
            for written in (expect.equals, expect.tolerance)
        )
        assert abs(float(value) - wanted) <= tolerance


@pytest.mark.parametrize("page", PAGES)
def test_links_lead_to_files(page: str) -> None:
    targets = re.findall(r"\]\(([^)#]+)\)", FENCE.sub("", PAGES[page]))
    assert [t for t in targets if "://" not in t and not (ROOT / t).exists()] == []


def test_the_picture_is_small() -> None:
    (picture,) = re.findall(r"!\[[^\]]+\]\(([^)]+)\)", README)
    assert (ROOT / picture).read_bytes().startswith(b"\x89PNG")
    assert (ROOT / picture).stat().st_size < 300_000


def test_the_number_of_potentials_is_right() -> None:
    (said,) = re.findall(r"(\d+) kinds of potential", README)
    assert int(said) == len(FAMILIES["potential"])


def test_the_factors_of_error_bars_are_those_of_the_code() -> None:
    said = re.findall(r"times (\S+) for smooth potentials and times (\S+) for sharp edges", README)
    assert [tuple(map(float, pair)) for pair in said] == [(bars.SMOOTH, bars.SHARP)]


def test_the_house_lists_the_layers_in_their_order() -> None:
    listed = re.findall(r"^\| `(\w+)` \|", DEVELOPERS.partition("| layer |")[2].partition("\n\n")[0], re.MULTILINE)
    built = [name for name in LAYERS if (PACKAGE / name).is_dir() or (PACKAGE / f"{name}.py").is_file()]
    assert listed == [name for name in built if not name.startswith("__")]
