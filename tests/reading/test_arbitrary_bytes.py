"""No bytes whatever bring the readers to raise anything but their own errors."""

from __future__ import annotations

import gzip
import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from branchpos.errors import BranchposError, InputError
from branchpos.reading import read_file

STARTS = (
    b"",
    b"ACCESSION: a\nPK$NUM_PEAK: 2\nPK$PEAK: m/z int. rel.int.\n  57 100 999\n  71 5 50\n//\n",
    b"##TITLE= a\n##DATA TYPE= MASS SPECTRUM\n##NPOINTS= 2\n##PEAK TABLE= (XY..XY)\n57,100 71,5\n##END=\n",
    b"name: a\nnum peaks: 2\n57 100; 71 5\n\nname: b\n57 3\n",
    b"m/z;intensity\n57,1;100\n71,1;5\n",
)
PIECES = st.lists(
    st.one_of(
        st.binary(max_size=8),
        st.sampled_from([b"\n", b"nan", b"1e999", b"-1", b",", b";", b"##", b"//", b"$$"]),
    ),
    max_size=6,
).map(b"".join)


def outcome(data: bytes) -> None:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "any"
        path.write_bytes(data)
        try:
            reading = read_file(path)
        except BranchposError as fault:
            assert "\n" not in str(fault)
            return
    assert reading.spectra or reading.faults
    assert all(isinstance(fault, InputError) and fault.file == str(path) for fault in reading.faults)
    assert all((s.intensity > 0).all() and s.threshold > 0 for s in reading.spectra)


@given(data=st.binary(max_size=400))
@settings(max_examples=150, deadline=None)
def test_arbitrary_bytes(data):
    outcome(data)


@given(
    start=st.sampled_from(STARTS),
    cut=st.integers(0, 120),
    length=st.integers(0, 12),
    piece=PIECES,
    packed=st.booleans(),
    lost=st.integers(0, 12),
)
@settings(max_examples=300, deadline=None)
def test_damaged_files(start, cut, length, piece, packed, lost):
    data = start[:cut] + piece + start[cut + length :]
    data = gzip.compress(data) if packed else data
    outcome(data[: len(data) - lost])
