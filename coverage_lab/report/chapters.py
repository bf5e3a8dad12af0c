"""The report's words to paste: protocol text, answers to a reviewer, a plain summary; and their Markdown."""

import re
from collections.abc import Sequence
from dataclasses import dataclass

import pandas as pd

from coverage_lab.report.narrative import answers, summary
from coverage_lab.report.protocol import one_line, protocol_parts
from coverage_lab.report.words import Document

MARKUP = re.compile(r"[\\`*_<]|\](?=\()|(?<=!)\[")  # what would make markup, a link or an image of somebody's words


@dataclass(frozen=True)
class Chapter:
    """A heading and its paragraphs as (words in bold that lead in, text); in a list, paragraphs are its items."""

    name: str
    heading: str
    parts: tuple[tuple[str, str], ...]
    listed: bool = False


def chapters(document: Document, table: pd.DataFrame) -> tuple[Chapter, ...]:
    """All chapters, from audit.json and interval-table.csv alone."""
    protocol = tuple((f"{heading}.", text) for heading, text in protocol_parts(document))
    plain = tuple(("", text) for text in summary(document, table))
    cautions = tuple(("", text) for text in document["cautions"])
    return (
        Chapter("protocol", "Text for the protocol", protocol),
        Chapter("reviewer", "Answers to a sceptical reviewer", tuple(answers(document))),
        Chapter("summary", "Summary in plain language", plain),
        Chapter("cautions", "Cautions", cautions, listed=True),
    )


def protocol_title(document: Document) -> str:
    """The heading over all of them."""
    return f"{one_line(document['plan'].get('title') or 'Untitled plan')}: interval method"


def markdown(title: str, told: Sequence[Chapter]) -> str:
    """The chapters as Markdown; the user's own words are kept from being taken for markup."""
    blocks = [f"# {harmless(title)}"]
    for chapter in told:
        blocks.append(f"## {chapter.heading}")
        paragraphs = [
            f"**{harmless(lead)}** {harmless(text)}" if lead else harmless(text) for lead, text in chapter.parts
        ]
        blocks += ["\n".join(f"- {text}" for text in paragraphs)] if chapter.listed else paragraphs
    return "\n\n".join(blocks) + "\n"


def harmless(text: str) -> str:
    """The text with Markdown's own signs escaped where they would do something."""
    return MARKUP.sub(lambda found: f"\\{found.group()}", text)
