"""Hostile and odd input never raises, always says why, and the search stops at a limit that it names."""

from __future__ import annotations

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.balance import MAX_PAIRS, MAX_TRIES
from kb.chem.reading import read_scheme
from kb.vocabulary import Confidence


def tree(depth: int, end: str) -> str:
    """Return a dendrimer with an end group on every branch."""
    return f"C({tree(depth - 1, end)})({tree(depth - 1, end)})CC{end}" if depth else f"CCC{end}"


REFUSED = [
    ("", "empty"),
    ("  \n ", "empty"),
    (">>", "no reactants"),
    (">>CC", "no reactants"),
    ("CC>>CC>>C", "arrows"),
    ("CC(", "not valid SMILES"),
    ("c1cccc1", "possible structure"),
    ("C(C)(C)(C)(C)C", "possible structure"),
    ("CC\x1b[31mBr>>CC", "control characters"),
    ("CC\x00Br", "control characters"),
    ("CCBr\N{RIGHT-TO-LEFT OVERRIDE}", "control characters"),
    ("<script>alert(1)</script>", "not valid SMILES"),
    ("=1+1", "not valid SMILES"),
    ("ethyl bromide", "blank"),
    ("CCBr.[R1]O>>", "R-group"),
    ("x" * 80_000, "at most"),
    ("C" * 9_990 + "(", "not valid SMILES"),
    ("C(" * 4_000, "not valid SMILES"),
    (".".join(["CCBr"] * 500), "fragments"),
    ("C" * 10_000, "at most 2,000 are read"),
    ("C(Br)" * 2_000, "at most 2,000 are read"),
    ("C(" * 2_000 + "C" + ")" * 2_000 + "Br", "at most 2,000 are read"),
]
READ = [
    ("C" * 1_990 + "Br", "a long chain"),
    ("C(Br)" * 990, "a long polybromide"),
    ("C(" * 900 + "C" + ")" * 900 + "Br", "deep nesting"),
    ("BrCC" + "C" * 396 + ".[N-]=[N+]=[N-]>>[N-]=[N+]=NCC" + "C" * 396, "400 atoms, displaced"),
    ("BrC" + "C(Br)" * 199 + ".[N-]=[N+]=[N-]>>[N-]=[N+]=NC" + "C(Br)" * 199, "400 atoms, every other a bromide"),
    ("CC(C)(C)OC(=O)N" + "C(C)C(=O)N" * 70 + "CC(=O)O>>N" + "C(C)C(=O)N" * 70 + "CC(=O)O", "a long Boc peptide"),
    (tree(6, "Br") + ".[N-]=[N+]=[N-]>>" + tree(6, "N=[N+]=[N-]"), "a dendrimer, wholly displaced"),
    (".".join(["CCBr", "CCN", "O", "[Na+]", "[Cl-]", "Brc1ccccc1"] * 60) + ">>CCNCC", "a disconnected soup"),
    ("[CH2]C.[CH3]>>CCC", "radicals"),
    ("[13CH3][125I].[2H]OC>>[13CH3]OC", "isotopes"),
    ("Cl[Pd]Cl.CCBr", "a metal complex"),
    ("[NH3]->[Cu+2]<-[NH3].CCBr", "dative bonds"),
    ("*CCBr.N*>>*CCN*", "attachment points"),
    ("[C+5]", "an absurd charge"),
    ("[Na+99].CCBr", "another"),
    ("FS(F)(F)(F)(F)F", "hypervalence"),
    ("C~CBr", "an undefined bond"),
    ("[H+].[H-].[H][H]>>[H][H]", "hydrogen alone"),
    ("CC(C)(C)OC(=O)N" + "CCN(C(=O)OC(C)(C)C)" * 25 + "C>>NCCN", "twenty-six Boc groups"),
    ("C=" + "CC=" * 150 + "C.Br>>", "a long polyene"),
]


@pytest.mark.parametrize(("text", "said"), REFUSED)
def test_text_that_is_no_scheme_is_refused_in_a_sentence(text: str, said: str) -> None:
    reading = read_scheme(text)
    assert not reading.ok and reading.confidence is Confidence.UNRESOLVED
    assert said in reading.reason
    assert reading.reason.isprintable() and reading.scheme.isprintable()
    assert reading.fate is None and reading.centres == () and reading.possible == ()


@pytest.mark.parametrize(("text", "why"), READ)
@pytest.mark.parametrize("ignore_maps", [False, True])
def test_odd_and_huge_schemes_are_read_or_declined_with_a_reason(text: str, why: str, ignore_maps: bool) -> None:
    reading = read_scheme(text, ignore_maps=ignore_maps)
    assert reading.ok, why
    assert reading.reason, why
    json.dumps(reading.as_dict())


def test_the_search_says_when_it_stopped_at_its_limit() -> None:
    reading = read_scheme(tree(6, "Br") + ".[N-]=[N+]=[N-]>>" + tree(6, "N=[N+]=[N-]"))
    assert reading.confidence is Confidence.UNRESOLVED
    assert "stopped at its limit" in reading.reason
    assert MAX_TRIES < 10_000 and MAX_PAIRS < 50_000


def test_a_huge_substrate_is_read_but_its_products_are_not_drawn_and_that_is_said() -> None:
    reading = read_scheme("BrCC" + "C" * 300)
    assert reading.confidence is Confidence.INFERRED
    assert reading.possible == () and "not drawn" in reading.reason


@given(st.text(alphabet="CNOSPFIBrcl()[]=#+-.>123@/\\%*H: ", max_size=50))
def test_any_text_of_smiles_letters_gives_a_reading(text: str) -> None:
    reading = read_scheme(text)
    assert reading.ok or reading.reason
    json.dumps(reading.as_dict())


FRAGMENTS = [
    "CCBr", "CC(C)O", "[Na+]", "[OH-]", "OC(=O)C(F)(F)F", "C=CC", "C1CO1", "CC(C)(C)OC(=O)NCC", "NCC",
    "O=S(Cl)Cl", "BrCCCBr", "[N-]=[N+]=[N-]", "C=[N+]=[N-]", "CCOP(OCC)OCC", "CC(=O)OCC=C", "C[Mg]Br", "BrBr",
    "COC(C)(C)OC", "[2H]C([2H])([2H])I", "C[Si](C)(C)OCC", "O=C1CCCO1", "c1ccc2[nH]ccc2c1", "*CCl", "[CH3]",
]  # fmt: skip


@given(
    st.lists(st.sampled_from(FRAGMENTS), min_size=1, max_size=5),
    st.lists(st.sampled_from(FRAGMENTS), max_size=3),
    st.lists(st.sampled_from(FRAGMENTS), max_size=2),
)
def test_any_mixture_of_ordinary_fragments_gives_a_reading_whose_facts_fit_the_entry(
    reactants: list[str], agents: list[str], products: list[str]
) -> None:
    reading = read_scheme(f"{'.'.join(reactants)}>{'.'.join(agents)}>{'.'.join(products)}")
    assert reading.ok and reading.reason
    left = reactants + agents
    params = Chem.SmilesParserParams()
    params.removeHs = False
    for centre in reading.centres:
        mol = Chem.MolFromSmiles(left[centre.component], params)
        assert mol.GetAtomWithIdx(centre.atom).GetSymbol() == "C"
        if centre.leaving_atom is not None:
            assert mol.GetBondBetweenAtoms(centre.atom, centre.leaving_atom) is not None
    if reading.confidence is Confidence.UNRESOLVED:
        assert reading.fate is None and reading.centres == ()
    assert len({p.product for p in reading.possible}) == len(reading.possible)
