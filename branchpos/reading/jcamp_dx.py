"""JCAMP-DX for mass spectra: peak tables, XY points, pages of an n-tuple block, compound and joined blocks.

Source: Lampen, Hillig, Davies and Linscheid, Appl. Spectrosc. 48 (1994) 1545.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from itertools import islice
from typing import NamedTuple

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading.assembly import MOST_ROWS, Details, PeakRow, assemble
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.jcamp_blocks import Block, Entry, split_blocks
from branchpos.reading.numerals import counted, is_numeric, leading_number, parse_number, quoted
from branchpos.reading.outcome import MOST_BLOCKS, too_many_blocks
from branchpos.spectrum import Spectrum

_TABLES = ("PEAKTABLE", "XYPOINTS", "XYDATA", "DATATABLE")
_PAIRS = "(XY..XY)"
_MISSING_VALUE = re.compile(r"[,;]\s*[,;]|^\s*[,;]|,\s*$")
_INDEX_LABELS = ("RETENTIONINDEX", "$RETENTIONINDEX", ".RETENTIONINDEX", "KOVATSINDEX", "$KOVATSINDEX", "$RI")


class _Scale(NamedTuple):
    """Factors that turn the printed numbers into m/z and intensity."""

    x: float = 1.0
    y: float = 1.0


class _Table(NamedTuple):
    """One table of peaks with what stands right before it."""

    entry: Entry
    points: str
    page: str
    scale: _Scale


def looks_like(lines: Sequence[str]) -> bool:
    """Tell from the head of a file whether it is JCAMP-DX."""
    text = (line.partition("$$")[0].strip() for line in lines)
    first = next((line for line in text if line), "")
    return re.match(r"##[^=]{1,80}=", first) is not None


def read_lines(lines: Sequence[str]) -> Iterator[Spectrum | InputError]:
    """Yield each spectrum, or what is wrong with its block.

    Blocks of other kinds (a structure, an infrared spectrum) are named in a warning on every spectrum.
    """
    blocks = list(islice(split_blocks(lines), MOST_BLOCKS + 1))
    others = [block for block in blocks if not block.is_compound and not _is_mass_spectrum(block)]
    named = "; ".join(f"line {block.first_line}: {_kind(block)[:40]}" for block in others[:3])
    notes = [f"{counted(len(others), 'block')} of another kind left out ({named})"] if others else []
    found = False
    for block in blocks[:MOST_BLOCKS]:
        for item in _items(block):
            found = True
            yield item.with_warning(*notes) if isinstance(item, Spectrum) else item
    if len(blocks) > MOST_BLOCKS:
        yield too_many_blocks()
    elif not found:
        problem = f"no block is a mass spectrum ({named})" if named else "no block holds a spectrum"
        yield FormatError(problem, remedy="give a block of DATA TYPE MASS SPECTRUM")


def _items(block: Block) -> Iterator[Spectrum | InputError]:
    if block.is_compound:
        yield from _check_compound(block)
    elif _is_mass_spectrum(block):
        yield from _read_block(block)


def _kind(block: Block) -> str:
    return block.value("DATATYPE") or ("structure" if block.value("JCAMPCS") else "")


def _is_mass_spectrum(block: Block) -> bool:
    """Take a block that names no kind for a mass spectrum: what is wrong with it will show."""
    return "MASS" in _kind(block).upper() or not _kind(block)


def _check_compound(block: Block) -> Iterator[InputError]:
    stated = leading_number(block.value("BLOCKS"))
    if not block.closed:
        yield TruncatedError(
            f"the compound block stops without ##END=, after {counted(block.inner, 'inner block')}",
            place=f"block at line {block.first_line}",
            remedy="export the file again",
        )
    elif stated is not None and stated not in (block.inner, block.inner + 1):
        # Writers differ on whether the compound block counts itself.
        yield FormatError(
            f"##BLOCKS= announces {stated:g}, but {block.inner} are there",
            place=f"block at line {block.first_line}",
            remedy="check that no block was lost",
        )


def _read_block(block: Block) -> Iterator[Spectrum | InputError]:
    place = f"block at line {block.first_line}"
    if not block.closed:
        yield TruncatedError(
            f"the block stops without ##END=, at line {block.last_line}",
            place=place,
            remedy="export the file again",
        )
        return
    try:
        tables = list(_tables(block))
    except InputError as fault:
        yield fault.located(place=place)
        return
    if not tables:
        yield FormatError(
            "the block has no peak table", place=place, remedy="export the peaks as ##PEAK TABLE= (XY..XY)"
        )
    for number, table in enumerate(tables, start=1):
        inside = f"{place}, page {number}" if len(tables) > 1 else place
        try:
            yield assemble(_rows(table), _details(block, table, inside))
        except InputError as fault:
            yield fault.located(place=inside)


def _tables(block: Block) -> Iterator[_Table]:
    scale = _Scale(_factor(block, "XFACTOR"), _factor(block, "YFACTOR"))
    points, page = "", ""
    for entry in block.entries:
        if entry.label == "NTUPLES":
            scale, points = _tuple_scale(block), ""
        elif entry.label == "PAGE":
            page, points = entry.value, ""
        elif entry.label == "NPOINTS":
            points = entry.value
        elif entry.label in _TABLES:
            yield _Table(entry, points, page, scale)


def _factor(block: Block, label: str) -> float:
    entry = next((entry for entry in block.entries if entry.label == label), None)
    return parse_number(entry.value, label, entry.line) if entry and entry.value else 1.0


def _tuple_scale(block: Block) -> _Scale:
    """Return the factors of an n-tuple block, which lists them in the order of its symbols."""
    symbols = [name.strip().upper() for name in block.value("SYMBOL").split(",")]
    entry = next((entry for entry in block.entries if entry.label == "FACTOR"), None)
    if entry is None:
        return _Scale()
    factors = [text.strip() for text in entry.value.split(",")]
    by_symbol = {symbol: text for symbol, text in zip(symbols, factors, strict=False) if text}
    x, y = (parse_number(by_symbol.get(symbol, "1"), f"FACTOR of {symbol}", entry.line) for symbol in "XY")
    return _Scale(x, y)


def _rows(table: _Table) -> list[PeakRow]:
    (first, form), *rest = table.entry.lines
    kind = re.match(r"\s*\(\s*XY\s*\.\.\s*XY\s*\)\s*(?:,\s*\w+\s*$)?", form, re.IGNORECASE)
    if kind is None:
        raise FormatError(
            f"the table is of the form {quoted(form.strip())}",
            place=f"line {first}",
            remedy=f"export the peaks as ##PEAK TABLE= {_PAIRS}",
        )
    rows: list[PeakRow] = []
    for line, text in [(first, form[kind.end() :]), *rest]:
        rows += _pairs(text, line, table.scale)
        if len(rows) > MOST_ROWS:
            break
    return rows


def _pairs(text: str, line: int, scale: _Scale) -> list[PeakRow]:
    cells = re.split(r"[\s,;]+", text.strip(" \t,;"))
    if cells == [""] and not _MISSING_VALUE.search(text):
        return []
    wrong = next((cell for cell in cells if cell and not is_numeric(cell)), None)
    if wrong is not None:
        parse_number(wrong, "a value of the peak table", line)
    if _MISSING_VALUE.search(text) or len(cells) % 2:
        raise FormatError(
            f"a value is missing among the pairs {quoted(text.strip())}",
            place=f"line {line}",
            remedy="give one intensity for each m/z",
        )
    numbers = [parse_number(cell, ("m/z", "intensity")[at % 2], line) for at, cell in enumerate(cells)]
    return [
        PeakRow(line, mz * scale.x, height * scale.y)
        for mz, height in zip(numbers[::2], numbers[1::2], strict=True)
    ]


def _details(block: Block, table: _Table, place: str) -> Details:
    metadata = {
        entry.label: entry.value for entry in block.entries if entry.label not in _TABLES and entry.value
    }
    page = {"PAGE": table.page} if table.page else {}
    title = block.value("TITLE")
    return Details(
        place=place,
        title=f"{title}, {table.page}" if table.page else title,
        metadata=metadata | page,
        retention_index=block.value(*_INDEX_LABELS),
        stated_peaks=table.points,
        notes=ionisation_warnings(
            methods=[block.value(".IONIZATIONMODE", ".IONISATIONMODE"), _method_in_type(block)],
            energy=block.value(".IONIZATIONENERGY"),
        ),
    )


def _method_in_type(block: Block) -> str:
    """Return the spectrum type if it speaks against electron ionisation; it may be about other things."""
    text = block.value("SPECTRUMTYPE", ".SPECTRUMTYPE")
    return text if ionisation_warnings(instrument=text) else ""
