"""Plain text with ``key: value`` lines above m/z-intensity pairs; one spectrum after another in a file."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading.assembly import MOST_ROWS, Details, PeakRow, assemble
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.numerals import counted, is_number, is_numeric, leading_number, parse_number, quoted
from branchpos.reading.peak_list import names_intensity, names_mz
from branchpos.spectrum import Spectrum

_KEY = re.compile(r"[\s#]*([A-Za-z][A-Za-z0-9 _./%()-]{0,59}?)\s{0,9}[:=](.*)", re.DOTALL)
_TITLES = ("name", "title", "compound", "compoundname", "spectrum", "id")
_PEAKS = ("peaks", "peaklist", "peakdata", "massspectrum", "spectrumpeaks", "mzintensity")
_COUNTS = ("numpeaks", "numberofpeaks", "npeaks", "peakcount", "numpeak", "nopeaks", "noofpeaks")
_INDICES = ("retentionindex", "ri", "kovatsindex", "kovats", "kovatsri", "linearretentionindex", "lri")
_IONISATIONS = (
    "ionization", "ionisation", "ionizationmode", "ionisationmode", "ionizationmethod", "ionisationmethod",
    "ionizationtype", "ionisationtype", "ionsource", "source",
)  # fmt: skip
_ENERGIES = ("ionizationenergy", "ionisationenergy", "electronenergy")
_POLARITIES = ("ionmode", "polarity", "ionpolarity")
_RANGES = ("massrange", "scanrange", "mzrange")


@dataclass(slots=True)
class _Draft:
    """One spectrum while its lines come in; lines of pairs are kept as text with their number."""

    first_line: int
    keys: dict[str, str] = field(default_factory=dict)
    spelt: dict[str, str] = field(default_factory=dict)
    pairs: list[tuple[int, str]] = field(default_factory=list)

    def value(self, names: Sequence[str]) -> str:
        return next((self.keys[name] for name in names if name in self.keys), "")

    @property
    def place(self) -> str:
        return f"spectrum at line {self.first_line}"


def looks_like(lines: Sequence[str]) -> bool:
    """Tell from the head of a file whether key lines stand above pairs of numbers."""
    keyed = False
    for line in lines:
        found = _KEY.match(line)
        keyed = keyed or found is not None
        if keyed and (_holds_peaks(found) if found else _is_pairs(line)):
            return True
    return False


def _holds_peaks(key_line: re.Match[str]) -> bool:
    return _plain(key_line.group(1)) in _PEAKS and _is_pairs(key_line.group(2))


def read_lines(lines: Sequence[str]) -> Iterator[Spectrum | InputError]:
    """Yield each spectrum, or what is wrong with it."""
    drafts = _drafts(lines)
    following = next(drafts, None)
    while following is not None:
        draft, following = following, next(drafts, None)
        try:
            yield _spectrum(draft, is_last=following is None)
        except InputError as fault:
            yield fault.located(place=draft.place)


def _drafts(lines: Sequence[str]) -> Iterator[_Draft]:
    """Cut the file at each key line or blank line that comes after pairs."""
    draft: _Draft | None = None
    for number, line in enumerate(lines, start=1):
        blank = not line.strip()
        found = None if blank or _is_pairs(line) else _KEY.match(line)
        if draft is not None and draft.pairs and (blank or found):
            yield draft
            draft = None
        if blank:
            continue
        draft = draft or _Draft(number)
        if found:
            _take_key(draft, number, found.group(1), found.group(2).strip())
        else:
            draft.pairs.append((number, line))
    if draft is not None:
        yield draft


def _take_key(draft: _Draft, number: int, key: str, value: str) -> None:
    name = _plain(key)
    if name in _PEAKS:
        if value:
            draft.pairs.append((number, value))
        return
    draft.keys[name] = f"{draft.keys[name]}; {value}" if name in draft.keys else value
    draft.spelt[key.strip()] = draft.keys[name]


def _plain(key: str) -> str:
    return re.sub(r"[^a-z0-9]", "", key.lower())


def _is_pairs(text: str) -> bool:
    cells = _cells(text.partition(";")[0])
    return len(cells) >= 2 and is_numeric(cells[0]) and is_numeric(cells[1])


def _cells(pair: str) -> list[str]:
    return [cell for cell in re.split(r"[\s,:]+", pair.strip(" \t()")) if cell]


def _refuse_decimal_commas(draft: _Draft) -> None:
    """Refuse ``57,07;100,5`` on every line: two pairs, or one pair with decimal commas."""
    lines = [[part.strip() for part in text.split(";") if part.strip()] for _, text in draft.pairs]
    joined = [parts for parts in lines if len(parts) > 1]
    if joined and all(len(parts) == 2 for parts in joined) and "," in "".join(map("".join, joined)):
        raise FormatError(
            f"{quoted('; '.join(joined[0]))} may be two pairs, or one with decimal commas",
            place=f"line {draft.pairs[0][0]}",
            remedy="write decimal points, and a blank between m/z and intensity",
        )


def _spectrum(draft: _Draft, is_last: bool) -> Spectrum:
    _refuse_decimal_commas(draft)
    rows: list[PeakRow] = []
    remarks = 0
    for line, text in draft.pairs:
        if not rows and _is_heading(text, line):
            continue
        for pair in filter(str.strip, text.split(";")):
            rows.append(_row(pair, line))
            remarks += len(_cells(pair)) > 2
        if len(rows) > MOST_ROWS:
            break
    stated = leading_number(draft.value(_COUNTS))
    if is_last and stated is not None and len(rows) < stated:
        raise TruncatedError(
            f"the file stops after {counted(len(rows), 'peak')} of {stated:g}",
            place=draft.place,
            remedy="export the spectrum again",
        )
    return assemble(rows, _details(draft, remarks))


def _is_heading(text: str, line: int) -> bool:
    cells = [cell for cell in re.split(r"[\s,;]+", text.strip()) if cell]
    if len(cells) < 2 or not any(map(names_intensity, cells)):
        return False
    if not names_mz(cells[0]):
        raise FormatError(
            f"the columns are headed {quoted(text.strip())}", place=f"line {line}", remedy="put m/z first"
        )
    return True


def _row(pair: str, line: int) -> PeakRow:
    cells = _cells(pair)
    if len(cells) < 2 or (len(cells) > 2 and is_number(cells[2])):
        raise FormatError(
            f"{quoted(pair.strip())} is not one m/z and one intensity",
            place=f"line {line}",
            remedy="give pairs, one a line or parted by semicolons, with decimal points",
        )
    return PeakRow(line, parse_number(cells[0], "m/z", line), parse_number(cells[1], "intensity", line))


def _details(draft: _Draft, remarks: int) -> Details:
    notes = ionisation_warnings(
        methods=[draft.value(_IONISATIONS)],
        polarity=draft.value(_POLARITIES),
        energy=draft.value(_ENERGIES),
        instrument=draft.value(("instrumenttype", "spectrumtype")),
    )
    if remarks:
        notes.append(f"remarks beside {counted(remarks, 'peak')} not read")
    return Details(
        place=draft.place,
        title=draft.value(_TITLES),
        metadata=draft.spelt,
        retention_index=draft.value(_INDICES),
        mass_range=draft.value(_RANGES),
        stated_peaks=draft.value(_COUNTS),
        notes=notes,
    )
