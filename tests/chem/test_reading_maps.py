"""Given maps are used unless told not to, and are reported either way."""

from __future__ import annotations

import pytest

from kb.chem.reading import read_scheme

TWIN = "[Br:1][CH2:2][CH2:3][CH2:4][Br:5].[OH:6]c1ccccc1>>[Br:1][CH2:2][CH2:3][CH2:4][O:6]c1ccccc1"


def test_maps_settle_which_of_two_like_groups_left() -> None:
    centre = read_scheme(TWIN).centre
    assert centre is not None and (centre.atom_map, centre.leaving_atom_map) == (4, 5)


def test_ignored_maps_are_still_reported_on_what_was_found() -> None:
    reading = read_scheme(TWIN, ignore_maps=True)
    assert reading.centre is not None and (reading.centre.atom_map, reading.centre.leaving_atom_map) == (2, 1)
    assert reading.nucleophile is not None and reading.nucleophile.atom_map == 6


def test_maps_tell_whose_oxygen_an_ether_kept() -> None:
    mapped = "[CH3:1][CH2:2][OH:3].[CH3:4][CH:5]([CH3:6])[OH:7]>OS(=O)(=O)O>[CH3:1][CH2:2][O:{}][CH:5]([CH3:4])[CH3:6]"
    for oxygen, centre_map in ((3, 5), (7, 2)):
        reading = read_scheme(mapped.format(oxygen))
        assert reading.centre is not None and reading.centre.atom_map == centre_map, reading.reason


@pytest.mark.parametrize(
    ("scheme", "fate", "atom_map"),
    [
        ("[CH3:1][CH:2]([Br:3])[CH3:4]>>[CH3:1][CH:2]=[CH2:4]", "elimination", 2),
        ("[CH2:1]=[CH:2][C:3]#[N:4].[NH2:5][CH3:6]>>[CH3:6][NH:5][CH2:1][CH2:2][C:3]#[N:4]", "addition", 1),
        ("CC(C)(C)OC(=O)[NH:1][CH3:2]>Cl>[NH2:1][CH3:2]", "group-loss", None),
        ("[CH3:1][CH2:2]O>>[CH3:1][CH2:2][F:9]", "substitution", 2),
    ],
)
def test_each_fate_is_read_from_maps(scheme: str, fate: str, atom_map: int | None) -> None:
    reading = read_scheme(scheme)
    assert str(reading.fate) == fate, reading.reason
    assert reading.centre is not None and reading.centre.atom_map == atom_map


@pytest.mark.parametrize("scheme", ["[CH3:1][Br:1]>>[CH3:1]O", "[CH3:7]Br.[OH2:7]>>[CH3:7][OH:7]", "C[CH2:999]Br>>CCO"])
def test_maps_used_twice_or_on_one_side_only_do_no_harm(scheme: str) -> None:
    assert str(read_scheme(scheme).fate) == "substitution"
