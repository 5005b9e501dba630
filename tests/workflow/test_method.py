"""Settings: as values, as options, as a method file."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from branchpos.errors import SettingsError
from branchpos.workflow.method import ALL_CARBONS, MOST_METHYLS, Method, parse_range, read_method


@pytest.mark.parametrize(
    ("settings", "fragment"),
    [
        ({"chain": ("alkan",)}, "alkan"),
        ({"chain": ()}, "no chain class"),
        ({"prior": "wishful"}, "wishful"),
        ({"level": 1.0}, "level"),
        ({"level": 0.2}, "level"),
        ({"methyls": range(3, 3)}, "methyls"),
        ({"methyls": range(MOST_METHYLS + 2)}, "methyls"),
        ({"carbons": range(2, 10)}, "carbons"),
        ({"carbons": range(20, ALL_CARBONS.stop + 1)}, "carbons"),
        ({"formula": "H2O7x"}, "H2O7x"),
    ],
)
def test_each_wrong_setting_is_refused_with_a_remedy(settings: dict[str, object], fragment: str) -> None:
    with pytest.raises(SettingsError) as caught:
        Method(**settings)
    assert fragment in str(caught.value)
    assert caught.value.remedy


def test_alkene_can_be_named_but_not_placed() -> None:
    with pytest.raises(SettingsError, match="alkene"):
        Method(chain=("alkene",))


@given(st.integers(1, 99), st.integers(0, 40))
def test_ranges_include_both_ends(first: int, more: int) -> None:
    assert list(parse_range(f"{first}-{first + more}", "carbons")) == list(range(first, first + more + 1))
    assert list(parse_range(str(first), "carbons")) == [first]


@pytest.mark.parametrize("text", ["", "27-", "-27", "a-b", "20–40", "2.5", "20-40-60", "1e3"])
def test_ranges_that_are_none(text: str) -> None:
    with pytest.raises(SettingsError, match="carbons"):
        parse_range(text, "carbons")


def test_a_range_that_runs_backwards_is_turned_round_in_the_remedy() -> None:
    with pytest.raises(SettingsError, match="20-40"):
        parse_range("40-20", "carbons")


def test_a_method_file_sets_every_field(tmp_path: Path) -> None:
    path = tmp_path / "method.toml"
    path.write_text(
        'chain = ["alkane"]\ncarbons = "20-40"\nmethyls = "1-3"\nprior = "biogenic"\nlevel = 0.9\n'
    )
    assert read_method(path) == Method(("alkane",), range(20, 41), range(1, 4), None, "biogenic", 0.9)


def test_single_numbers_and_a_formula(tmp_path: Path) -> None:
    path = tmp_path / "method.toml"
    path.write_text('chain = "alkane"\nmethyls = 2\nformula = "C27H56"\n')
    found = read_method(path)
    assert (found.methyls, found.formula) == (range(2, 3), "C27H56")


def test_an_empty_method_file_is_the_defaults(tmp_path: Path) -> None:
    path = tmp_path / "method.toml"
    path.write_text("# nothing set\n")
    assert read_method(path) == Method()


@pytest.mark.parametrize(
    ("text", "place", "fragment"),
    [
        ("methyls = 2\nmethyl = 3\n", "line 2", "methyl"),
        ("# first\n\nlevel = 2.0\n", "line 3", "level 2"),
        ("carbons = true\n", "line 1", "carbons"),
        ("prior = 3\n", "line 1", "prior"),
        ('methyls = "three"\n', "line 1", "three"),
        ("chain = [alkane]\n", "line 1", "TOML"),
    ],
)
def test_a_wrong_entry_is_named_with_file_and_line(
    tmp_path: Path, text: str, place: str, fragment: str
) -> None:
    path = tmp_path / "method.toml"
    path.write_text(text)
    with pytest.raises(SettingsError) as caught:
        read_method(path)
    message = str(caught.value)
    assert str(path) in message and place in message and fragment in message
    assert caught.value.remedy


def test_a_missing_or_binary_method_file(tmp_path: Path) -> None:
    with pytest.raises(SettingsError, match=r"absent\.toml"):
        read_method(tmp_path / "absent.toml")
    (tmp_path / "binary.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(SettingsError, match=r"binary\.toml"):
        read_method(tmp_path / "binary.toml")
