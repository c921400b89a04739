"""Pages of the reference text on a terminal and in a pipe."""

from __future__ import annotations

import re

import pytest

from wavejob import reference
from wavejob.cli import terminal
from wavejob.cli.pages import laid_out

PAGE = """# A page

Some text that goes
on and on and on and on.

## Items
- One that is
  long enough to be wrapped.
- Two.

    code   stays as it is, however long it may be in the end

| a | b | c |
| --- | ---: | --- |
| one | two words | three |
"""


def test_a_pipe_gets_the_page_as_it_stands(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(terminal, "width", lambda: None)
    assert laid_out(PAGE) == PAGE.rstrip()


def test_a_terminal_gets_it_fitted(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(terminal, "width", lambda: 40)
    assert laid_out(PAGE).splitlines() == [
        "A page",
        "",
        "Some text that goes on and on and on and",
        "on.",
        "",
        "Items",
        "- One that is long enough to be wrapped.",
        "- Two.",
        "",
        "    code   stays as it is, however long it may be in the end",
        "",
        "a    b; c",
        "one  two words; three",
    ]


@pytest.mark.parametrize("name", reference.TOPICS)
def test_no_word_is_lost(monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    monkeypatch.setattr(terminal, "width", lambda: 80)
    assert re.findall(r"\w+", laid_out(reference.text(name))) == re.findall(r"\w+", reference.text(name))
