"""The text of a formula to a list of steps for a stack, by a small grammar of our own.

sum        := product (("+" | "-") product)...
comparison := sum [("<" | "<=" | ">" | ">=" | "==" | "!=") sum]
product    := signed (("*" | "/") signed)...
signed     := ("+" | "-") signed | power
power      := atom ["**" signed]                      so -x**2 is -(x**2), and 2**3**2 is 2**9
atom       := number | name | function "(" comparison ("," comparison)... ")" | "(" comparison ")"
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field
from typing import NamedTuple

from ..problems import nearest
from .formula_functions import CONSTANTS, FUNCTIONS

MAX_LENGTH = 2000
MAX_STEPS = 400
MAX_DEPTH = 40

_TOKEN = re.compile(
    r"(?P<number>(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)"
    r"|(?P<name>[A-Za-z_][A-Za-z0-9_]*)"
    r"|(?P<sign>\*\*|<=|>=|==|!=|[-+*/<>(),])"
    r"|(?P<space>[ \t\r\n]+)"
)
_COMPARISONS = ("<", "<=", ">", ">=", "==", "!=")
_ADVICE = {
    "^": "write `**` for a power",
    "%": "write the remainder out, or use another formula",
    "=": "a formula has no `=`; a comparison is written `==`",
    "&": "multiply comparisons: `(x > 0) * (x < 1)`",
    "|": "use the larger of the two: `maximum(x < 0, x > 1)`",
    ".": "a point belongs inside a number, as in `0.5`",
    "[": "use round brackets",
    "{": "use round brackets",
}
_CONTENT = "a formula is made of numbers, names, + - * / **, a comparison and round brackets"
_OTHER_NAMES = {
    "ln": "write `log`, the natural logarithm",
    "log10": "write `log(x) / log(10)`",
    "e": "write `exp(1)`",
    "and": "multiply comparisons: `(x > 0) * (x < 1)`",
    "or": "use the larger of the two: `maximum(x < 0, x > 1)`",
    "not": "turn the comparison round",
    "if": "write `where(condition, value, other value)`",
    "else": "write `where(condition, value, other value)`",
    "pow": "write `**` for a power",
    "asin": "write `arcsin`",
    "acos": "write `arccos`",
    "atan": "write `arctan`",
    "atan2": "write `arctan2`",
    "min": "write `minimum`",
    "max": "write `maximum`",
    "fabs": "write `abs`",
    "heaviside": "write a comparison, `(x > 0)`, which is 1 where it holds and 0 elsewhere",
}


class FormulaError(ValueError):
    """A formula that can't be read: what is wrong, what to write, and the column (from 0) in its text."""

    def __init__(self, message: str, fix: str = "", column: int = 0) -> None:
        self.message, self.fix, self.column = message, fix, column
        super().__init__(message, fix, column)

    def __str__(self) -> str:
        return f"{self.message}; {self.fix}" if self.fix else self.message


class Step(NamedTuple):
    """Push a number, push the value of a name, or apply an operation to the values pushed last."""

    kind: str  # "number", "name" or "apply"
    what: float | str


class _Token(NamedTuple):
    kind: str  # "number", "name", "sign" or "end"
    text: str
    column: int


def read(text: str, names: frozenset[str]) -> tuple[Step, ...]:
    """The steps of the formula `text` over `names`. Raises FormulaError."""
    if len(text) > MAX_LENGTH:
        raise FormulaError(f"the formula is longer than {MAX_LENGTH} characters", "use a table instead", MAX_LENGTH)
    parser = _Parser(_tokens(text), names)
    if parser.next.kind == "end":
        raise FormulaError("the formula is empty", "write a number or an expression such as `2*x**2`")
    parser.comparison(0)
    if parser.next.kind != "end":
        raise parser.unexpected()
    return tuple(parser.steps)


def _tokens(text: str) -> list[_Token]:
    tokens: list[_Token] = []
    column = 0
    while column < len(text):
        found = _TOKEN.match(text, column)
        if not found:
            sign = text[column]
            shown = f"`{sign}`" if sign.isascii() and sign.isprintable() else f"the character U+{ord(sign):04X}"
            raise FormulaError(f"{shown} has no meaning in a formula", _ADVICE.get(sign, _CONTENT), column)
        if found.lastgroup != "space":
            tokens.append(_Token(str(found.lastgroup), found.group(), column))
        column = found.end()
    tokens.append(_Token("end", "", len(text)))
    return tokens


@dataclass
class _Parser:
    tokens: list[_Token]
    names: frozenset[str]
    steps: list[Step] = field(default_factory=list)
    at: int = 0

    @property
    def next(self) -> _Token:
        return self.tokens[self.at]

    def take(self, *signs: str) -> str:
        """The next sign if it is one of `signs`, which is then passed; else an empty text."""
        if self.next.kind == "sign" and self.next.text in signs:
            self.at += 1
            return self.tokens[self.at - 1].text
        return ""

    def push(self, kind: str, what: float | str, column: int) -> None:
        if len(self.steps) >= MAX_STEPS:
            raise FormulaError(f"the formula has more than {MAX_STEPS} parts", "use a table instead", column)
        self.steps.append(Step(kind, what))

    def unexpected(self) -> FormulaError:
        """Why the next token may not stand where it stands."""
        token = self.next
        before = self.tokens[self.at - 1] if self.at else None
        if token.kind == "end":
            return FormulaError("the formula ends too early", "complete it, or close its brackets", token.column)
        if token.text == ",":
            fix = "write a decimal point, as in `1.5`; commas stand between the arguments of a function"
            return FormulaError("a comma may not stand here", fix, token.column)
        if token.text in _COMPARISONS:
            fix = "compare two values only, and multiply comparisons: `(0 < x) * (x < 1)`"
            return FormulaError("a second comparison may not stand here", fix, token.column)
        if before and before.kind == "number" and before.column + len(before.text) == token.column:
            said = f"`{_short(before.text + token.text)}` is neither a number nor a name"
            fix = f"write `{_short(before.text)}*{_short(token.text)}` for a product; numbers are decimal"
            return FormulaError(said, fix, before.column)
        if token.kind in ("number", "name") and token.text not in _OTHER_NAMES:
            said = f"an operator is missing before `{_short(token.text)}`"
            return FormulaError(said, "write `*` for a product", token.column)
        fix = _OTHER_NAMES.get(token.text, "check operators and brackets")
        return FormulaError(f"`{_short(token.text)}` may not stand here", fix, token.column)

    def deeper(self, depth: int) -> int:
        """The next depth of nesting, if that is allowed."""
        if depth >= MAX_DEPTH:
            said = f"brackets or powers are nested more than {MAX_DEPTH} deep"
            raise FormulaError(said, "simplify the formula", self.next.column)
        return depth + 1

    def comparison(self, depth: int) -> None:
        self.sum(depth)
        column = self.next.column
        if sign := self.take(*_COMPARISONS):
            self.sum(depth)
            self.push("apply", sign, column)

    def sum(self, depth: int) -> None:
        self.product(depth)
        column = self.next.column
        while sign := self.take("+", "-"):
            self.product(depth)
            self.push("apply", sign, column)
            column = self.next.column

    def product(self, depth: int) -> None:
        self.signed(depth)
        column = self.next.column
        while sign := self.take("*", "/"):
            self.signed(depth)
            self.push("apply", sign, column)
            column = self.next.column

    def signed(self, depth: int) -> None:
        column = self.next.column
        negative = False
        while sign := self.take("+", "-"):
            negative ^= sign == "-"
        self.power(depth)
        if negative:
            self.push("apply", "negative", column)

    def power(self, depth: int) -> None:
        self.atom(depth)
        column = self.next.column
        if self.take("**"):
            self.signed(self.deeper(depth))
            self.push("apply", "**", column)

    def atom(self, depth: int) -> None:
        token = self.next
        if token.kind == "number":
            self.at += 1
            value = float(token.text)
            if not math.isfinite(value):
                raise FormulaError(
                    f"the number `{_short(token.text)}` is out of range", "write a smaller one", token.column
                )
            self.push("number", value, token.column)
        elif token.kind == "name":
            self.at += 1
            self.named(token, depth)
        elif self.take("("):
            self.comparison(self.deeper(depth))
            self.close()
        else:
            raise self.unexpected()

    def close(self) -> None:
        if not self.take(")"):
            raise self.unexpected()

    def named(self, token: _Token, depth: int) -> None:
        name, column = token.text, token.column
        called = self.next.text == "("
        if name in self.names or name in CONSTANTS:
            if called:
                fix = f"write `{_short(name)}*(...)` for a product"
                raise FormulaError(f"`{_short(name)}` is a value, not a function", fix, column)
            if name in self.names:
                self.push("name", name, column)
            else:
                self.push("number", CONSTANTS[name], column)
        elif name not in FUNCTIONS:
            raise FormulaError(f"`{_short(name)}` is not known in this formula", self.near(name), column)
        elif not called:
            raise FormulaError(f"`{name}` is a function", f"give it its arguments: `{name}(...)`", column)
        else:
            self.call(name, column, depth)

    def call(self, name: str, column: int, depth: int) -> None:
        self.take("(")
        given = 0
        while self.next.text != ")":
            if given and not self.take(","):
                raise self.unexpected()
            self.comparison(self.deeper(depth))
            given += 1
        self.close()
        wanted = len(FUNCTIONS[name].partials)
        if given != wanted:
            fix = f"give it {wanted}" + (": condition, value, other value" if name == "where" else "")
            raise FormulaError(f"`{name}` takes {wanted} argument{'s' * (wanted > 1)}, not {given}", fix, column)
        self.push("apply", name, column)

    def near(self, name: str) -> str:
        """Advice on an unknown name."""
        if name in _OTHER_NAMES:
            return _OTHER_NAMES[name]
        near = nearest(name, [*sorted(self.names), *FUNCTIONS, *CONSTANTS])
        if near:
            return f"did you mean `{near}`?"
        return f"the values it may use are {', '.join(sorted([*self.names, *CONSTANTS]))}"


def _short(text: str) -> str:
    return text if len(text) <= 40 else f"{text[:37]}..."
