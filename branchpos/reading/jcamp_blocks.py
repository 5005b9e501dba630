"""JCAMP-DX files as nested blocks of labelled records, before any meaning is given to them.

Source: McDonald and Wilks, Appl. Spectrosc. 42 (1988) 151, for labels, comments and compound blocks (from
memory).
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

_LABEL = re.compile(r"\s*##([^=]{0,80})=(.*)", re.DOTALL)
_IGNORED_IN_LABELS = re.compile(r"[\s\-/_]")


class Entry(NamedTuple):
    """One labelled record: normalised label, the text behind ``=``, and its lines.

    ``lines`` holds (line of the file from 1, text) from the label's own line on, comments taken out.
    """

    label: str
    lines: list[tuple[int, str]]

    @property
    def line(self) -> int:
        """Line of the label."""
        return self.lines[0][0]

    @property
    def value(self) -> str:
        """All lines joined, without blanks at the ends."""
        return " ".join(text.strip() for _, text in self.lines).strip()


@dataclass(slots=True)
class Block:
    """What stands between ``##TITLE=`` and ``##END=``; blocks nest in a block of type LINK."""

    first_line: int
    entries: list[Entry] = field(default_factory=list)
    inner: int = 0
    closed: bool = False
    last_line: int = 0

    def value(self, *labels: str) -> str:
        """Return the value of the first of some normalised labels that is there, or nothing."""
        found = {entry.label: entry.value for entry in reversed(self.entries)}
        return next((found[label] for label in labels if label in found), "")

    @property
    def is_compound(self) -> bool:
        """True for an outer block that only holds others."""
        return self.value("DATATYPE").upper().startswith("LINK")


def normalise_label(text: str) -> str:
    """Bring a label to the form in which labels are compared: no blanks, dashes, slashes, underscores.

    >>> normalise_label("Data Type"), normalise_label(".IONIZATION_MODE"), normalise_label("JCAMP-DX")
    ('DATATYPE', '.IONIZATIONMODE', 'JCAMPDX')
    """
    return _IGNORED_IN_LABELS.sub("", text).upper()


def split_blocks(lines: Sequence[str]) -> Iterator[Block]:
    """Yield every block as it ends; a compound block after the blocks inside it.

    A block that no ``##END=`` closes comes with ``closed`` false: at the end of the file, or where the next
    title begins although the block is not a compound one.
    """
    stack: list[Block] = []
    for entry in _entries(lines):
        if entry.label == "TITLE":
            if stack and not stack[-1].is_compound:
                yield _finish(stack.pop(), entry.line)
            if stack:
                stack[-1].inner += 1
            stack.append(Block(entry.line))
        if not stack:
            stack.append(Block(entry.line))
        if entry.label == "END":
            block = stack.pop()
            block.closed = True
            yield _finish(block, entry.line)
        else:
            stack[-1].entries.append(entry)
    while stack:
        yield _finish(stack.pop(), len(lines))


def _finish(block: Block, last_line: int) -> Block:
    block.last_line = last_line
    return block


def _entries(lines: Sequence[str]) -> Iterator[Entry]:
    entry: Entry | None = None
    for number, line in enumerate(lines, start=1):
        text = line.partition("$$")[0]
        found = _LABEL.match(text)
        if found:
            if entry is not None:
                yield entry
            entry = Entry(normalise_label(found.group(1)), [(number, found.group(2))])
        elif entry is not None and text.strip():
            entry.lines.append((number, text))
    if entry is not None:
        yield entry
