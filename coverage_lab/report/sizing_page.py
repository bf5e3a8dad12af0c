"""The page of a sample size: a report folder's saved files in, figures and report.html out."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from matplotlib.figure import Figure

from coverage_lab.records_sizing import Sizing
from coverage_lab.report import page, sizing_captions, sizing_figures
from coverage_lab.report.captions import Words
from coverage_lab.report.folder import DATA_FILES, PAGE
from coverage_lab.report.sizing_folder import (
    OPTIONAL,
    SavedSizing,
    check_sizing_target,
    load_sizing,
    write_data,
)
from coverage_lab.report.sizing_view import page_content
from coverage_lab.report.staging import staged


def _covered(saved: SavedSizing) -> bool:
    return bool(saved.scan["minimum_coverage"].notna().any())


def _precise(saved: SavedSizing) -> bool:
    return saved.document["targets"]["precision"] is not None and not saved.scan.empty


def _rare(saved: SavedSizing) -> bool:
    return not saved.characteristic.empty


def _decided(saved: SavedSizing) -> bool:
    return not saved.decision.empty


@dataclass(frozen=True)
class Picture:
    """A figure of the report: how it is drawn, what is said of it, and when there is anything to draw."""

    name: str
    draw: Callable[[SavedSizing], Figure]
    words: Callable[[SavedSizing], Words]
    wanted: Callable[[SavedSizing], bool]

    @property
    def file(self) -> str:
        """Where it lies in the report folder."""
        return f"figures/{self.name}.png"


PICTURES = (
    Picture("half-width-by-n", sizing_figures.precision, sizing_captions.precision, _precise),
    Picture("coverage-against-n", sizing_figures.worst_coverage, sizing_captions.worst_coverage, _covered),
    Picture("operating-characteristics", sizing_figures.operating, sizing_captions.operating, _rare),
    Picture("power-by-n", sizing_figures.power, sizing_captions.power, _decided),
)
OF_AUDITS = (*DATA_FILES, *(picture.file for picture in page.PICTURES))  # they go when an audit is overwritten


def write_report(
    sizing: Sizing,
    folder: Path,
    overwrite: bool = False,
    *,
    provenance: Mapping[str, Any] | None = None,
    progress: page.Progress | None = None,
) -> Path:
    """Save the answer, draw its figures, write its page: all of it or nothing. The path of the page.

    Raises:
        InputFault: see `sizing_folder.check_sizing_target`.
        OSError: the folder cannot be written.
    """
    check_sizing_target(folder, sizing.plan.document, overwrite)
    others = OF_AUDITS if overwrite else ()
    with staged(folder, [*(picture.file for picture in PICTURES), *OPTIONAL, *others]) as stage:
        write_data(sizing, stage, provenance)
        _write_page(load_sizing(stage), stage, progress)
    return folder / PAGE


def write(folder: Path, progress: page.Progress | None = None) -> Path:
    """Make figures and page again from the folder's saved files; the path of the page.

    Raises:
        InputFault: the folder holds no sample size of ours.
        OSError: a file cannot be read or written.
    """
    saved = load_sizing(folder)
    with staged(folder, [picture.file for picture in PICTURES]) as stage:
        _write_page(saved, stage, progress)
    return folder / PAGE


def _write_page(saved: SavedSizing, into: Path, progress: page.Progress | None) -> None:
    """Figures and page into an existing directory."""
    wanted = [picture for picture in PICTURES if picture.wanted(saved)]
    if wanted:
        (into / "figures").mkdir()
    shown: dict[str, page.Shown] = {}
    for number, picture in enumerate(wanted, start=1):
        large, small = page.images(picture.draw, saved)
        (into / picture.file).write_bytes(large)
        shown[picture.name] = page.embedded(number, picture.file, small, picture.words(saved))
        if progress is not None:
            progress("drawing", number / len(wanted))
    content = {**page_content(saved), "pictures": shown}
    text = page.sheet("sizing.html", content, ["page.css", "sizing.css"])
    (into / PAGE).write_bytes(text.encode("utf-8"))
