"""The keys of a job file, one model per section."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Discriminator, Field, GetJsonSchemaHandler, Tag, WithJsonSchema, model_validator
from pydantic.functional_validators import BeforeValidator
from pydantic.json_schema import JsonSchemaValue

from .kinds import OBSERVABLES
from .models import (
    Charge,
    Choice,
    Duration,
    Extent,
    Flag,
    Item,
    Length,
    Mass,
    Model,
    PositiveEnergy,
    Quantity,
    Time,
    in_order,
    refuse,
    whole,
)
from .packets.item import PACKETS
from .potentials.item import POTENTIALS, TermItem
from .problems import nearest, shown
from .reading.walks import MOST_VARIANTS

MAX_POINTS = 2**26


def _scalar(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, (int, float, str)):
        raise refuse(f"{shown(value)} is no quantity", "write a number, with its unit where it has one")
    return value


# A quantity whose dimension is known only once all observables are read.
Scalar = Annotated[Any, BeforeValidator(_scalar), WithJsonSchema({"type": ["number", "string"]})]
Points = Annotated[int, *whole(8, MAX_POINTS)]
Rate = Annotated[int, *whole(1, 120)]
Trajectories = Annotated[int, *whole(32, 1_000_000)]
Seed = Annotated[int, *whole(0, 2**31 - 1)]
Priority = Annotated[int, *whole(-1000, 1000)]


class AxisKeys(Model):
    """One axis of the grid: points stand at from + (j + 1/2) (to - from) / points."""

    start: Length = Field(alias="from", description="low end", examples=["-400 nm"])
    stop: Length = Field(alias="to", description="high end", examples=["400 nm"])
    points: Points | None = Field(None, description="number of grid points; left out: chosen", examples=[1024])
    spacing: Extent | None = Field(None, description="distance between points, instead of `points`")

    @model_validator(mode="after")
    def _ordered(self) -> AxisKeys:
        in_order(self, "start", "stop")
        if self.points is not None and self.spacing is not None:
            raise refuse("`points` and `spacing` say the same thing", "keep one of them, or neither", at="spacing")
        if self.spacing is not None and not 8 <= (self.stop - self.start) / self.spacing <= MAX_POINTS:
            points = f"{(self.stop - self.start) / self.spacing:.4g}"
            said = f"`spacing` makes {points} points of the axis, from 8 to {MAX_POINTS} are accepted"
            raise refuse(said, "change it, or leave it out", at="spacing")
        return self


class GridKeys(Model):
    """The axes."""

    x: AxisKeys = Field(description="the x axis")


class Energies(Model):
    """A range of energies."""

    start: PositiveEnergy = Field(alias="from", description="lowest")
    stop: PositiveEnergy = Field(alias="to", description="highest")

    @model_validator(mode="after")
    def _ordered(self) -> Energies:
        in_order(self, "start", "stop")
        return self


class Absorb(Model):
    """An absorbing layer (Manolopoulos 2002)."""

    absorb: Annotated[float | Literal["auto"], Quantity("length", above=0, word="auto")] = Field(
        description="depth of the layer, measured inwards from the end; `auto`: as deep as the accuracy needs"
    )
    energies: Energies | None = Field(None, description="kinetic energies it must absorb; left out: the packet's")


def word_or(words: tuple[str, ...], model: type[Model], what: str) -> Any:
    """One of a few words, or a mapping read as `model`."""

    def known(value: Any) -> Any:
        if isinstance(value, dict) or (isinstance(value, str) and value in words):
            return value
        listed = ", ".join(f"`{word}`" for word in words)
        near = nearest(value, words) if isinstance(value, str) else None
        keys = ", ".join(f"{key}: ..." for key in list(model.keys()))
        fix = f"did you mean `{near}`?" if near else f"write {listed} or {{{keys}}}"
        raise refuse(f"{shown(value)} is no {what}", fix)

    literal: Any = Literal
    word = Annotated[literal[words], Tag("word")]
    mapping: Any = Annotated[model, Tag("mapping")]
    return Annotated[
        word | mapping,
        Discriminator(lambda value: "word" if isinstance(value, str) else "mapping"),
        BeforeValidator(known),
    ]


if TYPE_CHECKING:
    End = Literal["wrap", "wall"] | Absorb
else:
    End = word_or(("wrap", "wall"), Absorb, "edge")


class EndsKeys(Model):
    """The two ends of an axis."""

    low: End = Field("wrap", description="wrap, wall or {absorb: depth}")
    high: End = Field("wrap", description="wrap, wall or {absorb: depth}")

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: Any, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        absorb = handler(Absorb.__pydantic_core_schema__)
        return {"anyOf": [{"enum": ["wrap", "wall"]}, absorb, handler(schema)]}

    @model_validator(mode="before")
    @classmethod
    def _both(cls, value: Any) -> Any:
        """A word or `{absorb: ...}` for both ends at once."""
        if isinstance(value, str):
            if value not in ("wrap", "wall"):
                near = nearest(value, ("wrap", "wall"))
                fix = f"did you mean `{near}`?" if near else "there are: `wrap`, `wall`, `{absorb: depth}`"
                raise refuse(f"{shown(value)} is no edge", fix)
            return {"low": value, "high": value}
        if isinstance(value, dict) and value and value.keys() <= set(Absorb.keys()):
            return {"low": value, "high": value}
        return value

    @model_validator(mode="after")
    def _agree(self) -> EndsKeys:
        if (self.low == "wrap" and self.high == "wall") or (self.low == "wall" and self.high == "wrap"):
            fix = "make both `wall`, or absorb at one"
            raise refuse("one end cannot wrap while the other is a wall", fix, at="high")
        return self


class EdgesKeys(Model):
    """What happens at the ends of each axis."""

    x: EndsKeys = Field(
        default_factory=EndsKeys,
        description="wrap, wall, {absorb: depth}, or per end {low:, high:}",
        examples=[{"absorb": "60 nm"}],
    )


class ParticleKeys(Model):
    """The particle."""

    mass: Mass | None = Field(
        None,
        description="effective mass; 1 if left out in natural and atomic units",
        examples=["0.067 electron_mass"],
    )
    charge: Charge | None = Field(None, description="0 if left out; 1 in natural units")


def _particle_form(value: Any) -> Any:
    if isinstance(value, (str, dict)):
        return value
    raise refuse(f"{shown(value)} is no particle", "write a name such as `electron`, or {mass:, charge:}")


if TYPE_CHECKING:
    ParticleChoice = str | ParticleKeys
else:
    ParticleChoice = Annotated[
        Annotated[str, Tag("word")] | Annotated[ParticleKeys, Tag("mapping")],
        Discriminator(lambda value: "word" if isinstance(value, str) else "mapping"),
        BeforeValidator(_particle_form),
    ]


class Bound(Model):
    """A bound on a series column."""

    below: Scalar | None = Field(None, description="stop when it falls below this")
    above: Scalar | None = Field(None, description="stop when it rises above this")

    @model_validator(mode="after")
    def _one(self) -> Bound:
        if (self.below is None) == (self.above is None):
            raise refuse("a bound needs either `below` or `above`", "write exactly one of them")
        return self


def _accuracy(value: Any) -> float:
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not 1e-12 <= value <= 0.1:
        raise refuse(f"{shown(value)} is no accuracy", "write a number from 1e-12 to 0.1, such as `1e-4`")
    return float(value)


Tolerance = Annotated[
    float, BeforeValidator(_accuracy), WithJsonSchema({"type": "number", "minimum": 1e-12, "maximum": 0.1})
]


class RelativeAccuracy(Model):
    """An error relative to the value of each result, for small probabilities."""

    relative: Tolerance = Field(description="error over value")
    down_to: Tolerance = Field(1e-12, description="values below this (of the scale) need no better error than this")


if TYPE_CHECKING:
    AccuracyChoice = float | RelativeAccuracy
else:
    AccuracyChoice = Annotated[
        Annotated[Tolerance, Tag("number")] | Annotated[RelativeAccuracy, Tag("mapping")],
        Discriminator(lambda value: "mapping" if isinstance(value, dict | RelativeAccuracy) else "number"),
    ]


class EvolveKeys(Model):
    """How long, how accurately, how often recorded."""

    start: Time = Field(0.0, description="time of the initial state")
    until: Time = Field(description="time at which the run ends", examples=["1 ps"])
    accuracy: AccuracyChoice | None = Field(
        None,
        description="the numerical error wanted in the results, of the scale of each, or "
        "{relative:, down_to:} of its value; 1e-4 if left out",
    )
    step: Duration | None = Field(None, description="fixes the time step")
    order: Literal[2, 4] | None = Field(None, description="order of the splitting: 2 or 4; left out: chosen")
    record: Duration | None = Field(None, description="spacing of the time series; left out: about 400 rows")
    precision: Literal["double", "single"] = Field("double", description="double or single")
    reproducible: Flag = Field(False, description="yes: the same bits on the same machine")
    stop_when: dict[str, Bound] = Field(
        default_factory=dict,
        description="ends the run early: {norm: {below: 1e-4}}, for any series column",
        examples=[{"norm": {"below": 0.01}}],
    )

    @model_validator(mode="after")
    def _ordered(self) -> EvolveKeys:
        if not self.until > self.start:
            raise refuse("`until` must come after `start`", "give a later time", at="until")
        if self.step is not None and self.accuracy is not None:
            raise refuse("`step` and `accuracy` both set the time step", "keep one of them", at="accuracy")
        return self


class ViewKeys(Model):
    """The part of the x axis that pictures show."""

    start: Length = Field(alias="from", description="left side of the picture")
    stop: Length = Field(alias="to", description="right side of the picture")

    @model_validator(mode="after")
    def _ordered(self) -> ViewKeys:
        in_order(self, "start", "stop")
        return self


class ViewAxes(Model):
    """What pictures show, by axis."""

    x: ViewKeys = Field(description="range of x")


class FilmKeys(Model):
    """The animation."""

    every: Duration | None = Field(None, description="time between frames; left out: about 300 frames")
    fps: Rate = Field(25, description="frames per second")
    view: ViewAxes | None = Field(None, description="look closer: {x: {from:, to:}}")
    format: Literal["mp4", "gif"] = Field("mp4", description="mp4 (H.264) or gif")


if TYPE_CHECKING:
    FilmChoice = FilmKeys | Literal["none"]
else:
    FilmChoice = word_or(("none",), FilmKeys, "film")


class SnapshotKeys(Model):
    """The field itself, stored."""

    every: Duration = Field(description="time between stored fields")


WHEN_SCHEMA = {
    "type": "object",
    "additionalProperties": {"type": ["number", "string", "boolean"]},
    "examples": [{"b2": "3 nm"}],
}


class ExpectKeys(Model):
    """A check on one result."""

    result: str = Field(description="name of a result, such as transmitted.total", examples=["norm.drift"])
    equals: Scalar | None = Field(None, description="the value wanted; needs `tolerance`")
    tolerance: Scalar | None = Field(None, description="how far from it is still right")
    below: Scalar | None = Field(None, description="upper bound", examples=["1e-9"])
    above: Scalar | None = Field(None, description="lower bound")
    within: list[Scalar] | None = Field(None, description="[lowest, highest]", min_length=2, max_length=2)
    source: str | None = Field(None, description="where the value comes from")
    when: Annotated[dict[str, Scalar], WithJsonSchema(WHEN_SCHEMA)] | None = Field(
        None, description="judged only in the variants of a varied job with these values; left out: in every variant"
    )

    @model_validator(mode="after")
    def _one(self) -> ExpectKeys:
        given = [n for n in ("equals", "below", "above", "within") if getattr(self, n) is not None]
        if len(given) != 1:
            said = f"{' and '.join(f'`{n}`' for n in given)} stand together" if given else "nothing is expected"
            fix = "write exactly one of `equals`, `below`, `above` and `within`"
            raise refuse(said, fix, at=given[1] if given else None)
        if (self.equals is None) != (self.tolerance is None):
            missing = "tolerance" if self.tolerance is None else "equals"
            raise refuse(f"`{missing}` is missing", "`equals` and `tolerance` go together")
        return self


class ClassicalKeys(Model):
    """Trajectories that follow F = m a, drawn from the packet."""

    trajectories: Trajectories | None = Field(
        None, description="how many; left out: what costs at most a quarter of the run"
    )
    seed: Seed = Field(1, description="of the random numbers")


if TYPE_CHECKING:
    ClassicalChoice = ClassicalKeys | Literal["none"]
else:
    ClassicalChoice = word_or(("none",), ClassicalKeys, "classical companion")


def _tags(value: Any) -> Any:
    if isinstance(value, list) and all(isinstance(tag, str) and tag for tag in value) and len(value) <= 50:
        return value
    raise refuse(f"{shown(value)} is no list of tags", "write words, such as `[tunnelling, stack-A]`")


def _box(value: Any) -> Any:
    words = {"yes": "yes", "no": "no", True: "yes", False: "no", "auto": "auto"}
    if isinstance(value, (bool, str)) and value in words:
        return words[value]
    raise refuse(f"{shown(value)} is no choice for `box`", "write `yes`, `no` or `auto`")


class ErrorBarsKeys(Model):
    """Which companion runs the error bars are made from."""

    step: Flag = Field(True, description="another time step")
    grid: Flag = Field(True, description="another number of points")
    record: Flag = Field(True, description="every second row and sample")
    box: Annotated[
        Literal["yes", "no", "auto"],
        BeforeValidator(_box),
        WithJsonSchema({"enum": ["yes", "no", "auto", True, False]}),
    ] = Field("auto", description="a larger grid with deeper layers; auto: where the edges matter")


if TYPE_CHECKING:
    ErrorBarsChoice = ErrorBarsKeys | Literal["none"]
else:
    ErrorBarsChoice = word_or(("none",), ErrorBarsKeys, "choice of error bars")


def _varied(value: Any) -> Any:
    """One entry of `vary`: a key with a list of values, or with a range of them."""
    if not isinstance(value, dict) or len(value) != 1:
        said = f"{shown(value)} is no entry" if not isinstance(value, dict) else f"an entry has {len(value)} keys"
        raise refuse(said, "write one key and its values: `b2: {from: 2.8 nm, to: 3.2 nm, points: 11}`")
    ((key, values),) = value.items()
    wanted = "write a list of values, or {from: 2.8 nm, to: 3.2 nm, points: 11}"
    if isinstance(values, list):
        if not values:
            raise refuse("the list has no items", wanted, at=key)
        for one in values:
            if not isinstance(one, bool | int | float | str):
                raise refuse(f"{shown(one)} is no single value", "write numbers, quantities or words", at=key)
        return value
    if not isinstance(values, dict):
        raise refuse(f"{shown(values)} is no choice of values", wanted, at=key)
    parts = ("from", "to", "points")
    for part in values:
        if part not in parts:
            near = nearest(part, parts)
            raise refuse(f"unknown key {shown(part)}", f"did you mean `{near}`?" if near else wanted, at=key)
    for part in parts:
        if part not in values:
            raise refuse(f"`{part}` is missing", "add it", at=key)
    for end in ("from", "to"):
        if isinstance(values[end], bool) or not isinstance(values[end], int | float | str):
            raise refuse(f"`{end}` is {shown(values[end])}, no quantity", wanted, at=key)
    points = values["points"]
    if isinstance(points, bool) or not isinstance(points, int) or not 2 <= points <= MOST_VARIANTS:
        raise refuse(f"`points` is {shown(points)}", f"write a whole number from 2 to {MOST_VARIANTS}", at=key)
    return value


_VALUE: dict[str, Any] = {"type": ["number", "string", "boolean"]}
VARY_SCHEMA = {
    "type": "object",
    "minProperties": 1,
    "maxProperties": 1,
    "additionalProperties": {
        "oneOf": [
            {"type": "array", "minItems": 1, "items": _VALUE},
            {
                "type": "object",
                "properties": {
                    "from": {"type": ["number", "string"]},
                    "to": {"type": ["number", "string"]},
                    "points": {"type": "integer", "minimum": 2, "maximum": MOST_VARIANTS},
                },
                "required": ["from", "to", "points"],
                "additionalProperties": False,
            },
        ]
    },
}
VaryEntry = Annotated[Any, BeforeValidator(_varied), WithJsonSchema(VARY_SCHEMA)]
_MASSES = {"particle.mass": ["0.063 electron_mass", "0.067 electron_mass"]}
VARY: Any = Field(
    default_factory=list,
    description="one run for each value of a key or a name of `let`; several entries: every combination",
    examples=[[_MASSES]],
    max_length=20,
)
VARY_TOGETHER: Any = Field(
    default_factory=list,
    description="like `vary`, but its entries walk in step",
    examples=[[_MASSES, {"particle.charge": ["-1 e", "-2 e"]}]],
    max_length=50,
)


class VaryKeys(Model):
    """What makes one job file many jobs."""

    vary: list[VaryEntry] = VARY
    vary_together: list[VaryEntry] = VARY_TOGETHER


UNITS_SCHEMA = {
    "oneOf": [
        {"enum": ["natural", "atomic"]},
        {
            "type": "object",
            "properties": {name: {"type": "string"} for name in ("length", "time", "energy")},
            "additionalProperties": False,
        },
    ]
}


class JobKeys(Model):
    """A job file."""

    format: Annotated[int, *whole(1, 1)] = Field(1, description="version of the job-file format")
    job: str | None = Field(None, description="title, shown with the results", examples=["Two barriers"])
    about: str | None = Field(None, description="free text, shown in the report", examples=["What it is for"])
    tags: Annotated[list[str], BeforeValidator(_tags)] = Field(
        default_factory=list, description="words to filter by", examples=[["tunnelling"]]
    )
    priority: Priority = Field(0, description="higher runs first in a batch")
    units: Annotated[Any, WithJsonSchema(UNITS_SCHEMA)] = Field(
        None,
        description="meaning of bare numbers: {length: nm, time: fs, energy: meV}, `natural` or `atomic`",
        examples=[{"length": "nm", "time": "fs", "energy": "meV"}],
    )
    let: dict[str, Scalar] | None = Field(
        None, description="named quantities for use below", examples=[{"V0": "300 meV"}]
    )
    based_on: str | None = Field(None, description="another file to start from", examples=["_stack.yml"])
    particle: ParticleChoice | None = Field(
        None,
        description="electron, proton, neutron, muon, an isotope such as Rb-87, or {mass:, charge:}",
        examples=["electron"],
    )
    grid: GridKeys = Field(description="the axes")
    potential: list[Annotated[TermItem, Choice(POTENTIALS, "potential", TermItem)]] = Field(
        default_factory=list, description="terms, summed", max_length=200
    )
    edges: EdgesKeys = Field(default_factory=EdgesKeys, description="what happens at the ends of an axis")
    packet: Annotated[Item, Choice(PACKETS, "packet")] = Field(description="the initial state")
    evolve: EvolveKeys = Field(description="how long and how accurately")
    observables: list[Annotated[Item, Choice(OBSERVABLES, "observable", bare=True)]] | None = Field(
        None, description="what is measured; left out: norm, position, energy", max_length=200
    )
    classical: ClassicalChoice = Field(
        default_factory=ClassicalKeys, description="the F = m a companion of the same job; `none` to skip"
    )
    error_bars: ErrorBarsChoice = Field(
        default_factory=ErrorBarsKeys, description="what the error bars are made from; `none` to skip"
    )
    film: FilmChoice = Field(default_factory=FilmKeys, description="the animation; `none` to skip")
    snapshots: SnapshotKeys | None = Field(None, description="store the field; left out: the final state only")
    expect: list[ExpectKeys] = Field(default_factory=list, description="checks on the results", max_length=500)
    vary: list[VaryEntry] = VARY
    vary_together: list[VaryEntry] = VARY_TOGETHER
