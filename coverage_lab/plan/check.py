"""A document held against the schema, and pydantic's errors in this project's words."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, TypeVar

from pydantic import ValidationError

from coverage_lab.checks import shown, unknown
from coverage_lab.plan.faults import Fault
from coverage_lab.plan.lines import KeyPath
from coverage_lab.plan.schema import Head, Table
from coverage_lab.plan.tables import TABLES

AnyTable = TypeVar("AnyTable", bound=Table)


@dataclass(frozen=True)
class Checked:
    """A document's tables as far as they are sound, by name ("" is the head), and everything that is not."""

    tables: Mapping[str, Table]
    faults: tuple[Fault, ...]

    def find(self, model: type[AnyTable]) -> AnyTable | None:
        """The table of that kind, or None when it is not sound."""
        return next((table for table in self.tables.values() if isinstance(table, model)), None)

    def get(self, model: type[AnyTable]) -> AnyTable:
        """The table of that kind in a document without faults."""
        found = self.find(model)
        if found is None:
            raise LookupError(f"{model.__name__} is not sound")
        return found


def check(document: Mapping[str, Any]) -> Checked:
    """Every table checked by itself, so that a fault in one hides none in another."""
    places = [_Place("", Head, _head(document)), *_places(document)]
    tables: dict[str, Table] = {}
    faults: list[Fault] = []
    for place in places:
        name = place.name
        table, found = _check_table(place)
        faults += found
        if table is not None:
            tables[name] = table
    return Checked(tables, tuple(faults))


def check_head(document: Mapping[str, Any]) -> Checked:
    """Only the keys above the first table."""
    table, faults = _check_table(_Place("", Head, _head(document)))
    return Checked({"": table} if table is not None else {}, tuple(faults))


def _head(document: Mapping[str, Any]) -> dict[str, Any]:
    """What is no table of ours, unknown names included."""
    return {key: value for key, value in document.items() if key not in TABLES}


def _places(document: Mapping[str, Any]) -> Iterator["_Place"]:
    """The tables to be looked at: all that are there, and those that stand for their defaults when left out."""
    for name, model in TABLES.items():
        *outer, last = name.split(".")
        around: Any = document
        for part in outer:
            around = around.get(part, {})
            if not isinstance(around, Mapping):  # which is a fault of its own
                around = {}
        if last in around or not model.optional:
            yield _Place(name, model, around.get(last, {}))


@dataclass(frozen=True)
class _Place:
    """A table that was looked at: its name, what it may hold, what it holds."""

    name: str
    model: type[Table]
    content: Any  # whatever stands in the document

    def path(self, *keys: str | int) -> KeyPath:
        """The path of a key of this table."""
        return (*self.name.split("."), *keys) if self.name else keys

    @property
    def title(self) -> str:
        """As a plan file writes it; nothing for the head."""
        return f"[{self.name}]" if self.name else ""

    @property
    def inner(self) -> list[str]:
        """The tables inside this one, which are looked at by themselves."""
        return [name.removeprefix(f"{self.name}.") for name in TABLES if self.name and name.startswith(f"{self.name}.")]


def _check_table(place: _Place) -> tuple[Table | None, list[Fault]]:
    """The table as far as its known keys are sound, and its faults."""
    if not isinstance(place.content, Mapping):
        return None, [Fault(place.path(), f"a table {place.title}", place.content)]
    fields = place.model.model_fields
    unknown_keys = [key for key in place.content if key not in fields and key not in place.inner]
    faults = [Fault(place.path(key), _unknown_key(str(key), place), where=place.title) for key in unknown_keys]
    try:
        known_part = {key: value for key, value in place.content.items() if key in fields}
        return place.model.model_validate(known_part), faults
    except ValidationError as error:
        return None, [*faults, *_faults(error, place)]


def _faults(error: ValidationError, place: _Place) -> Iterator[Fault]:
    """One fault for every key or item that is wrong."""
    seen: set[KeyPath] = set()
    for item in error.errors(include_url=False):
        between = item["type"] == "between_keys"
        fault = _worded_between(item["ctx"], place) if between else _worded(item["loc"], place)
        if fault.path not in seen:
            seen.add(fault.path)
            yield fault


def _worded(at: KeyPath, place: _Place) -> Fault:
    """What was expected of a key or, when the schema says so, of one item of its list."""
    name = at[0]
    expects = place.model.model_fields[str(name)]
    extras = expects.json_schema_extra if isinstance(expects.json_schema_extra, dict) else {}
    value, path, what = place.content[name], place.path(name), expects.description
    if len(at) > 1 and "item" in extras:
        value, path, what = value[int(at[1])], (*path, at[1]), str(extras["item"])
    return Fault(path, f"{what}{percent_hint(value) if 'percent' in extras else ''}", value)


def _worded_between(context: Mapping[str, Any], place: _Place) -> Fault:
    """A fault between keys."""
    if context["kind"] == "field":
        return Fault(place.path(context["key"]), context["what"], place.content[context["key"]])
    return Fault(place.path(), f"expected {context['what']}, came {_came(place.content)}", where=place.title)


def _came(content: Mapping[str, Any]) -> str:
    """The keys of a table that lacks one."""
    keys = [key if str(key).isprintable() else repr(key) for key in content]
    return f"only {', '.join(keys)}" if keys else "nothing"


def _unknown_key(name: str, place: _Place) -> str:
    """An unknown key with the nearest known one, or with the place where it belongs."""
    homes = [table for table, model in TABLES.items() if name in model.model_fields]
    if not place.name and homes:
        return f"unknown key {shown(name)}: it belongs in [{homes[0]}]"
    if place.name and name in Head.model_fields:
        return f"unknown key {shown(name)}: it belongs above the first table"
    others = place.inner if place.name else [table for table in TABLES if "." not in table]
    return unknown("key", name, [*place.model.model_fields, *others])


def percent_hint(value: object) -> str:
    """For a percentage where a proportion is expected: how it is written."""
    for number in value if isinstance(value, list) else [value]:
        if isinstance(number, int | float) and not isinstance(number, bool) and 1 < number <= 100:
            return f" ({number:g} % is written {number / 100:g})"
    return ""
