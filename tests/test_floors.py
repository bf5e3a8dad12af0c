"""Imports only point down: every room of the house may import only the rooms that its row names."""

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "coverage_lab"

GROUND = {"records", "records_sizing", "checks", "probability", "probability_finite", "rounding", "sentences"}
CATALOGUES = {"intervals", "designs"}
ADVICE = {"verdict", "reach", "cautions", "sizing", "precision"}
EDGES = {"plan", "plan_text", "report"}

ROOMS: dict[str, set[str]] = {
    # floor 0, ground
    "records": set(),
    "checks": set(),
    "rounding": set(),
    "plan_text": set(),
    "probability": {"records"},
    "probability_finite": {"records", "probability"},
    "records_sizing": {"records"},
    "sentences": {"records", "rounding"},
    # floor 1, catalogues: blind to each other
    "intervals": GROUND,
    "designs": GROUND,
    # floor 2, engine: knows neither catalogue
    "engine": GROUND,
    # floor 3, advice
    "reach": GROUND | {"engine"},
    "cautions": GROUND,
    "verdict": GROUND | {"engine", "reach"},
    "sizing": GROUND | CATALOGUES | {"engine", "reach", "verdict"},
    "precision": GROUND | {"sizing"},
    # floor 4, edges: words in, pages out
    "plan": GROUND | CATALOGUES | {"plan_text"},
    "report": GROUND | {"plan_text"},
    # floor 5, the line
    "study": GROUND | CATALOGUES | ADVICE | EDGES | {"engine"},
    # floor 6, door
    "cli": GROUND | CATALOGUES | ADVICE | EDGES | {"engine", "study"},
    "__main__": {"cli"},
    "__init__": GROUND | CATALOGUES | EDGES | {"study"},
}


def room_of(path: Path) -> str:
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imported_rooms(tree: ast.AST) -> set[str]:
    """Rooms of this package named by any import, those inside functions included."""
    rooms = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            names = [node.module or ""]
            if node.module == "coverage_lab":
                names = [f"coverage_lab.{alias.name}" for alias in node.names]
        elif isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        else:
            continue
        rooms |= {name.split(".")[1] for name in names if name.startswith("coverage_lab.")}
    return rooms


@pytest.mark.parametrize("path", sorted(PACKAGE.rglob("*.py")), ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_point_down(path: Path) -> None:
    room = room_of(path)
    assert room in ROOMS, f"{path.name} is in no room of the table"
    allowed = ROOMS[room] | {room, "__version__"}
    above = imported_rooms(ast.parse(path.read_text(encoding="utf-8"))) - allowed
    assert not above, f"{path.relative_to(PACKAGE)} imports {sorted(above)}: not below it"


def test_a_wrong_import_is_caught() -> None:
    tree = ast.parse("def f():\n    from coverage_lab.verdict import decide\n")
    assert imported_rooms(tree) - ROOMS["engine"] == {"verdict"}


def test_the_table_has_no_cycle() -> None:
    done: set[str] = set()
    while len(done) < len(ROOMS):
        free = {room for room, below in ROOMS.items() if room not in done and below <= done}
        assert free, f"a cycle among {sorted(set(ROOMS) - done)}"
        done |= free


def test_no_file_is_long() -> None:
    long = {path.name: k for path in PACKAGE.rglob("*.py") if (k := len(path.read_text().splitlines())) > 350}
    assert not long
