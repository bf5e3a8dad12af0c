"""The page: a report folder's saved files in, figures and report.html out."""

import base64
import hashlib
import io
import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import jinja2
from markupsafe import Markup
from matplotlib.figure import Figure
from PIL import Image

from coverage_lab.records import Audit
from coverage_lab.report import captions, figures, figures_coverage, figures_steady
from coverage_lab.report.folder import PAGE, WORD_FILE, Saved, check_target, load, write_data
from coverage_lab.report.staging import staged
from coverage_lab.report.style import house_style
from coverage_lab.report.view import page_content
from coverage_lab.report.words import sizes

FILE_DPI = 300
PAGE_DPI = 180  # 1080 pixels for 6 inches: sharp at the page's width on a dense screen
COLOURS = 64

Progress = Callable[[str, float], None]
Source = TypeVar("Source")  # the saved files of a report
SIGNED = re.compile(r"(?<=\d) %")
EQUALS = re.compile(r"\b([np]) = (\d)")


def _measured(saved: Saved) -> bool:
    return bool(figures.measured(saved.document))


def _several(saved: Saved) -> bool:
    return _measured(saved) and len(sizes(saved.document)) > 1


def _beside(saved: Saved) -> bool:
    return _measured(saved) and bool(figures_steady.sizes_beside(saved))


def _checked(saved: Saved) -> bool:
    return saved.document["cross_check"] is not None


@dataclass(frozen=True)
class Picture:
    """A figure of the report: how it is drawn, what is said of it, and when there is anything to draw."""

    name: str
    draw: Callable[[Saved], Figure]
    words: Callable[[Saved], captions.Words]
    wanted: Callable[[Saved], bool] = _measured

    @property
    def file(self) -> str:
        """Where it lies in the report folder."""
        return f"figures/{self.name}.png"


PICTURES = (
    Picture("coverage", figures_coverage.coverage, captions.coverage),
    Picture("coverage-by-n", figures_coverage.coverage_by_n, captions.coverage_by_n, _several),
    Picture("worst-by-n", figures_steady.saw, captions.saw, _beside),
    Picture("extremes", figures.extremes, captions.extremes),
    Picture("width", figures.width, captions.width),
    Picture("misses", figures.misses, captions.misses),
    Picture("cross-check", figures.cross_check, captions.cross_check, _checked),
)


@dataclass(frozen=True)
class Shown:
    """A figure as the page prints it."""

    number: int
    file: str
    source: str
    width: int
    height: int
    caption: str
    alt: str


def write_report(audit: Audit, folder: Path, *, overwrite: bool = False, progress: Progress | None = None) -> Path:
    """Save the audit, draw its figures, write its page: all of it or nothing. The path of the page.

    progress: called with what is being done and the share that is done.

    Raises:
        InputFault: see `folder.check_target`.
        OSError: the folder cannot be written.
    """
    check_target(folder, audit.plan.document, overwrite)
    with staged(folder, [*(picture.file for picture in PICTURES), WORD_FILE]) as stage:
        write_data(audit, stage)
        _write_page(load(stage), stage, progress)
    return folder / PAGE


def write(folder: Path, progress: Progress | None = None) -> Path:
    """Make figures and page again from the folder's saved files; the path of the page.

    Raises:
        InputFault: the folder holds no audit of ours.
        OSError: a file cannot be read or written.
    """
    saved = load(folder)
    with staged(folder, [picture.file for picture in PICTURES]) as stage:
        _write_page(saved, stage, progress)
    return folder / PAGE


def _write_page(saved: Saved, into: Path, progress: Progress | None) -> None:
    """Figures and page into an existing directory."""
    (into / "figures").mkdir()
    shown: dict[str, Shown] = {}
    wanted = [picture for picture in PICTURES if picture.wanted(saved)]
    for number, picture in enumerate(wanted, start=1):
        large, small = images(picture.draw, saved)
        (into / picture.file).write_bytes(large)
        shown[picture.name] = embedded(number, picture.file, small, picture.words(saved))
        if progress is not None:
            progress("drawing", number / len(wanted))
    (into / PAGE).write_bytes(html(saved, shown).encode("utf-8"))


def images(draw: Callable[[Source], Figure], saved: Source) -> tuple[bytes, bytes]:
    """The figure as a file of 300 dpi and as a small one of 64 colours for the page; the same bytes every time."""
    with house_style():
        figure = draw(saved)
        large, small = (_png(figure, dpi) for dpi in (FILE_DPI, PAGE_DPI))
    picture = Image.open(io.BytesIO(small)).convert("RGB").quantize(COLOURS, dither=Image.Dither.NONE)
    reduced = io.BytesIO()
    picture.save(reduced, "PNG", optimize=True)
    return large, reduced.getvalue()


def _png(figure: Figure, dpi: int) -> bytes:
    """The figure without the name and version of what drew it."""
    buffer = io.BytesIO()
    figure.savefig(buffer, format="png", dpi=dpi, metadata={"Software": None})
    return buffer.getvalue()


def embedded(number: int, file: str, image: bytes, words: captions.Words) -> Shown:
    """A small image as the page carries it."""
    caption, alt = words
    width, height = Image.open(io.BytesIO(image)).size
    source = f"data:image/png;base64,{base64.b64encode(image).decode('ascii')}"
    return Shown(number, file, source, width, height, caption, alt)


def html(saved: Saved, shown: dict[str, Shown]) -> str:
    """The page as one file."""
    return sheet("page.html", {**page_content(saved), "pictures": shown}, ["page.css"], ["page.js"])


def sheet(template: str, content: Mapping[str, Any], styles: Sequence[str], scripts: Sequence[str] = ()) -> str:
    """A page with style and script inline, under a policy that lets nothing else run or load."""
    style, script = ("".join(_asset(name) for name in names) for names in (styles, scripts))
    allowed = f"style-src '{_digest(style)}'; " + (f"script-src '{_digest(script)}'; " if scripts else "")
    policy = f"default-src 'none'; img-src data:; {allowed}base-uri 'none'; form-action 'none'"
    return _environment().get_template(template).render(**content, style=style, script=script, policy=policy)


@cache
def _environment() -> jinja2.Environment:
    return jinja2.Environment(
        loader=jinja2.PackageLoader("coverage_lab.report"),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
        finalize=together,
    )


def together(value: object) -> object:
    """Words with a number and its sign kept on one line: '92.5 %', 'n = 250'. What is markup already stays as it is."""
    if not isinstance(value, str) or isinstance(value, Markup):
        return value
    return SIGNED.sub("\u00a0%", EQUALS.sub("\\1\u00a0=\u00a0\\2", value))


def _asset(name: str) -> str:
    """Style or script as the page holds it, letter for letter, since its digest is in the policy."""
    return (Path(__file__).parent / "templates" / name).read_text(encoding="utf-8")


def _digest(text: str) -> str:
    """A content-security-policy hash source."""
    return f"sha256-{base64.b64encode(hashlib.sha256(text.encode('utf-8')).digest()).decode('ascii')}"
