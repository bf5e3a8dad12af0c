"""The chapters as a Word file, where python-docx is installed; the same words give the same bytes."""

import importlib.metadata
import io
import re
import zipfile
from collections.abc import Sequence
from typing import TYPE_CHECKING

from coverage_lab.report.chapters import Chapter
from coverage_lab.report.protocol import pieces

if TYPE_CHECKING:
    from docx.text.paragraph import Paragraph

LONG_AGO = (1980, 1, 1, 0, 0, 0)  # the earliest date that a zip file can hold
FORBIDDEN = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")  # in XML


def installed() -> bool:
    """Whether Word files can be written here."""
    try:
        importlib.metadata.version("python-docx")
    except importlib.metadata.PackageNotFoundError:
        return False
    return True


def word_file(title: str, told: Sequence[Chapter]) -> bytes | None:
    """The file's content, or None where python-docx is missing."""
    if not installed():
        return None
    import docx  # an extra

    file = docx.Document()
    file.core_properties.title = _clean(title)[:255]  # the most that the property takes
    file.core_properties.author = ""
    file.core_properties.comments = ""
    file.add_heading(_clean(title), 0)
    for chapter in told:
        file.add_heading(chapter.heading, 1)
        for lead, text in chapter.parts:
            _fill(file.add_paragraph(style="List Bullet" if chapter.listed else None), lead, text)
    buffer = io.BytesIO()
    file.save(buffer)
    return undated(buffer.getvalue())


def _fill(paragraph: "Paragraph", lead: str, text: str) -> None:
    """A paragraph with its lead in bold and the blanks marked."""
    from docx.enum.text import WD_COLOR_INDEX

    if lead:
        paragraph.add_run(f"{_clean(lead)} ").bold = True
    for words, blank in pieces(_clean(text)):
        run = paragraph.add_run(words)
        if blank:
            run.font.highlight_color = WD_COLOR_INDEX.YELLOW


def _clean(text: str) -> str:
    """The text without letters that XML cannot hold."""
    return FORBIDDEN.sub("\ufffd", text)


def undated(archive: bytes) -> bytes:
    """The zip file again, its members in the same order and with one fixed date."""
    packed = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(archive)) as source, zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as target:
        for name in source.namelist():
            member = zipfile.ZipInfo(name, LONG_AGO)
            member.compress_type = zipfile.ZIP_DEFLATED
            target.writestr(member, source.read(name))
    return packed.getvalue()
