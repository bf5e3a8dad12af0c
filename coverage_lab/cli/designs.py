"""`coverage-lab designs`: the catalogue of designs."""

from typing import Any

import click

from coverage_lab.cli import options
from coverage_lab.cli.tables import show_json, show_table

EXAMPLES = """\b
Examples:
  coverage-lab designs
  coverage-lab designs --json
"""


@click.command(epilog=EXAMPLES, short_help="List the designs that a plan can name, with their sources.")
@options.as_json
def designs(as_json: bool) -> None:
    """List the ways in which a sample can arise: kinds, and the layers that lie over any of them.

    A plan names a kind with the keys that it takes under [design]; a layer has a table of its own in there.
    """
    entries = _entries()
    if as_json:
        show_json({"designs": entries})
        return
    rows = [
        (e["name"], "kind" if e["kind"] else "layer", e["label"], ", ".join(e["keys"]), e["source"]) for e in entries
    ]
    show_table(("name", "", "label", "keys", "source"), rows)


def _entries() -> list[dict[str, Any]]:
    """Every kind, then every layer."""
    from coverage_lab.designs import CATALOGUE, LAYERS
    from coverage_lab.plan import DESIGN_KEYS, LAYER_KEYS

    kinds = [_entry(name, item.label, item.source, DESIGN_KEYS[name], True) for name, item in CATALOGUE.items()]
    return [
        *kinds,
        *(_entry(name, item.label, item.source, LAYER_KEYS[name], False) for name, item in LAYERS.items()),
    ]


def _entry(name: str, label: str, source: str, keys: tuple[str, ...], kind: bool) -> dict[str, Any]:
    """One line of the catalogue."""
    return {"name": name, "kind": kind, "label": label, "source": source, "keys": list(keys)}
