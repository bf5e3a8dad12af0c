"""Method and n together, with what each alternative would cost in units.

Of the preference list the method with the smallest n that meets every target from there on; an earlier one on the list
wins when its n is at most 5 % larger.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import pandas as pd

from coverage_lab.records import Plan
from coverage_lab.records_sizing import Decided, Inflation, Ladder, Seen, SizingVerdict, rows_of
from coverage_lab.sizing import words
from coverage_lab.sizing.formula import ladder
from coverage_lab.sizing.search import ByTarget, Search, Targets

LARGER = 1.05  # an earlier method on the list may ask for this many times the smallest n
USUAL_POWER = 0.8  # of success at the hoped-for rate, when the plan states none (common practice)


Row = Mapping[str, Any]


@dataclass(frozen=True)
class Gathered:
    """All answers from which the recommendation is made; `search` is None when no target is about an interval."""

    plan: Plan
    targets: Targets
    inflation: Inflation
    search: Search | None
    rare: pd.DataFrame
    seen: Seen | None
    decision: Decided | None

    @property
    def listed(self) -> tuple[str, ...]:
        """The names of the preference list."""
        return tuple(method.name for method in self.plan.prefer)

    def label(self, name: str) -> str:
        """A method's label."""
        return next((method.label for method in (*self.plan.prefer, *self.plan.methods) if method.name == name), name)


def safe_for_all(found: ByTarget, names: Sequence[str], partly: bool = False) -> int | None:
    """The n from which all targets are met, or None; `partly` leaves out those that the method was not scanned for."""
    items = [found[name] for name in names if not (partly and found[name] is None)]
    sizes = [item.safe_n for item in items if item is not None and item.safe_n is not None]
    return max(sizes) if items and len(sizes) == len(items) else None


def first_for_all(search: Search, method: str, targets: Targets) -> int | None:
    """The smallest n that meets all targets at once: of the exact scan, else the safe one found beyond it."""
    found = search.by_method[method]
    if any(found[name] is None for name in targets.names):
        return None
    mine = search.figures[search.figures["method"] == method]
    met = pd.Series(True, index=mine.index)
    for name in targets.names:
        met &= targets.met(mine, name)
    return int(mine.loc[met, "n"].iloc[0]) if met.any() else safe_for_all(found, targets.names)


def chosen_rare(rare: pd.DataFrame, power: float) -> Row | None:
    """The fewest events allowed that succeed with `power` at the hoped-for rate; else the best chance."""
    usable = sorted((row for row in rows_of(rare) if row["n"] is not None), key=lambda row: int(row["events"]))
    chances = [row["probability_at_hoped_for"] for row in usable]
    if not usable or None in chances:
        return usable[0] if usable else None
    best = usable[chances.index(max(chances))]
    return next((row for row in usable if row["probability_at_hoped_for"] >= power), best)


def pick(sizes: Mapping[str, int], prefer: Sequence[str]) -> str | None:
    """The method that the rule names; `sizes` holds the listed methods that have an n."""
    least = min(sizes.values(), default=0)
    return next((name for name in prefer if name in sizes and sizes[name] <= LARGER * least), None)


def recommend(gathered: Gathered) -> tuple[SizingVerdict, Ladder | None]:
    """The verdict over all targets of the plan, and the ladder from its n to units."""
    counts, row = _counts(gathered)
    needs = dict(counts)
    method = None
    if gathered.search is not None:
        safe = {name: safe_for_all(gathered.search.by_method[name], gathered.targets.names) for name in gathered.listed}
        floor = max([n for n in counts.values() if n is not None], default=0)
        method = pick({name: max(n, floor) for name, n in safe.items() if n is not None}, gathered.listed)
        needs["interval"] = safe[method] if method else None
    known = {name: n for name, n in needs.items() if n is not None}
    if len(known) < len(needs) or not needs:
        return _nothing(gathered, known, [name for name in needs if name not in known]), None
    ladders = {name: _ladder(gathered, name, n) for name, n in known.items()}
    binding = max(ladders, key=lambda name: (ladders[name].units, known[name]))
    return _recommended(gathered, method, known, binding, ladders[binding], row), ladders[binding]


def _counts(gathered: Gathered) -> tuple[dict[str, int | None], Row | None]:
    """What rare outcomes and the decision ask for, and the row of the events allowed."""
    rare, decision = gathered.plan.rare, gathered.plan.decision
    row = chosen_rare(gathered.rare, decision.power if decision else USUAL_POWER)
    counts: dict[str, int | None] = {}
    if rare is not None and rare.limit is not None:
        counts["rare"] = int(row["n"]) if row else None
    if rare is not None and rare.see_at_least is not None:
        counts["seen"] = gathered.seen.n if gathered.seen else None
    if gathered.decision is not None:
        counts["decision"] = gathered.decision.n
    return counts, row


def _ladder(gathered: Gathered, need: str, n: int) -> Ladder:
    """From n to units; counts for rare outcomes are of the finite population already."""
    return ladder(n, gathered.inflation, finite=need not in ("rare", "seen"))


def _recommended(
    gathered: Gathered, method: str | None, needs: dict[str, int], binding: str, steps: Ladder, row: Row | None
) -> SizingVerdict:
    """An n that meets every target."""
    plan, search = gathered.plan, gathered.search
    said = [words.size(needs[binding], binding, needs, steps)]
    if method is not None and search is not None:
        said.append(words.interval(plan, gathered.label(method), needs["interval"], search.horizon))
    if row is not None and plan.rare is not None:
        said.append(words.rare(plan.rare, row, plan.confidence))
    if gathered.decision is not None and plan.decision is not None:
        said.append(words.decision(plan.decision, gathered.decision))
    exact = "clopper-pearson" if gathered.inflation.population is None else None  # its limits take the exact decisions
    return SizingVerdict(
        status="recommended",
        method=method or exact,
        n=needs[binding],
        units=steps.units,
        sentence=" ".join(said),
        prefer=gathered.listed,
        needs=needs,
        alternatives=_alternatives(gathered, method, steps.units),
        best=None,
    )


def _alternatives(gathered: Gathered, method: str | None, units: int | None) -> tuple[Mapping[str, Any], ...]:
    """Every other scanned method: its n, its cost in units beside the named one, and what speaks against it."""
    found = []
    for name, by in gathered.search.by_method.items() if gathered.search else ():
        if name != method:
            safe = safe_for_all(by, gathered.targets.names, partly=True)
            own = _ladder(gathered, "interval", safe).units if safe is not None else None
            more = own - units if own is not None and units is not None else None
            found.append({"method": name, "safe_n": safe, "more_units": more, "against": _against(gathered, name, by)})
    return tuple(found)


def _against(gathered: Gathered, name: str, by: ByTarget) -> str:
    """What speaks against planning for this method."""
    points = []
    failing = [words.TARGETS[target] for target, item in by.items() if item is not None and item.safe_n is None]
    if failing and gathered.search is not None:
        points.append(f"{' and '.join(failing)} not reached for good up to n = {gathered.search.horizon}")
    if any(by[target] is None for target in gathered.targets.names):
        points.append("its coverage was not scanned")
    if name not in gathered.listed:
        points.append("not on the preference list")
    return "; ".join(points) or "asks for more, or comes later on the preference list"


def _nothing(gathered: Gathered, needs: dict[str, int], lacking: list[str]) -> SizingVerdict:
    """No n meets every target: which one failed, and the best that was found."""
    best = _best(gathered) if "interval" in lacking else None
    horizon = gathered.plan.horizon or (gathered.search.horizon if gathered.search else None)
    labels = [gathered.label(name) for name in gathered.listed]
    return SizingVerdict(
        status="none",
        method=None,
        n=None,
        units=None,
        sentence=words.nothing(lacking, labels, horizon, best),
        prefer=gathered.listed,
        needs=needs,
        alternatives=_alternatives(gathered, None, None),
        best=best,
    )


def _best(gathered: Gathered) -> Mapping[str, Any] | None:
    """The listed method and n that meet the most targets, the largest such n: closest, not recommended."""
    if gathered.search is None:
        return None
    figures = gathered.search.figures
    mine = figures[figures["method"].isin(gathered.listed)].reset_index(drop=True)
    met = pd.DataFrame({name: gathered.targets.met(mine, name) for name in gathered.targets.names})
    count = met.sum(axis=1)
    place = int(mine.loc[count == count.max(), "n"].idxmax())
    row = mine.iloc[place]
    return {
        "method": str(row["method"]),
        "label": gathered.label(str(row["method"])),
        "n": int(row["n"]),
        "meets": [name for name in gathered.targets.names if met.loc[place, name]],
        "minimum_coverage": _number(1 - row["worst_miss"]),
        "mean_coverage": _number(1 - row["mean_miss"]),
        "half_width": _number(row["half_width"]),
        "assurance": _number(row["assurance"]),
    }


def _number(value: float) -> float | None:
    """A figure, or None where none was computed."""
    return float(value) if pd.notna(value) else None
