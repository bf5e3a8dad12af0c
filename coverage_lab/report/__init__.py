"""The report: an audit is saved as a folder of plain files, and figures and page are made from those files alone."""

from collections.abc import Callable
from pathlib import Path

from coverage_lab.records import Audit
from coverage_lab.report.document import audit_document
from coverage_lab.report.folder import Saved, check_target, load, save

__all__ = ["Saved", "audit_document", "check_target", "load", "rewrite", "save", "write"]


def write(
    audit: Audit, folder: Path, *, overwrite: bool = False, progress: Callable[[str, float], None] | None = None
) -> Path:
    """Write data, figures and page, all of them or nothing; the path of the page.

    Raises:
        InputFault: the folder holds another plan's report or other people's files, and `overwrite` is not set.
        OSError: the folder cannot be written; nothing half-written is left.
    """
    from coverage_lab.report.page import write_report  # matplotlib and jinja2 are loaded only where a page is made

    return write_report(audit, folder, overwrite=overwrite, progress=progress)


def rewrite(folder: Path, progress: Callable[[str, float], None] | None = None) -> Path:
    """Make figures and page again from the folder's saved files alone; the path of the page.

    Raises:
        InputFault: the folder holds no audit of ours, or its files are damaged.
        OSError: a file cannot be read or written; the old page stays.
    """
    from coverage_lab.report.page import write as write_page

    return write_page(folder, progress)
