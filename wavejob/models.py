"""The pieces of a job file as frozen models: a field carries its dimension, its bounds and one line of help.

Reading, messages, the JSON Schema, `wavejob explain`, resolved.yml and the reference text all come from these fields.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import Annotated, Any, ClassVar, get_args

from pydantic import (
    BaseModel,
    ConfigDict,
    Field,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    ValidationInfo,
    WithJsonSchema,
    create_model,
    model_validator,
)
from pydantic.fields import FieldInfo
from pydantic.functional_validators import BeforeValidator
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import PydanticCustomError, core_schema

from .problems import nearest, shown
from .reading.formulas import Formula, FormulaError, parse
from .reading.quantities import Named, QuantityError, Units

SMALLEST, LARGEST = 1e-40, 1e40  # of quantities other than 0, in scaled units: their products are numbers still
NAME = re.compile(r"[A-Za-z][A-Za-z0-9_-]{0,40}")


@dataclass
class Reader:
    """What reading a value needs to know: the file's units, its `let` names, how to find other files."""

    units: Units
    names: Mapping[str, Named] = field(default_factory=dict)
    open_path: Callable[[str], Path] | None = None  # a path as written -> the file, inside the job tree
    read_as: dict[int, type[BaseModel]] = field(default_factory=dict)  # id of a mapping -> the model it was read as


def reader_of(info: ValidationInfo) -> Reader:
    """The reader that a job file is read with."""
    if not isinstance(info.context, Reader):
        raise TypeError("job files are read with a Reader as context")
    return info.context


def refuse(message: str, fix: str = "", at: str | int | None = None, column: int = 0) -> PydanticCustomError:
    """The error a validator raises; the texts reach the user as they are.

    `at` names the key of a mapping (or the place in a list) that is to blame, `column` a character of its text.
    """
    return PydanticCustomError("wavejob", "{message}", {"message": message, "fix": fix, "at": at, "column": column})


def in_order(model: Any, first: str, last: str, names: tuple[str, str] = ("from", "to")) -> None:
    """Refuses a model whose field `first` does not lie before its field `last`."""
    if not getattr(model, first) < getattr(model, last):
        raise refuse(f"`{names[1]}` must be greater than `{names[0]}`", "swap them, or change one", at=names[1])


class Model(BaseModel):
    """Base of everything that can stand in a job file."""

    model_config = ConfigDict(
        extra="forbid", strict=True, frozen=True, allow_inf_nan=False, arbitrary_types_allowed=True
    )

    @model_validator(mode="before")
    @classmethod
    def _remember(cls, value: Any, info: ValidationInfo) -> Any:
        """Notes which model a mapping was read as, so that a message can list the keys it knows."""
        if isinstance(info.context, Reader) and isinstance(value, dict):
            info.context.read_as[id(value)] = cls
        return value

    @classmethod
    def keys(cls) -> list[str]:
        """The keys as they are written in a job file."""
        return [info.alias or name for name, info in cls.model_fields.items()]


@dataclass(frozen=True)
class Quantity:
    """Marks a float field that is read as a quantity of `dimension`, within bounds in scaled units."""

    dimension: str
    above: float | None = None
    at_least: float | None = None
    at_most: float | None = None
    word: str | None = None  # may stand instead of a quantity

    def read(self, value: Any, reader: Reader) -> float | str:
        if self.word is not None and value == self.word:
            return self.word
        if isinstance(value, bool) or not isinstance(value, (int, float, str)):
            raise refuse(f"{shown(value)} is no quantity", f"write {self.wanted()}")
        try:
            number = reader.units.read(value, self.dimension, reader.names)
        except QuantityError as error:
            raise refuse(error.message, error.fix) from None
        if self.dimension != "number" and number and not SMALLEST <= abs(number) <= LARGEST:
            raise refuse(f"{shown(value)} is beyond all that can be computed with", f"write {self.wanted()}")
        if self.above is not None and not number > self.above:
            raise refuse(f"must be greater than {self.above:g}, got {shown(value)}", "")
        if self.at_least is not None and not number >= self.at_least:
            raise refuse(f"must be at least {self.at_least:g}, got {shown(value)}", "")
        if self.at_most is not None and not number <= self.at_most:
            raise refuse(f"must be at most {self.at_most:g}, got {shown(value)}", "")
        return number

    def wanted(self) -> str:
        said = phrase(self.dimension)
        if self.dimension != "number":
            said += f" such as `{example(self.dimension)}`"
        return f"{said}, or `{self.word}`" if self.word else said

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        return core_schema.with_info_plain_validator_function(lambda value, info: self.read(value, info.context))

    def __get_pydantic_json_schema__(self, schema: Any, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        if self.dimension == "number":
            return {"type": ["number", "string"]}
        return {"type": ["string", "number"], "examples": [example(self.dimension)]}


PHRASES = {
    "number": ("a number", "1.5"),
    "length": ("a length", "5 nm"),
    "time": ("a time", "10 fs"),
    "energy": ("an energy", "70 meV"),
    "mass": ("a mass", "0.067 electron_mass"),
    "charge": ("a charge", "-1 e"),
    "wavenumber": ("a wave number", "0.35 1/nm"),
    "momentum": ("a momentum", "0.35 hbar/nm"),
    "velocity": ("a velocity", "0.6 nm/fs"),
    "frequency": ("a frequency in cycles per time", "5 THz"),
    "angular_frequency": ("an angular frequency", "0.03 rad/fs"),
    "acceleration": ("an acceleration", "9.80665 m/s^2"),
    "electric_field": ("an electric field strength", "2 V/um"),
    "stiffness": ("an energy per length squared", "0.4 meV/nm^2"),
    "slope": ("an energy per length", "1.2 meV/nm"),
    "energy_length": ("an energy times a length", "1.44 eV nm"),
    "angle": ("an angle in radians", "1.57"),
}


def phrase(dimension: str) -> str:
    return PHRASES[dimension][0]


def example(dimension: str) -> str:
    return PHRASES[dimension][1]


def quantity_of(info: FieldInfo) -> Quantity | None:
    """The mark of a field that is read as a quantity."""
    marks = [*info.metadata, *(m for arg in get_args(info.annotation) for m in getattr(arg, "__metadata__", ()))]
    return next((mark for mark in marks if isinstance(mark, Quantity)), None)


def dimension_at(model: BaseModel, path: Sequence[str | int]) -> str | None:
    """The dimension of the quantity at a key path below `model`; None where none is found."""
    node: Any = model
    for place, step in enumerate(path):
        if isinstance(node, BaseModel):
            fields = {info.alias or name: (name, info) for name, info in type(node).model_fields.items()}
            if step not in fields:
                extra = (node.__pydantic_extra__ or {}).get(str(step))
                return extra.dimension if isinstance(extra, Named) else None
            name, info = fields[str(step)]
            if place == len(path) - 1:
                mark = quantity_of(info)
                return mark.dimension if mark else None
            node = getattr(node, name)
        elif isinstance(node, list | dict):
            node = node[step]  # type: ignore[index]
        else:
            return None
    return None


def unit_of(dimension: str) -> BeforeValidator:
    """Checks that a text is a unit of `dimension`, as the file's units allow."""

    def read(value: Any, info: ValidationInfo) -> Any:
        if not isinstance(value, str):
            raise refuse(f"{shown(value)} is no unit", f"write one, as in `{example(dimension)}`")
        try:
            reader_of(info).units.read(f"1 {value}", dimension)
        except QuantityError as error:
            raise refuse(error.message, error.fix) from None
        return value

    return BeforeValidator(read)


Number = Annotated[float, Quantity("number")]
Positive = Annotated[float, Quantity("number", above=0)]
Angle = Annotated[float, Quantity("angle")]
Length = Annotated[float, Quantity("length")]
Extent = Annotated[float, Quantity("length", above=0)]
Time = Annotated[float, Quantity("time")]
Duration = Annotated[float, Quantity("time", above=0)]
Energy = Annotated[float, Quantity("energy")]
PositiveEnergy = Annotated[float, Quantity("energy", above=0)]
Mass = Annotated[float, Quantity("mass", above=0)]
Charge = Annotated[float, Quantity("charge")]
Wavenumber = Annotated[float, Quantity("wavenumber")]
Momentum = Annotated[float, Quantity("momentum")]
Velocity = Annotated[float, Quantity("velocity")]
Frequency = Annotated[float, Quantity("frequency")]
AngularFrequency = Annotated[float, Quantity("angular_frequency", above=0)]
Acceleration = Annotated[float, Quantity("acceleration", at_least=0)]
ElectricField = Annotated[float, Quantity("electric_field", at_least=0)]
Stiffness = Annotated[float, Quantity("stiffness", above=0)]
Slope = Annotated[float, Quantity("slope")]
EnergyLength = Annotated[float, Quantity("energy_length")]


def whole(least: int, most: int) -> Any:
    """A whole number between two bounds."""

    accepted = f"write `{least}`" if least == most else f"write one from {least} to {most}"

    def read(value: Any) -> int:
        if isinstance(value, bool) or not isinstance(value, int):
            raise refuse(f"{shown(value)} is no whole number", accepted)
        if not least <= value <= most:
            raise refuse(f"{shown(value)} is out of range", accepted)
        return value

    return [BeforeValidator(read), WithJsonSchema({"type": "integer", "minimum": least, "maximum": most})]


def _flag(value: Any) -> bool:
    flags = {"yes": True, "no": False, True: True, False: False}
    if isinstance(value, (bool, str)) and value in flags:
        return flags[value]
    raise refuse(f"{shown(value)} is no flag", "write `yes` or `no`")


Flag = Annotated[
    bool, BeforeValidator(_flag), WithJsonSchema({"enum": ["yes", "no", True, False]}), Field(strict=False)
]


def _name(value: Any) -> str:
    if isinstance(value, str) and NAME.fullmatch(value):
        return value
    raise refuse(f"{shown(value)} is no name", "use a letter, then letters, digits, `_` or `-`, at most 41 characters")


Name = Annotated[str, BeforeValidator(_name), WithJsonSchema({"type": "string", "pattern": f"^{NAME.pattern}$"})]


def one_of(
    value: Any, table: Mapping[str, Any], what: str, beside: tuple[str, ...] = (), words: tuple[str, ...] = ()
) -> str:
    """The one key of `value` that names a kind of `table`; other keys may only be those of `beside`.

    `words` may stand instead of a kind, and are only named here.
    """
    names = ", ".join(f"`{name}`" for name in table)
    if not isinstance(value, dict):
        instead = "".join(f"`{word}` or " for word in words)
        raise refuse(f"{shown(value)} is no {what}", f"write {instead}one kind with its parameters: {names}")
    kinds = [str(key) for key in value if key in table]
    if len(kinds) == 1:
        return kinds[0]
    if kinds:
        listed = " and ".join(f"`{kind}`" for kind in kinds)
        raise refuse(f"{listed} are {len(kinds)} kinds in one {what}", "keep one of them here", at=kinds[1])
    strange = [key for key in value if key not in beside]
    if strange:
        near = nearest(strange[0], [*table, *beside])
        said = f"no {what} called `{strange[0]}`"
        raise refuse(said, f"did you mean `{near}`?" if near else f"there are: {names}", at=strange[0])
    raise refuse(f"a {what} needs one kind with its parameters", f"there are: {names}")


class FormulaText:
    """Marks a text field that is read as a formula of the listed variables; parameters are checked by the owner."""

    @staticmethod
    def parsed(text: str, names: frozenset[str]) -> Formula:
        """The formula that stands under the key `value`."""
        try:
            return parse(text, names)
        except FormulaError as error:
            raise refuse(error.message, error.fix, at="value", column=error.column) from None

    @staticmethod
    def parameters(value: Any, known: tuple[str, ...]) -> None:
        """Refuses what cannot be the name of a parameter of a formula of the variables `known`."""
        for name in value if isinstance(value, dict) else ():
            if not NAME.fullmatch(name) or "-" in name:
                fix = "use a letter, then letters, digits or `_`; a formula with a comma in it stands in quotes"
                raise refuse(f"`{name}` cannot be the name of a parameter", fix, at=name)
            if name in (*known, "y", "z", "pi"):
                fix = "choose another name, it has a meaning of its own"
                raise refuse(f"`{name}` cannot be a parameter of a formula", fix, at=name)


class NamedQuantity:
    """A free parameter of a formula: any quantity, with the dimension its unit has."""

    @classmethod
    def __get_pydantic_core_schema__(cls, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        return core_schema.with_info_plain_validator_function(cls._read)

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: Any, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        return {"type": ["string", "number"]}

    @staticmethod
    def _read(value: Any, info: ValidationInfo) -> Named:
        reader = reader_of(info)
        if isinstance(value, bool) or not isinstance(value, (int, float, str)):
            raise refuse(f"{shown(value)} is no quantity", "write a number with its unit")
        if isinstance(value, str) and value in reader.names:
            return reader.names[value]
        try:
            return reader.units.read_named(value)
        except QuantityError as error:
            raise refuse(error.message, error.fix) from None


class Item(Model):
    """One kind with its parameters, `{kind: {...}}`, and what may stand beside it."""

    kind: ClassVar[str]

    @property
    def body(self) -> Any:
        """The model of the kind."""
        return getattr(self, f"{self.kind}_")


@dataclass(frozen=True, eq=False)
class Choice:
    """Marks a field that holds an `Item` of one of the kinds of a table.

    `beside` is an Item class whose fields may stand beside the kind; `bare` allows a kind without
    parameters to be written as its name alone.
    """

    table: Mapping[str, type[Model]]
    what: str
    beside: type[Item] = Item
    bare: bool = False
    words: tuple[str, ...] = ()  # words that may stand instead of a kind

    def items(self) -> dict[str, type[Item]]:
        """Kind -> the model of `{kind: {...}, ...}`."""
        return {name: _item_model(name, kind, self.beside) for name, kind in self.table.items()}

    def _spread(self, value: Any, handler: Callable[[Any], Any]) -> Any:
        """Validates words as they are, and a bare name or a kind without parameters in their mapping form."""
        if isinstance(value, str) and value in self.words:
            return value
        if self.bare and isinstance(value, str):
            value = {value: {}}
        name = one_of(value, self.table, self.what, tuple(self.beside.keys()), self.words)
        return handler({**value, name: {}} if value[name] is None else value)

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        choices = {name: handler.generate_schema(item) for name, item in self.items().items()}
        union = core_schema.tagged_union_schema(choices, lambda v: next(k for k in v if k in self.table))
        return core_schema.no_info_wrap_validator_function(self._spread, union)

    def __get_pydantic_json_schema__(self, schema: Any, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        """One of the kinds, each with its one key required, or a word that stands for one."""
        kinds = handler(schema)
        bare = [name for name, kind in self.table.items() if self.bare and not needed(kind)]
        words = [*self.words, *bare]
        return {"oneOf": [*([{"enum": words}] if words else []), *kinds["oneOf"]]}


def needed(model: type[BaseModel]) -> list[str]:
    """The keys that may not be left out."""
    return [info.alias or name for name, info in model.model_fields.items() if info.is_required()]


@cache
def _item_model(name: str, kind: type[Model], beside: type[Item]) -> type[Item]:
    fields: dict[str, Any] = {f"{name}_": (kind, Field(alias=name))}
    model = create_model(f"{kind.__name__}Item", __base__=beside, **fields)
    model.kind = name
    return model
