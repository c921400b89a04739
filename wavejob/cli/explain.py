"""Describe a key, kind, observable, unit or check, with an example; without a word, list all words."""

from __future__ import annotations

import inspect
import re
from argparse import ArgumentParser, Namespace
from collections.abc import Iterable, Mapping
from typing import Any

from pydantic.fields import FieldInfo

from ..kinds import FAMILIES
from ..models import Model
from ..observables.base import Observable, Outline
from ..problems import nearest
from ..reading.dimensions import DIMENSIONS, kind_of
from ..reading.quantity_text import pint_notation
from ..reading.unit_table import measure, unit_names
from ..reference import text, topics
from ..settings import JobKeys
from . import terminal
from .arguments import UsageError
from .check_words import checks
from .dictionary import Entry, entries, form, form_of
from .examples import of_model, written
from .pages import laid_out
from .words import columns, paragraph

Known = Mapping[tuple[str, ...], Entry]

OUTLINE = Outline(("x",), ("x.low", "x.high"))
MOST_IN_FULL = 3  # meanings of one word; more are listed in a line each
BASE_UNITS = {
    "length": "m",
    "time": "s",
    "mass": "kg",
    "charge": "C",
    "temperature": "K",
    "angle": "rad",
    "cycle": "",
}


def add_arguments(parser: ArgumentParser) -> None:
    parser.add_argument("word", nargs="*", metavar="WORD", help="such as `points`, `grid.x.points`, `crossing`, `meV`")


def run(options: Namespace) -> int:
    word = " ".join(options.word).strip()
    if not word:
        terminal.show(overview())
        return 0
    told = explanations(word)
    if not told:
        near = nearest(word, known_words())
        fix = f"did you mean `{near}`?" if near else "`wavejob explain` lists all words"
        raise UsageError("wavejob explain", f"no word `{word}` is known", fix)
    terminal.show("\n\n".join(told))
    return 0


def explanations(word: str) -> list[str]:
    """Everything that `word` means, one text each."""
    known = {entry.path: entry for entry in entries()}
    found = matching(word, known.values())
    kinds = [entry for entry in found if entry.is_kind]
    keys = [entry for entry in found if not entry.is_kind]
    told = [_kind(entry, known) for entry in kinds]
    if len(keys) <= MOST_IN_FULL and not kinds:
        told += [_key(entry, known) for entry in keys]
    elif keys:
        told.append(_listed(word, keys))
    told += _figures(word)
    if word in unit_names():
        told.append(_unit(word))
    if word in ("unit", "units"):
        told.append(_units())
    told += [
        paragraph(f"a check that every run makes of itself: {reason}.", f"{name}: ", "  ")
        for name, reason in checks("" if word in ("check", "checks") else word.lower()).items()
        if word.lower() in (name.lower(), "check", "checks")
    ]
    page = word.lower().replace(" ", "-")
    if page in topics():
        told.append(laid_out(text(page)))
    return told


def matching(word: str, known: Iterable[Entry]) -> list[Entry]:
    """The entries that `word`, plain or dotted, may mean; with list places as in `potential[0].barrier`."""
    wanted = tuple(re.sub(r"\[[0-9]*\]", "", word).split("."))
    found = [entry for entry in known if entry.path[-len(wanted) :] == wanted]
    exact = [entry for entry in found if entry.path == wanted]
    return exact if exact and len(wanted) > 1 else found


def known_words() -> set[str]:
    """Every word that can be asked for."""
    words = {part for entry in entries() for part in (entry.path[-1], entry.dotted)}
    return words | {name for name, _ in _all_figures()} | {*checks(), *unit_names(), *topics(), "checks"}


def overview() -> str:
    """All words on one screen."""
    blocks = [
        ("keys", JobKeys.keys()),
        *((f"{family} kinds", list(table)) for family, table in FAMILIES.items()),
    ]
    lines = [paragraph(", ".join(words), f"{title:<17}", " " * 17) for title, words in blocks]
    lines.append(paragraph(", ".join(checks()), f"{'checks':<17}", " " * 17))
    lines.append(paragraph(", ".join(topics()), f"{'pages':<17}", " " * 17))
    lines.append("")
    lines.append("`wavejob explain WORD` tells more: `wavejob explain evolve`, `... grid.x.points`, `... units`.")
    return "\n".join(lines)


def _kind(entry: Entry, known: Known) -> str:
    model = entry.model
    if model is None:
        return entry.dotted
    lines = [f"{entry.path[-1]}: a kind of {entry.what}", *_about(model), *_fields(model)]
    if issubclass(model, Observable):
        figures = model.model_construct(**_names(model)).figures(OUTLINE)
        rows = [(figure.name, figure.meaning) for figure in figures]
        lines += ["", "  results:", *columns(rows, "    ")] if rows else []
    return "\n".join([*lines, *_example(entry, known)])


def _names(model: type[Model]) -> dict[str, Any]:
    """Field values from the example of a model, by field name."""
    values = of_model(model)
    given = {name: values.get(info.alias or name, info.default) for name, info in model.model_fields.items()}
    return {**given, **({"name": "NAME"} if "name" in given else {})}


def _key(entry: Entry, known: Known) -> str:
    info = entry.info
    if info is None:
        return entry.dotted
    lines = [f"{entry.dotted}: {info.description}"]
    if entry.model is None or form(info) != form_of(entry.model):
        lines.append(paragraph(form(info), "  takes ", "        "))
    lines.append(f"  {_left_out(info)}")
    if entry.model is not None:
        lines += [*_about(entry.model), *_fields(entry.model)]
    return "\n".join([*lines, *_example(entry, known)])


def _left_out(info: FieldInfo) -> str:
    if info.is_required():
        return "must be given"
    default = info.default
    if isinstance(default, bool):
        default = "yes" if default else "no"
    plain = isinstance(default, (str, int, float))
    return f"{default} if left out" if plain else "may be left out"


def _about(model: type[Model]) -> list[str]:
    origin = model.__pydantic_generic_metadata__["origin"] or model  # which alone has the text
    text = inspect.cleandoc(origin.__doc__ or "")
    return [paragraph(" ".join(part.split()), "  ", "  ") for part in text.split("\n\n") if part]


def _fields(model: type[Model]) -> list[str]:
    rows = [
        (
            info.alias or name,
            f"{info.description or ''} ({form(info)}{'' if info.is_required() else '; optional'})",
        )
        for name, info in model.model_fields.items()
    ]
    return ["", *columns(rows, "  ")] if rows else []


def _example(entry: Entry, known: Known) -> list[str]:
    return ["", "  example:", *(f"    {line}" for line in written(entry, known).splitlines())]


def _listed(word: str, keys: list[Entry]) -> str:
    rows = [(entry.dotted, entry.info.description or "") for entry in keys if entry.info]
    places = "one place" if len(keys) == 1 else f"{len(keys)} places"
    return "\n".join([f"{word} is a key in {places}:", *columns(rows, "  ")])


def _all_figures() -> list[tuple[str, str]]:
    """Results with fixed names, and what they mean."""
    whole = [
        model
        for model in FAMILIES["observable"].values()
        if not any(i.is_required() for i in model.model_fields.values())
    ]
    bare = [model() for model in whole if issubclass(model, Observable)]
    return [(figure.name, figure.meaning) for observable in bare for figure in observable.figures(OUTLINE)]


def _figures(word: str) -> list[str]:
    return [paragraph(f"a result: {meaning}", f"{name}: ", "  ") for name, meaning in _all_figures() if name == word]


def _unit(word: str) -> str:
    worth, powers = measure(pint_notation(word))
    kind = kind_of(powers)
    what = DIMENSIONS[kind].words if kind else "a quantity"
    base = {BASE_UNITS[name]: power for name, power in powers._asdict().items() if power and BASE_UNITS[name]}
    spelt = " ".join(unit if power == 1 else f"{unit}^{power}" for unit, power in base.items())
    return f"{word}: a unit, for {what}; 1 {word} = {worth:.9g} {spelt}".rstrip()


def _units() -> str:
    by_kind: dict[str, list[str]] = {}
    for name in sorted(unit_names(), key=str.lower):
        if name.isascii():
            kind = kind_of(measure(pint_notation(name))[1])
            by_kind.setdefault(DIMENSIONS[kind].words if kind else "other", []).append(name)
    lines = ["units, which may be multiplied, divided and raised as in `2 V/um`, `9.81 m/s^2`:"]
    return "\n".join([*lines, *columns([(kind, ", ".join(names)) for kind, names in by_kind.items()], "  ")])
