"""The report: an audit is saved as a folder of plain files, and figures and page are made from those files alone."""

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from coverage_lab.records import Audit
from coverage_lab.records_sizing import Sizing
from coverage_lab.report.document import audit_document
from coverage_lab.report.folder import Saved, check_target, load, save
from coverage_lab.report.sizing_folder import SavedSizing, check_sizing_target, load_sizing, sizing_document

__all__ = [
    "Saved",
    "SavedSizing",
    "audit_document",
    "check_sizing_target",
    "check_target",
    "load",
    "load_sizing",
    "rewrite",
    "rewrite_sizing",
    "save",
    "sizing_document",
    "write",
    "write_sizing",
]


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


def write_sizing(
    sizing: Sizing,
    folder: Path,
    overwrite: bool = False,
    *,
    provenance: Mapping[str, Any] | None = None,
    progress: Callable[[str, float], None] | None = None,
) -> Path:
    """Write a sample size's data, figures and page, all of them or nothing; the path of the page.

    provenance: version, libraries, plan_sha256 and when it was made; without it all but the last, so that the same
    answer gives the same bytes.

    Raises:
        InputFault: the folder holds an audit, another plan's sample size or other people's files, and `overwrite` is
            not set.
        OSError: the folder cannot be written; nothing half-written is left.
    """
    from coverage_lab.report.sizing_page import write_report

    return write_report(sizing, folder, overwrite, provenance=provenance, progress=progress)


def rewrite_sizing(folder: Path, progress: Callable[[str, float], None] | None = None) -> Path:
    """Make figures and page of a sample size again from the folder's saved files alone; the path of the page.

    Raises:
        InputFault: the folder holds no sample size of ours, or its files are damaged.
        OSError: a file cannot be read or written; the old page stays.
    """
    from coverage_lab.report.sizing_page import write as write_page

    return write_page(folder, progress)
