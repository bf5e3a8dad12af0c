"""What a plan may say, table by table.

A new capability adds a small model and a line in `tables.TABLES`. Every field's description is what its fault expects;
"item" in its extras is what a fault of one item of a list expects, "percent" marks proportions that people may write in
percent by mistake.
"""

import unicodedata
from collections.abc import Iterable
from decimal import Decimal
from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, JsonValue, model_validator
from pydantic_core import PydanticCustomError

from coverage_lab.records import ROUTES, SIDES, Route, Side

LARGEST_N = 10_000_000
LARGEST_POPULATION = 1_000_000_000
LARGEST_REPLICATES = 1_000_000_000
LARGEST_SEED = 2**63 - 1
MOST_EFFECT = 10_000  # the variance of a clustered sample over that of a simple one

PERCENT: dict[str, JsonValue] = {"percent": True}


def _text(words: str) -> str:
    """Text that can be saved and printed: no half of a character, no control codes but those that lay out text."""
    if any(unicodedata.category(letter) in ("Cc", "Cs") and letter not in "\t\n\r" for letter in words):
        raise ValueError
    return words


def _one_line(words: str) -> str:
    """Text for a heading or a legend."""
    if not words.strip() or words.splitlines() != [words]:
        raise ValueError
    return _text(words)


def distinct(items: list[Any]) -> list[Any]:
    """A list without repetitions."""
    if len(set(items)) < len(items):
        raise ValueError
    return items


def _told_apart(strata: list["StratumTable"]) -> list["StratumTable"]:
    """Strata without repeated names."""
    distinct([stratum.name for stratum in strata])
    return strata


def _range(ends: list[float]) -> list[float]:
    """[low, high], in order, with something between 0 and 1 to estimate."""
    if not (len(ends) == 2 and 0 <= ends[0] <= ends[1] <= 1 and ends[1] > 0 and ends[0] < 1):
        raise ValueError
    return [end + 0.0 for end in ends]  # -0.0 becomes 0.0


def between(low: int, high: int) -> str:
    """What a whole number is expected to be."""
    return f"a whole number from {low} to {high}"


def one_of(names: Iterable[str]) -> str:
    """What a word is expected to be."""
    listed = list(names)
    return f"{', '.join(listed[:-1])} or {listed[-1]}" if len(listed) > 1 else listed[0]


def between_keys(kind: Literal["needs", "field"], what: str, key: str = "") -> PydanticCustomError:
    """A fault between keys: of the table, which lacks something, or of one key."""
    return PydanticCustomError("between_keys", "{what}", {"kind": kind, "what": what, "key": key})


SHARE = "a number strictly between 0 and 1"
FACTOR = "a number above 0, a multiple of alpha"
NAMES = "a list of different method names, at least one"
SIZE = between(1, LARGEST_N)
STRATUM = "name (text), weight (a number), n (a whole number) and, if needed, odds_ratio (a number)"

Words = Annotated[str, AfterValidator(_text)]
OneLine = Annotated[str, AfterValidator(_one_line)]
Share = Annotated[float, Field(gt=0, lt=1)]
Size = Annotated[int, Field(ge=1, le=LARGEST_N)]
Positive = Annotated[float, Field(gt=0)]
Names = Annotated[list[str], AfterValidator(distinct), Field(min_length=1)]


def _item(what: str) -> dict[str, JsonValue]:
    """The extras of a list: what each item is expected to be."""
    return {"item": what}


class Table(BaseModel):
    """A table of the plan: nothing converted, nothing unknown, neither NaN nor infinity."""

    model_config = ConfigDict(strict=True, extra="forbid", frozen=True, allow_inf_nan=False)

    optional: ClassVar[bool] = False  # whether a plan without this table is another plan than one with it left empty


class Head(Table):
    """The keys above the first table."""

    title: OneLine | None = Field(None, description="one line of text")
    confidence: Share = Field(0.95, description=SHARE, json_schema_extra=PERCENT)
    side: Side = Field("two-sided", description=one_of(SIDES))


class StudyTable(Table):
    """[study]: words for the protocol."""

    population: Words | None = Field(None, description="text")
    unit: Words | None = Field(None, description="text")
    target: Literal["population", "process"] | None = Field(None, description="population or process")
    range_basis: Words | None = Field(None, description="text")


class OutcomeTable(Table):
    """[outcome]: what is counted and where its true proportion should lie."""

    name: OneLine = Field("event", description="one line of text")
    expected: Share | None = Field(None, description=SHARE, json_schema_extra=PERCENT)
    range: Annotated[list[float], AfterValidator(_range)] | None = Field(
        None, description="[low, high] with 0 <= low <= high <= 1, not [0, 0] or [1, 1]", json_schema_extra=PERCENT
    )
    prior: list[Positive] = Field(
        [1.0, 1.0], min_length=2, max_length=2, description="[a, b], two weights of a Beta distribution, both above 0"
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.expected is not None and self.range is not None:
            low, high = self.range
            if not low <= self.expected <= high:
                raise between_keys("field", f"a proportion within the planned range, {low} to {high}", "expected")
        return self

    @property
    def stated(self) -> bool:
        """Whether the plan says where the true proportion should lie."""
        return self.expected is not None or self.range is not None

    @property
    def middle(self) -> float | None:
        """The expected proportion: as stated, else the middle of the range; sums are decimal, as people do them."""
        if self.expected is not None or self.range is None:
            return self.expected
        low, high = (Decimal(repr(end)) for end in self.range)
        return float((low + high) / 2)


class SampleTable(Table):
    """[sample]: the planned number of units, and how far larger ones are looked at."""

    n: Size | None = Field(None, description=SIZE)
    candidates: Annotated[list[Size], AfterValidator(distinct), Field(min_length=1)] | None = Field(
        None, description=f"a list of different whole numbers from 1 to {LARGEST_N}", json_schema_extra=_item(SIZE)
    )
    horizon: Size | None = Field(None, description=SIZE)

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.n is not None and self.candidates is not None:
            raise between_keys("field", "to be left out, since n is given; only one of the two can be", "candidates")
        return self

    @property
    def sizes(self) -> tuple[int, ...]:
        """The planned n, or the candidates."""
        return (self.n,) if self.n is not None else tuple(self.candidates or ())


class StandardTable(Table):
    """[standard]: what is good enough."""

    kind: Literal["bradley", "guaranteed", "custom"] = Field("bradley", description="bradley, guaranteed or custom")
    worst_miss: Positive | None = Field(None, description=FACTOR)
    mean_miss: Positive | None = Field(None, description=FACTOR)

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        given = [name for name in ("worst_miss", "mean_miss") if getattr(self, name) is not None]
        if self.kind == "custom" and len(given) < 2:
            raise between_keys("needs", 'the keys worst_miss and mean_miss, since kind = "custom"')
        if self.kind != "custom" and given:
            raise between_keys("field", 'to be left out unless kind = "custom"', given[0])
        return self


class StratumTable(Table):
    """One of [[design.strata]]: a part of the population that is sampled by itself."""

    name: OneLine
    weight: float
    n: Annotated[int, Field(ge=0, le=LARGEST_N)]
    odds_ratio: float = 1.0


class DesignTable(Table):
    """[design]: how the sample is drawn. Which kinds exist is for the catalogue of designs to say."""

    kind: str = Field("simple", description="the name of a design")
    population: Annotated[int, Field(ge=1, le=LARGEST_POPULATION)] | None = Field(
        None, description=between(1, LARGEST_POPULATION)
    )
    design_effect: Annotated[float, Field(gt=0, le=MOST_EFFECT)] | None = Field(
        None, description=f"a number above 0, at most {MOST_EFFECT}"
    )
    cluster_size: Size | Annotated[list[Size], Field(min_length=1)] | None = Field(
        None, description=f"{SIZE}, or a list of such numbers, one a cluster"
    )
    cluster_cv: float | None = Field(None, description="a number of at least 0")
    icc: float | None = Field(None, description="a number of at least 0 and below 1")
    strata: Annotated[list[StratumTable], AfterValidator(_told_apart), Field(min_length=1)] | None = Field(
        None,
        description=f"a list of strata with different names, each with {STRATUM}",
        json_schema_extra=_item(STRATUM),
    )


class SimulationTable(Table):
    """[simulation]: the simulated route, and which routes to take."""

    replicates: int = Field(20_000, ge=1, le=LARGEST_REPLICATES, description=between(1, LARGEST_REPLICATES))
    seed: int = Field(1, ge=0, le=LARGEST_SEED, description=between(0, LARGEST_SEED))
    grid: Annotated[list[float], Field(min_length=1)] | None = Field(
        None,
        description="a list of proportions within the planned range, at least one",
        json_schema_extra=_item("a proportion within the planned range"),
    )
    routes: Annotated[list[Route], AfterValidator(distinct)] = Field(
        list(ROUTES),
        min_length=1,
        description=f"a list of {one_of(ROUTES)}, or both",
        json_schema_extra=_item(one_of(ROUTES)),
    )


class MethodsTable(Table):
    """[methods]: what is measured and what may be named. Which methods exist is for the catalogue to say."""

    only: Names | None = Field(None, description=NAMES, json_schema_extra=_item("the name of a method"))
    prefer: Names | None = Field(None, description=NAMES, json_schema_extra=_item("the name of a method"))
