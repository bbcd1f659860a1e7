"""Without a product the likeliest centre is named, the reading is marked as inferred, and nothing is claimed."""

from __future__ import annotations

import pytest

from kb.chem.reading import read_scheme
from kb.vocabulary import Confidence

# scheme, (component, atom), carbon class, leaving group, fate or None, why
CENTRES = [
    ("CCCBr", (0, 2), "primary", "bromide", None, "a substrate alone: nobody knows what attacks"),
    ("CCC(C)Br.CC[O-].[Na+]", (0, 2), "secondary", "bromide", None, "several kinds of product are possible"),
    ("CI.Oc1ccccc1", (0, 0), "methyl", "iodide", "substitution", "methyl iodide can only be displaced"),
    ("ClCCBr.N", (0, 2), "primary", "bromide", None, "bromide before chloride"),
    ("ClCC(=O)OCC.CCCCN", (0, 1), "primary", "chloride", "substitution", "the chloride, not the ester"),
    ("CCCCO>O=S(Cl)Cl>", (0, 3), "primary", "hydroxyl", None, "an alcohol made to leave"),
    ("CC(C)C(C)O.Br", (0, 3), "secondary", "hydroxyl", None, "by acid"),
    ("CC1CO1.CN", (0, 2), "primary", "epoxide", None, "an epoxide"),
    ("CC1=CCCCC1.Br", (0, 1), "vinyl", None, "addition", "an alkene with acid"),
    ("C=CC(=O)OC.CCN", (0, 0), "vinyl", None, "addition", "a conjugate acceptor"),
    ("CC(=O)OCC=C.CNC", (0, 4), "primary", "carboxylate", None, "an amine does not add to a plain alkene"),
    ("CC(C)(C)OC(=O)NCCBr>OC(=O)C(F)(F)F>", (0, 1), "tertiary", "carboxylate", "group-loss", "acid, no nucleophile"),
    ("CC(C)(C)OC(=O)NCCBr.[N-]=[N+]=[N-]", (0, 9), "primary", "bromide", None, "a real nucleophile comes first"),
    ("C[N+](C)(C)CCC.[OH-]", (0, 4), "primary", "ammonium", None, "Hofmann: where beta hydrogens are"),
    ("BrC12CC3CC(CC(C3)C1)C2.O", (0, 1), "bridgehead", "bromide", None, "bridgehead"),
    ("Brc1ccccc1.CN", (0, 1), "aryl", "bromide", None, "aryl"),
    ("C=CBr", (0, 1), "vinyl", "bromide", None, "vinyl"),
]


@pytest.mark.parametrize(("scheme", "place", "carbon_class", "group", "fate", "why"), CENTRES)
def test_the_likeliest_centre_is_named_and_marked_as_inferred(
    scheme: str, place: tuple[int, int], carbon_class: str, group: str | None, fate: str | None, why: str
) -> None:
    reading = read_scheme(scheme)
    assert reading.ok and reading.confidence is Confidence.INFERRED, why
    centre = reading.centre
    assert centre is not None and (centre.component, centre.atom) == place, why
    assert str(centre.carbon_class) == carbon_class
    assert (str(centre.leaving_group) if centre.leaving_group else None) == group
    assert (str(reading.fate) if reading.fate else None) == fate, why
    assert reading.substrate is not None and reading.reason


@pytest.mark.parametrize("scheme", ["CCCC", "c1ccccc1", "O", "[Na+].[Cl-]", "CC#N", "OB(O)c1ccccc1", "CC[NH3+].[Cl-]"])
def test_where_nothing_could_react_that_is_said(scheme: str) -> None:
    reading = read_scheme(scheme)
    assert reading.ok and reading.confidence is Confidence.UNRESOLVED
    assert reading.centres == () and "No leaving group" in reading.reason


@pytest.mark.parametrize(
    ("scheme", "said"),
    [
        ("BrC12CC3CC(CC(C3)C1)C2.O", "bridgehead"),
        ("Brc1ccccc1.CN", "aromatic carbon"),
        ("C=CBr", "vinylic carbon"),
        ("CCCCO", "only when something helps"),
    ],
)
def test_the_reason_says_what_is_special_about_the_carbon(scheme: str, said: str) -> None:
    assert said in read_scheme(scheme).reason


def test_the_text_before_and_after_an_empty_arrow_is_the_same_scheme() -> None:
    first, second = read_scheme("CCBr.N"), read_scheme("CCBr.N>>")
    assert (first.centres, first.possible, first.fate) == (second.centres, second.possible, second.fate)


@pytest.mark.parametrize(
    ("scheme", "why"),
    [
        ("FC(F)(F)S(=O)(=O)OC12CCC(CC1)CC2.[N-]=[N+]=[N-]", "a triflate is no protecting group"),
        ("BrC12CC3CC(CC(C3)C1)C2.[N-]=[N+]=[N-]", "a bridgehead bromide"),
        ("C=CBr.[N-]=[N+]=[N-]", "azide makes no alkyne of a vinyl bromide"),
        ("ClC(Cl)Cl.[OH-]", "chloroform is not displaced, and one carbon gives no alkene"),
    ],
)
def test_a_closed_centre_settles_no_fate(scheme: str, why: str) -> None:
    reading = read_scheme(scheme)
    assert reading.centre is not None and reading.fate is None, why
    assert not {str(f.fate) for f in reading.possible} & {"group-loss", "substitution"}, why
    assert "No product was stated" not in reading.reason


@pytest.mark.parametrize("scheme", ["C=CBr", "C/C=C/Br", "Brc1ccccc1", "C=C(C)Cl"])
def test_a_lone_vinyl_or_aryl_halide_keeps_its_leaving_group(scheme: str) -> None:
    reading = read_scheme(scheme)
    assert reading.centre is not None and reading.centre.leaving_group is not None and reading.fate is None
    assert str(reading.centre.carbon_class) in ("vinyl", "aryl")
    assert "displacement from the back is closed" in reading.reason


def test_alkali_takes_the_acetyl_group_off_and_displaces_nothing() -> None:
    for ester, alcohol in (("CCOC(C)=O", "CCO"), ("CC(=O)OCCc1ccccc1", "OCCc1ccccc1")):
        inferred, matched = (read_scheme(f"{ester}.[OH-].[Na+]{right}") for right in ("", f">>{alcohol}"))
        assert str(inferred.fate) == str(matched.fate) == "group-loss"
        assert inferred.centres == matched.centres
        assert {str(f.fate) for f in inferred.possible} == {"group-loss"}


@pytest.mark.parametrize("scheme", ["CCOC(C)=O.CC[Mg]Br", "CCOC(=O)c1ccccc1.[OH-].[Na+]"])
def test_what_meets_an_ester_at_its_carbonyl_carbon_names_no_centre(scheme: str) -> None:
    reading = read_scheme(scheme)
    assert (str(reading.confidence), str(reading.fate), reading.centres) == ("inferred", "other", ())
    assert "carbonyl carbon" in reading.reason
