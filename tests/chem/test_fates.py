"""What could form: textbook lists, regiochemistry, stereo, and that each list is short, distinct and drawable.

The products are common textbook knowledge, stated from memory; which of them prevails is not asked here.
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.centre import find_leaving_sites
from kb.chem.fates import MOST
from kb.chem.fates_displacement import Attacker, draw_displacement
from kb.chem.molgraph import Molgraph, molgraph_of
from kb.chem.nucleophile import find_nucleophile_sites
from kb.chem.reading import read_scheme
from kb.chem.structure import canonical_smiles

# scheme without product, every product that must be listed by fate, products that must not be listed, why
LISTS = [
    (
        "CCC(C)Br.CC[O-].[Na+]",
        {"substitution": ["CCOC(C)CC"], "elimination": ["C/C=C/C", "C/C=C\\C", "C=CCC"]},
        [],
        "2-bromobutane with ethoxide: ether and three alkenes",
    ),
    (
        "CC(C)C(C)O.Br",
        {
            "substitution": ["CC(C)C(C)Br"],
            "elimination": ["CC=C(C)C", "C=CC(C)C"],
            "rearranged": ["CCC(C)(C)Br", "C=C(C)CC"],
        },
        [],
        "3-methyl-2-butanol with HBr: the shifted bromide is listed",
    ),
    ("CC(C)CO.Br", {"substitution": ["CC(C)CBr"]}, ["CCC(C)Br"], "isobutyl alcohol gives no sec-butyl bromide"),
    ("CCCCO.Br", {"substitution": ["CCCCBr"], "elimination": ["C=CCC"]}, ["CCC(C)Br"], "no shift in a plain primary"),
    (
        "CC(C)(C)CBr.CCO",
        {"substitution": ["CCOCC(C)(C)C"], "rearranged": ["CCOC(C)(C)CC", "CC=C(C)C", "C=C(C)CC"]},
        [],
        "neopentyl bromide in ethanol: no beta hydrogen, so alkenes come only by a methyl shift",
    ),
    (
        "C/C=C/CCl.[N-]=[N+]=[N-].[Na+]",
        {"substitution": ["C/C=C/CN=[N+]=[N-]"], "transposed": ["C=CC(C)N=[N+]=[N-]"]},
        [],
        "crotyl chloride: both allylic ends",
    ),
    (
        "CC1=CCCCC1.Br",
        {"addition": ["CC1(Br)CCCCC1", "CC1CCCCC1Br"]},
        [],
        "1-methylcyclohexene with HBr: both ways round",
    ),
    (
        "CC(C)C=C.Cl",
        {"addition": ["CC(C)C(C)Cl", "CC(C)CCCl"], "rearranged": ["CCC(C)(C)Cl"]},
        [],
        "3-methyl-1-butene with HCl: the hydride shift too",
    ),
    ("C=CC(=O)OC.CCN", {"addition": ["CCNCCC(=O)OC"]}, ["CCNC(C)C(=O)OC"], "an acrylate takes it at its far end"),
    (
        "CC1CO1.CN",
        {"substitution": ["CNCC(C)O", "CNC(C)CO"], "elimination": ["C=CCO"]},
        [],
        "an epoxide opens at both ends",
    ),
    ("C1=CCCCC1.BrBr.O", {"addition": ["BrC1CCCCC1Br", "OC1CCCCC1Br"]}, [], "bromine in water"),
    ("CI.O=c1cccc[nH]1", {"substitution": ["Cn1ccccc1=O", "COc1ccccn1"]}, [], "both ends of 2-pyridone"),
    ("CI.c1ccc2n[nH]cc2c1", {"substitution": ["Cn1ncc2ccccc21", "Cn1cc2ccccc2n1"]}, [], "both nitrogens of indazole"),
    ("CI.NC(N)=S", {"substitution": ["CSC(=N)N"]}, [], "thiourea through sulfur"),
    ("CCCl.CCOP(OCC)OCC", {"substitution": ["CCOP(=O)(CC)OCC"]}, [], "the phosphonate, not the phosphonium"),
    ("OCC1CCC1.Br", {"substitution": ["BrCC1CCC1"], "rearranged": ["BrC1CCCC1"]}, [], "ring growth"),
    ("BrCCCCBr.N", {"substitution": ["NCCCCBr", "C1CCNC1"]}, [], "a dibromide closes a ring on ammonia"),
    ("BrCCCCCN", {"substitution": ["C1CCNCC1"]}, [], "and an amine closes on its own bromide"),
    (
        "CCCCO.CS(=O)(=O)Cl>CCN(CC)CC>",
        {"other": ["CCCCOS(C)(=O)=O"], "substitution": ["CCCCCl"]},
        [],
        "mesyl chloride: the sulfonate is no displacement, the chloride is",
    ),
    ("CC(C)(C)OC(=O)NCCBr>OC(=O)C(F)(F)F>", {"group-loss": ["NCCBr"]}, [], "Boc in acid"),
    (
        "CC(C)(C)OC(=O)NCCBr.[N-]=[N+]=[N-]>>",
        {"substitution": ["CC(C)(C)OC(=O)NCCN=[N+]=[N-]"], "group-loss": ["NCCBr"]},
        [],
        "the sensitive group beside the centre is told",
    ),
    ("CC1CCCCC1Br.CC(C)(C)[O-].[K+]", {"elimination": ["CC1=CCCCC1", "CC1C=CCCC1"]}, [], "no E or Z in the ring"),
    ("C#CCBr.[N-]=[N+]=[N-]", {"transposed": ["C=C=CN=[N+]=[N-]"]}, [], "propargylic attack at the far end: allene"),
    ("C=CBr", {"elimination": ["C#C"]}, [], "a vinyl bromide can only lose HBr"),
]  # fmt: skip


@pytest.mark.parametrize(("scheme", "wanted", "unwanted", "why"), LISTS)
def test_the_list_of_possible_products_is_the_textbook_one(
    scheme: str, wanted: dict[str, list[str]], unwanted: list[str], why: str
) -> None:
    possible = read_scheme(scheme).possible
    for fate, products in wanted.items():
        listed = {p.product for p in possible if str(p.fate) == fate}
        assert {canonical_smiles(p) for p in products} <= listed, (why, fate, sorted(listed))
    assert not {canonical_smiles(p) for p in unwanted} & {p.product for p in possible}, why


@pytest.mark.parametrize("scheme", [row[0] for row in LISTS])
def test_every_list_is_distinct_short_explained_and_canonical(scheme: str) -> None:
    possible = read_scheme(scheme).possible
    products = [p.product for p in possible]
    assert len(products) == len(set(products)) <= MOST
    assert all(p.note for p in possible)
    assert all(canonical_smiles(p) == p for p in products)


@pytest.mark.parametrize(
    ("scheme", "why"),
    [
        ("BrC12CC3CC(CC(C3)C1)C2.[N-]=[N+]=[N-]", "no attack from behind, no bridgehead alkene"),
        ("BrC12CCC(CC1)C2.[N-]=[N+]=[N-]", "1-bromonorbornane is the classic inert halide"),
        ("Brc1ccccc1.[N-]=[N+]=[N-]", "aryl"),
    ],
)
def test_nothing_is_listed_where_no_way_is_open(scheme: str, why: str) -> None:
    reading = read_scheme(scheme)
    assert reading.possible == (), why
    assert reading.centre is not None and str(reading.centre.carbon_class) in ("bridgehead", "aryl")


def test_e_and_z_are_named_and_only_where_they_exist() -> None:
    notes = {p.product: p.note for p in read_scheme("CCC(C)Br.[OH-]").possible}
    assert notes["C/C=C/C"].endswith(", E") and notes["C/C=C\\C"].endswith(", Z")
    assert not notes["C=CCC"].endswith((", E", ", Z"))


@given(st.integers(min_value=0, max_value=2**31 - 1), st.booleans())
def test_displacement_inverts_a_stereocentre_however_it_was_written(seed: int, flipped: bool) -> None:
    drawn = Chem.MolFromSmiles("C[C@@H](Br)CCO" if flipped else "C[C@H](Br)CCO")
    (text,) = Chem.MolToRandomSmilesVect(drawn, 1, randomSeed=seed)
    # Not in canonical numbering, so that the leaving group takes every place among the bonds of the centre.
    graph = Molgraph("", Chem.MolFromSmiles(text))
    site = next(s for s in find_leaving_sites(graph) if str(s.group) == "bromide")
    azide = molgraph_of("[N-]=[N+]=[N-]")
    attacker = Attacker(azide, find_nucleophile_sites(azide)[0])
    before = _spatial_order(drawn, 35)
    for wanted, same in (("inverted", False), ("retained", True)):
        product = draw_displacement(graph, site, attacker, wanted)  # type: ignore[arg-type]
        assert product is not None
        assert (_spatial_order(Chem.MolFromSmiles(product), 7) == before) is same


def _spatial_order(mol: Chem.Mol, partner: int) -> bool:
    """Return the handedness of the stereocentre by its neighbours: partner, ring of methyl and chain; no CIP rank.

    The partner element changes its CIP rank on displacement, so R and S labels alone would not tell inversion.
    """
    (centre,) = [a for a in mol.GetAtoms() if a.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED]
    names = []
    for bond in centre.GetBonds():
        other = bond.GetOtherAtom(centre)
        names.append("x" if other.GetAtomicNum() == partner else ("m" if other.GetTotalNumHs() == 3 else "c"))
    swaps = sum(names.index(a) > names.index(b) for a, b in (("x", "m"), ("x", "c"), ("m", "c")))
    clockwise = centre.GetChiralTag() == Chem.ChiralType.CHI_TETRAHEDRAL_CW
    return clockwise if swaps % 2 == 0 else not clockwise
