"""The isoprenoid alkanes beyond four methyls."""

from __future__ import annotations

import pytest

from branchpos.chain import Chain
from branchpos.enumerating import regular_isoprenoids


@pytest.mark.parametrize(
    "chain",
    [
        Chain(
            20, (2, 6, 10, 14, 18)
        ),  # head to tail, C25: MassBank carries it as 2,6,10,14,18-pentamethylicosane
        Chain(20, (2, 6, 10, 15, 19)),  # C25, tail to tail: PMI of methanogenic archaea (common practice)
        Chain(24, (2, 6, 10, 15, 19, 23)),  # squalane, C30 (common practice)
        Chain(32, (2, 6, 10, 14, 19, 23, 27, 31)),  # lycopane, C40 (common practice)
        Chain(32, (3, 7, 11, 15, 18, 22, 26, 30)),  # biphytane, C40, head to head (common practice)
        Chain(22, (3, 7, 11, 15, 19)),  # head to tail, longer by a carbon at each end
    ],
)
def test_known_isoprenoids_are_members(chain: Chain) -> None:
    assert chain in regular_isoprenoids(chain.carbons)


@pytest.mark.parametrize(
    "chain",
    [
        Chain(24, (2, 6, 10, 14, 19, 22)),  # two irregular gaps
        Chain(25, (2, 6, 10, 16, 20, 24)),  # a gap of 6
        Chain(26, (6, 10, 14, 18, 22)),  # an end of six carbons
        Chain(16, (2, 6, 10, 14)),  # phytane: left to the full enumeration
    ],
)
def test_others_are_not(chain: Chain) -> None:
    assert chain not in regular_isoprenoids(chain.carbons)


@pytest.mark.parametrize("carbons", range(22, 46))
def test_members_have_their_carbons_and_come_once(carbons: int) -> None:
    members = regular_isoprenoids(carbons)
    assert len(set(members)) == len(members)
    assert all(chain.carbons == carbons and 5 <= len(chain.methyls) <= 8 for chain in members)
