"""What a plan may say, table by table, and the wording of everything it says wrong.

A new capability adds a small model here and a line in `TABLES`. Every field's description is what its fault expects.
"""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, Literal, Self

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, ValidationError, model_validator
from pydantic_core import PydanticCustomError

from coverage_lab.checks import shown, unknown
from coverage_lab.plan_lines import Path
from coverage_lab.records import ROUTES, SIDES, Route, Side

LARGEST_N = 10_000_000
LARGEST_REPLICATES = 1_000_000_000
LARGEST_SEED = 2**63 - 1
SHORT_LIST = 3  # a list of up to this many items is shown whole, of a longer one only the wrong item

PERCENT = {"percent": True}  # a proportion that people may write in percent by mistake


def _text(words: str) -> str:
    """Text that can be saved: no half of a character."""
    words.encode("utf-8")
    return words


def _one_line(words: str) -> str:
    """Text for a heading or a legend."""
    if not words.strip() or not words.isprintable():
        raise ValueError
    return _text(words)


def _distinct(items: list[Any]) -> list[Any]:
    """A list without repetitions."""
    if len(set(items)) < len(items):
        raise ValueError
    return items


def _range(ends: list[float]) -> list[float]:
    """[low, high], in order, with something between 0 and 1 to estimate."""
    if not (len(ends) == 2 and 0 <= ends[0] <= ends[1] <= 1 and ends[1] > 0 and ends[0] < 1):
        raise ValueError
    return ends


def between(low: int, high: int) -> str:
    """What a whole number is expected to be."""
    return f"a whole number from {low} to {high}"


def one_of(names: Iterable[str]) -> str:
    """What a word is expected to be."""
    listed = list(names)
    return f"{', '.join(listed[:-1])} or {listed[-1]}" if len(listed) > 1 else listed[0]


SHARE = "a number strictly between 0 and 1"
SIDE = one_of(SIDES)

Words = Annotated[str, AfterValidator(_text), Field(description="text")]
OneLine = Annotated[str, AfterValidator(_one_line), Field(description="one line of text")]
Share = Annotated[float, Field(gt=0, lt=1, description=SHARE, json_schema_extra=PERCENT)]
Size = Annotated[int, Field(ge=1, le=LARGEST_N)]
Positive = Annotated[float, Field(gt=0)]
Factor = Annotated[float, Field(gt=0, description="a number above 0, a multiple of alpha")]
Names = Annotated[
    list[str],
    AfterValidator(_distinct),
    Field(min_length=1, description="a list of different method names, at least one"),
]


class Table(BaseModel):
    """A table of the plan: nothing converted, nothing unknown, NaN and infinity refused."""

    model_config = ConfigDict(strict=True, extra="forbid", frozen=True, allow_inf_nan=False)


class Head(Table):
    """The keys above the first table."""

    title: OneLine | None = Field(default=None, description="one line of text")
    confidence: Share = 0.95
    side: Annotated[Side, Field(description=SIDE)] = "two-sided"


class StudyTable(Table):
    """[study]: words for the protocol."""

    population: Words | None = Field(default=None, description="text")
    unit: Words | None = Field(default=None, description="text")
    target: Literal["population", "process"] | None = Field(default=None, description="population or process")
    range_basis: Words | None = Field(default=None, description="text")


class OutcomeTable(Table):
    """[outcome]: what is counted and where its true proportion should lie."""

    name: OneLine = "event"
    expected: Share | None = Field(default=None, description=SHARE, json_schema_extra=PERCENT)
    range: Annotated[list[float], AfterValidator(_range)] | None = Field(
        default=None,
        description="[low, high] with 0 <= low <= high <= 1, and not [0, 0] or [1, 1]",
        json_schema_extra=PERCENT,
    )
    prior: Annotated[list[Positive], Field(min_length=2, max_length=2)] = Field(
        default=[1.0, 1.0], description="[a, b], the two weights of a Beta distribution, both above 0"
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.expected is None and self.range is None:
            raise _fault("needs", "expected or range")
        if self.expected is not None and self.range is not None:
            low, high = self.range
            if not low <= self.expected <= high:
                raise _fault("field", f"a proportion within the planned range, {low:g} to {high:g}", "expected")
        return self


class SampleTable(Table):
    """[sample]: the planned number of units."""

    n: Size | None = Field(default=None, description=between(1, LARGEST_N))
    candidates: Annotated[list[Size], AfterValidator(_distinct), Field(min_length=1)] | None = Field(
        default=None, description=f"a list of different whole numbers from 1 to {LARGEST_N}"
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.n is None and self.candidates is None:
            raise _fault("needs", "n or candidates")
        if self.n is not None and self.candidates is not None:
            raise _fault("field", "to be left out, since n is given; only one of the two can be", "candidates")
        return self


class StandardTable(Table):
    """[standard]: what is good enough."""

    kind: Annotated[
        Literal["bradley", "guaranteed", "custom"], Field(description="bradley, guaranteed or custom")
    ] = "bradley"
    worst_miss: Factor | None = Field(default=None, description="a number above 0, a multiple of alpha")
    mean_miss: Factor | None = Field(default=None, description="a number above 0, a multiple of alpha")

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        given = [name for name in ("worst_miss", "mean_miss") if getattr(self, name) is not None]
        if self.kind == "custom" and len(given) < 2:
            raise _fault("needs", 'both worst_miss and mean_miss, since kind = "custom"')
        if self.kind != "custom" and given:
            raise _fault("field", 'to be left out unless kind = "custom"', given[0])
        return self


class DesignTable(Table):
    """[design]: how the sample is drawn. Which kinds exist is for the catalogue of designs to say."""

    kind: Annotated[str, Field(description="the name of a design")] = "simple"


class SimulationTable(Table):
    """[simulation]: the simulated route, and which routes to take."""

    replicates: Annotated[
        int, Field(ge=1, le=LARGEST_REPLICATES, description=between(1, LARGEST_REPLICATES))
    ] = 20_000
    seed: Annotated[int, Field(ge=0, le=LARGEST_SEED, description=between(0, LARGEST_SEED))] = 1
    grid: Annotated[list[Annotated[float, Field(ge=0, le=1)]], Field(min_length=1)] | None = Field(
        default=None, description="a list of proportions within the planned range"
    )
    routes: Annotated[
        list[Route],
        AfterValidator(_distinct),
        Field(min_length=1, description=f"a list of {' or '.join(ROUTES)} or both"),
    ] = list(ROUTES)


class MethodsTable(Table):
    """[methods]: what is measured and what may be named. Which methods exist is for the catalogue to say."""

    only: Names | None = Field(default=None, description="a list of different method names, at least one")
    prefer: Names | None = Field(default=None, description="a list of different method names, at least one")


TABLES: dict[str, type[Table]] = {
    "study": StudyTable,
    "outcome": OutcomeTable,
    "sample": SampleTable,
    "standard": StandardTable,
    "design": DesignTable,
    "simulation": SimulationTable,
    "methods": MethodsTable,
}


@dataclass(frozen=True)
class Fault:
    """One fault of a document: where, and what is wrong.

    what: "expected …" for the value found there; with `line_alone` a whole remark about the table or a key's name.
    """

    path: Path
    what: str
    value: object = None
    line_alone: bool = False


@dataclass(frozen=True)
class Checked:
    """A document's tables as far as they are sound, and everything that is not."""

    tables: Mapping[str, Table]
    faults: tuple[Fault, ...]

    def get(self, name: str) -> Any:
        """The sound table of that name, or None; "" is the head."""
        return self.tables.get(name)


def check(document: Mapping[str, Any]) -> Checked:
    """Every table checked by itself, so that a fault in one hides none in another."""
    head = {key: value for key, value in document.items() if key not in TABLES}
    tables: dict[str, Table] = {}
    faults: list[Fault] = []
    for name, model in {"": Head, **TABLES}.items():
        content = head if name == "" else document.get(name, {})
        try:
            tables[name] = model.model_validate(content)
        except ValidationError as error:
            faults += _faults(error, model, (name,) if name else (), content)
    return Checked(tables, tuple(faults))


def _fault(kind: str, what: str, key: str = "") -> PydanticCustomError:
    """A fault between keys: of one of them ("field"), or of the table ("needs")."""
    return PydanticCustomError("between_keys", "{what}", {"kind": kind, "what": what, "key": key})


def _faults(error: ValidationError, model: type[Table], table: Path, content: object) -> Iterator[Fault]:
    """One fault for every key that is wrong, worded by the kind of error."""
    if not isinstance(content, Mapping):
        yield Fault(table, f"a table [{table[0]}]", content)
        return
    seen: set[Path] = set()
    for item in error.errors(include_url=False):
        fault = _worded(item["type"], item["loc"], item.get("ctx", {}), model, table, content)
        if fault.path not in seen or fault.line_alone:
            seen.add(fault.path)
            yield fault


def _worded(
    kind: str, place: Path, context: Mapping[str, Any], model: type[Table], table: Path, content: Mapping[Any, Any]
) -> Fault:
    """Pydantic's error in this project's words."""
    if kind == "between_keys":
        key = context["key"]
        if context["kind"] == "needs":
            return Fault(table, f"expected {context['what']}, came {_came(content)}", line_alone=True)
        return Fault((*table, key), context["what"], content[key])
    name = place[0]
    if kind in ("extra_forbidden", "invalid_key"):
        return Fault((*table, name), _unknown_key(str(name), model, table), line_alone=True)
    field = model.model_fields[str(name)]
    value, path = content[name], (*table, name)
    if len(place) > 1 and isinstance(value, list) and len(value) > SHORT_LIST:
        path, value = (*path, place[1]), value[int(place[1])]
    hint = percent_hint(value) if field.json_schema_extra == PERCENT else ""
    return Fault(path, f"{field.description}{hint}", value)


def _came(content: Mapping[Any, Any]) -> str:
    """The keys that a table does have."""
    return "only " + one_of(str(key) for key in content).replace(" or ", " and ") if content else "neither"


def _unknown_key(name: str, model: type[Table], table: Path) -> str:
    """An unknown key with the nearest known one, or with the table where it belongs."""
    known = [*model.model_fields, *(() if table else TABLES)]
    home = [other for other, its in TABLES.items() if name in its.model_fields and (other,) != table]
    if home and name not in known:
        return f"unknown key {shown(name)}: it belongs in [{home[0]}]"
    if table and name in Head.model_fields:
        return f"unknown key {shown(name)}: it belongs above the first table"
    return unknown("key", name, known)


def percent_hint(value: object) -> str:
    """For a percentage where a proportion is expected: how it is written."""
    for number in value if isinstance(value, list) else [value]:
        if isinstance(number, int | float) and not isinstance(number, bool) and 1 < number <= 100:
            return f" ({number:g} % is written {number / 100:g})"
    return ""


def quoted(value: object) -> str:
    """The value for a fault line; whole numbers too long for Python to print are described."""
    try:
        return shown(value)
    except ValueError:
        return "a number of thousands of digits"
