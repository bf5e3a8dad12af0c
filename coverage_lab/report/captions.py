"""What stands below each figure, and what a reader who cannot see it is told: the finding, not the picture."""

from coverage_lab.report.folder import Saved
from coverage_lab.report.style import chief, pair
from coverage_lab.report.words import Document, count, joined, label_of, place, points, row_of, share, sizes

Words = tuple[str, str]  # caption, alternative text

SCALE = "The coverage scale is stretched around the nominal level."


def _worst(document: Document, name: str, n: int) -> str:
    """'Wilson score falls to 92.7 % at p = 0.624 %'."""
    row = row_of(document, name, n)
    if row is None or row["minimum_coverage"] is None:
        return f"{label_of(document, name)} is not measured"
    return f"{row['label']} falls to {share(row['minimum_coverage'], 'down')} at p = {place(row['minimum_at'])}"


def _pair(document: Document, n: int) -> str:
    return "; ".join(_worst(document, name, n) for name in pair(document))


def coverage(saved: Saved) -> Words:
    """Coverage against p."""
    document, n = saved.document, saved.document["verdict"]["n"]
    simulated = " Points are simulated, with two Monte Carlo standard errors on either side." if _drawn(saved) else ""
    curves = "Curves are enumerated." if not saved.curve.empty else "Lines only join the simulated points."
    caption = (
        f"Interval coverage against the true proportion. {curves}{simulated} Open marks show where each emphasised "
        f"method is worst within the planned range (shaded); other methods are grey. {SCALE}"
    )
    return caption, f"At n = {count(n)}, against a nominal {share(1 - document['alpha'])}: {_pair(document, n)}."


def coverage_by_n(saved: Saved) -> Words:
    """Coverage over p and n."""
    document = saved.document
    ends = (sizes(document)[0], sizes(document)[-1])
    findings = " ".join(f"At n = {count(n)}: {_pair(document, n)}." for n in ends)
    caption = (
        "Interval coverage over true proportion and n: the darker, the further below nominal. Dashed lines: planned "
        "range. Between planned sizes nothing is computed; each band belongs to the n beside it."
    )
    return caption, findings


def saw(saved: Saved) -> Words:
    """Worst coverage against n."""
    document = saved.document
    told = []
    for _, beside in saved.steady.groupby("planned"):
        for name in pair(document):
            rows = beside[beside["method"] == name]
            if not rows.empty:
                low, high = (share(1 - float(rows["worst_miss"].agg(pick)), "down") for pick in ("max", "min"))
                between = f"n = {count(int(rows['n'].min()))} to {count(int(rows['n'].max()))}"
                told.append(f"{between}: {label_of(document, name)} {low} to {high} at worst")
    caption = (
        "Worst interval coverage in the planned range at every n around the planned one, for the methods that may be "
        f"named and plus-or-minus; exact at each n. The number evaluated is seldom exactly the number planned. {SCALE}"
    )
    return caption, f"{'; '.join(told)}."


def extremes(saved: Saved) -> Words:
    """Worst and mean coverage per method."""
    document = saved.document
    n = document["verdict"]["n"]
    passing = [row["label"] for row in document["methods"] if row["n"] == n and row["passes"] is True]
    caption = (
        "Worst and mean interval coverage over the planned range, by method. Dotted: what the standard asks "
        f"everywhere. {SCALE}"
    )
    met = f"The standard is met by {joined(passing)}" if passing else "No method meets the standard"
    return caption, f"{met}. {_pair(document, n)}."


def width(saved: Saved) -> Words:
    """The price in width."""
    document = saved.document
    n, name = document["verdict"]["n"], chief(document)
    rows = [row for row in document["methods"] if row["n"] == n and row["mean_width"] is not None]
    widest, narrowest = (pick(rows, key=lambda row: row["mean_width"]) for pick in (max, min))
    own = row_of(document, name, n)
    said = f"{label_of(document, name)} {points(own['mean_width'])}; " if name and own else ""
    finding = (
        f"{said}narrowest {narrowest['label']}, {points(narrowest['mean_width'])}; "
        f"widest {widest['label']}, {points(widest['mean_width'])}."
    )
    what = {
        "two-sided": "Mean width of the interval",
        "upper": "Mean excess of the upper bound over the true proportion",
        "lower": "Mean excess of the true proportion over the lower bound",
    }[document["side"]]
    return f"{what} over the planned range; to the right, relative to the method marked by the line.", finding


def misses(saved: Saved) -> Words:
    """Misses on each side."""
    document = saved.document
    n = document["verdict"]["n"]
    told = []
    for name in pair(document):
        row = row_of(document, name, n)
        if row is not None and row["missed_below"] is not None:
            told.append(f"{row['label']}: too low {share(row['missed_below'])}, too high {share(row['missed_above'])}")
    caption = (
        "How often the interval misses on each side, on average over the planned range: too low (it ends below the "
        "true proportion) to the left, too high to the right."
    )
    return caption, f"Mean misses. {'; '.join(told)}."


def cross_check(saved: Saved) -> Words:
    """Agreement of the routes."""
    check = saved.document["cross_check"]
    largest = "not finite" if check["largest_z"] is None else f"{check['largest_z']:.2f}"
    caption = (
        "Difference between simulated and enumerated coverage in standard errors, one mark per n, true proportion and "
        "method. Methods share their draws, so marks of one proportion move together."
    )
    finding = f"Over {count(check['cells'])} cells the largest |z| is {largest}"
    return caption, f"{finding} (Bonferroni p = {check['p_value']:.2g})."


def _drawn(saved: Saved) -> bool:
    return bool((saved.cells["route"] == "simulated").any())
