"""What a notebook shows for an audit and for a verdict: the answer and the figures behind it, in a few lines."""

from collections.abc import Iterable
from html import escape

from coverage_lab.records import Audit, Verdict
from coverage_lab.report.document import audit_document
from coverage_lab.report.words import SHORT_WIDTHS, count, how_sure, label_of, least, points, row_of, share

STATUS = {"recommended": "Recommended", "none": "None recommended", "undecided": "Undecided"}


def verdict_html(verdict: Verdict) -> str:
    """The status and the sentence."""
    return f"<p><strong>{STATUS[verdict.status]}.</strong> {escape(verdict.sentence)}</p>"


def audit_html(audit: Audit) -> str:
    """The title, the verdict, the named (or closest) method beside plus-or-minus, and the first caution."""
    document = audit_document(audit)
    verdict, closest = audit.verdict, audit.verdict.closest
    chief = verdict.method or (closest or {}).get("method")
    rows = [row_of(document, name, verdict.n) for name in dict.fromkeys((chief, "wald"))]
    shown = [row for row in rows if row is not None and row["minimum_coverage"] is not None]
    heads = ("Method", "Worst interval coverage", "How sure", "Mean", SHORT_WIDTHS[audit.plan.side].capitalize())
    body = [
        (label_of(document, row["method"]), least(row), how_sure(row), share(row["mean_coverage"], "down"),
         points(row["mean_width"]))
        for row in shown
    ]  # fmt: skip
    return "\n".join(
        [
            f"<h3>{escape(audit.plan.title)}</h3>",
            verdict_html(verdict),
            f"<table><caption>At n = {count(verdict.n)}, over the planned range</caption>",
            f"<thead>{_row(heads, 'col')}</thead>",
            f"<tbody>{''.join(_row(cells, 'row') for cells in body)}</tbody></table>",
            f"<p>{escape(audit.cautions[0])} ({len(audit.cautions) - 1} more in <code>.cautions</code>.)</p>",
        ]
    )


def _row(cells: Iterable[str], scope: str) -> str:
    """A table row: headings throughout, or one at its start."""
    first, *rest = (escape(cell) for cell in cells)
    tag = "th scope='col'" if scope == "col" else "td"
    others = "".join(f"<{tag}>{cell}</{tag.split()[0]}>" for cell in rest)
    return f"<tr><th scope='{scope}'>{first}</th>{others}</tr>"
