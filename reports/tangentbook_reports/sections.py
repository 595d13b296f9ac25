"""Finding one's way in a document that was read back."""

from collections.abc import Iterable, Iterator
from itertools import takewhile
from typing import NamedTuple

from tangentbook_reports.document import Block, Document, Fence, Heading
from tangentbook_reports.errors import UnreadableReport
from tangentbook_reports.spans import plain_text


class Section(NamedTuple):
    """A heading's text and every block below it, deeper headings included."""

    heading: str
    blocks: tuple[Block, ...]


def sections(document: Document) -> list[Section]:
    """Return a section for each heading, in order.

    A section reaches to the next heading of its own or a higher rank, so sections nest: the
    blocks of a deeper one are in the shallower ones around it too.
    """
    return [
        Section(plain_text(block.spans), _below(block, document.blocks[index + 1 :]))
        for index, block in enumerate(document.blocks)
        if isinstance(block, Heading)
    ]


def find_fences(
    document: Document, *, heading: str | None = None, language: str | None = None
) -> tuple[Fence, ...]:
    """Return the fences of a document in order.

    Args:
        document: The document to look through.
        heading: Only fences of the last section with this heading; the last, because what a
            report embeds stands at its end and a name further up may read the same.
        language: Only fences of this language.
    """
    if heading is None:
        return tuple(_fences(document.blocks, language))
    found = [section for section in sections(document) if section.heading == heading]
    return tuple(_fences(found[-1].blocks, language)) if found else ()


def find_fence(
    document: Document,
    *,
    heading: str | None = None,
    language: str | None = None,
    index: int = 0,
) -> Fence:
    """Return one of `find_fences`.

    Args:
        document: The document to look through.
        heading: Text of the heading it stands under; anywhere if none is given.
        language: Its language; any if none is given.
        index: Which of them, from 0; from the end if negative.

    Raises:
        UnreadableReport: There is no such fence.
    """
    found = find_fences(document, heading=heading, language=language)
    if not -len(found) <= index < len(found):
        asked = f"heading={heading!r}, language={language!r}, index={index}"
        raise UnreadableReport(f"expected a fence with {asked}, found {len(found)} fences", None)
    return found[index]


def _below(heading: Heading, following: Iterable[Block]) -> tuple[Block, ...]:
    return tuple(
        takewhile(
            lambda block: not (isinstance(block, Heading) and block.level <= heading.level),
            following,
        )
    )


def _fences(blocks: Iterable[Block], language: str | None) -> Iterator[Fence]:
    return (
        block for block in blocks if isinstance(block, Fence) and language in (None, block.language)
    )
