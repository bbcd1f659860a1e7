"""Structure files against RDKit: what it writes we read, what we write it reads, and no text breaks a frame."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem
from rdkit.Chem import AllChem, rdChemReactions

from kb.chem.scheme import parse_scheme
from kb.chem.schemefile import scheme_of_block
from kb.errors import StructureError
from kb.exchange.ctfile import rxn_block
from kb.exchange.exporting import export_file
from kb.exchange.loading import load_file
from kb.exchange.sources import open_source
from tests.exchange.carried import SCHEMES, KeptInMemory
from tests.factories import a_run

DRAWN = (
    *SCHEMES[:3],
    "C[C@H](Cl)c1ccccc1.[Na+].[I-]>>C[C@@H](I)c1ccccc1",
    "C/C=C/CCl.[S-]c1ccccc1.[Na+]>>C/C=C/CSc1ccccc1",
    "[13CH3]CBr.N#C[K]>>[13CH3]CC#N",
)


def sides(scheme: str) -> tuple[list[str], ...]:
    parsed = parse_scheme(scheme)
    return tuple(sorted(f.smiles for f in side) for side in (parsed.reactants, parsed.agents, parsed.products))


def by_rdkit(scheme: str) -> rdChemReactions.ChemicalReaction:
    reaction = rdChemReactions.ReactionFromSmarts(scheme, useSmiles=True)
    for mol in [*reaction.GetReactants(), *reaction.GetProducts(), *reaction.GetAgents()]:
        Chem.SanitizeMol(mol)
        AllChem.Compute2DCoords(mol)
        Chem.WedgeMolBonds(mol, mol.GetConformer())
    return reaction


@pytest.mark.parametrize("v3000", [False, True])
@pytest.mark.parametrize("scheme", DRAWN)
def test_rxn_blocks_written_by_rdkit_are_read(scheme: str, v3000: bool) -> None:
    block = rdChemReactions.ReactionToRxnBlock(by_rdkit(scheme), separateAgents=True, forceV3000=v3000)
    assert block.startswith("$RXN V3000") == v3000
    assert sides(scheme_of_block(block)) == sides(scheme)


@pytest.mark.parametrize("scheme", DRAWN)
def test_rxn_blocks_that_we_write_are_read_by_rdkit(scheme: str) -> None:
    reaction = rdChemReactions.ReactionFromRxnBlock(rxn_block(scheme), sanitize=True, removeHs=True)
    found = tuple(
        sorted(Chem.MolToSmiles(Chem.MolFromSmiles(Chem.MolToSmiles(m))) for m in mols)
        for mols in (reaction.GetReactants(), reaction.GetAgents(), reaction.GetProducts())
    )
    assert found == sides(scheme)


def test_every_record_of_an_rdfile_is_an_rxn_block_for_rdkit(tmp_path: Path) -> None:
    path = tmp_path / "all.rdf"
    export_file((a_run(scheme=s, note="$RXN\n$RFMT\nM  END\n$$$$") for s in DRAWN), path)
    text = path.read_text(encoding="utf-8")
    assert text.startswith("$RDFILE 1\n$DATM ")
    records = re.split(r"^\$RFMT \$RIREG \d+\n", text, flags=re.M)[1:]
    assert len(records) == len(DRAWN)
    for record, scheme in zip(records, DRAWN, strict=True):
        reaction = rdChemReactions.ReactionFromRxnBlock(record.split("\n$DTYPE")[0] + "\n")
        assert reaction.GetNumReactantTemplates() == len(sides(scheme)[0])
        assert reaction.GetNumProductTemplates() == len(sides(scheme)[2])


def test_every_record_of_an_sdf_is_read_by_rdkit_with_its_data(tmp_path: Path) -> None:
    path = tmp_path / "all.sdf"
    export_file((a_run(scheme=s, note="plain", project=None) for s in DRAWN), path)
    mols = list(Chem.SDMolSupplier(str(path)))
    assert [Chem.MolToSmiles(m) for m in mols] == [parse_scheme(s).reactants[0].smiles for s in DRAWN]
    assert [m.GetProp("scheme") for m in mols] == list(DRAWN)
    assert mols[0].GetProp("solvent") == "DMF 1"


FRAMES = ("$RFMT", "$DTYPE x", "$DATUM y", "$$$$", ">  <note>", "", "\\", "M  END", "$MFMT", "a")


@given(note=st.lists(st.sampled_from(FRAMES), min_size=1).map("\n".join).filter(lambda text: bool(text.strip())))
def test_text_cannot_break_a_frame(note: str, tmp_path: Path) -> None:
    runs = [a_run(note=note), a_run(note="after")]
    for ending in (".rdf", ".sdf"):
        export_file(iter(runs), tmp_path / f"a{ending}")
        sink = KeptInMemory()
        assert load_file(tmp_path / f"a{ending}", sink, who="AB").rejected == 0
        assert [r.note for r in sink.runs.values()] == [note, "after"], ending


def test_an_rdfile_from_elsewhere_is_matched_by_the_last_part_of_its_field_names(tmp_path: Path) -> None:
    block = rxn_block("CCBr.[Na+].[I-]>>CCI")
    data = "$DTYPE RXN:VARIATION:Yield (%)\n$DATUM 81\n$DTYPE RXN:VARIATION(1):SOLVENT\n$DATUM acetone\n"
    (tmp_path / "a.rdf").write_text(f"$RDFILE 1\n$DATM 05/17/24 10:00\n$RFMT\n{block}{data}$RFMT\n{block}")
    found = [row.run for row in open_source(tmp_path / "a.rdf")]
    assert found[0] is not None and found[1] is not None
    assert (found[0].outcome.isolated_yield_pct, found[0].conditions.solvents[0].name) == (81.0, "acetone")
    assert found[1].scheme == "CCBr.[Na+].[I-]>>CCI"


def test_the_drawing_wins_over_a_scheme_field_that_says_something_else(tmp_path: Path) -> None:
    block = rxn_block("CCBr>>C=C")
    (tmp_path / "a.rdf").write_text(f"$RDFILE 1\n$DATM x\n$RFMT\n{block}$DTYPE scheme\n$DATUM CCCCl>>CC=C\n")
    (row,) = open_source(tmp_path / "a.rdf")
    assert row.run is not None and row.run.scheme == "CCBr>>C=C"


def test_a_structure_that_cannot_be_is_refused_with_its_place(tmp_path: Path) -> None:
    good = rxn_block("CCBr>>C=C")
    bad = good.replace(" Br ", " Xx ", 1)
    (tmp_path / "a.rdf").write_text(f"$RDFILE 1\n$DATM x\n$RFMT\n{bad}$RFMT\n{good}$RFMT\n$RXN\n\n\n\n  3  1\n")
    sink = KeptInMemory()
    report = load_file(tmp_path / "a.rdf", sink, who="AB", rejects=tmp_path / "r.rdf")
    assert (report.stored, [r.row for r in report.rejections]) == (1, [1, 3])
    assert "Reactant 1" in report.rejections[0].reason
    mended = (tmp_path / "r.rdf").read_text().replace(" Xx ", " Br ")
    (tmp_path / "r.rdf").write_text(mended.replace("CCBr", "CCBr"))
    again = load_file(tmp_path / "r.rdf", sink, who="AB")
    assert (again.read, again.rejected) == (2, 1)


def test_smiles_lists_take_a_name_behind(tmp_path: Path) -> None:
    (tmp_path / "a.smi").write_text("# remark\nCCBr>>C=C\tAB-1 first\nCCCl>>C=C\n\n")
    found = [row.run for row in open_source(tmp_path / "a.smi")]
    assert [(r.scheme, r.reference) for r in found if r] == [("CCBr>>C=C", "AB-1 first"), ("CCCl>>C=C", None)]


@pytest.mark.parametrize("block", ["$RXN\n", "$RXN\n\n\n\nxxx\n", "$RXN\n\n\n\n900900\n", "$RXN V3000\n", "x\ny\nz\n"])
def test_broken_blocks_are_refused(block: str) -> None:
    with pytest.raises(StructureError):
        scheme_of_block(block)
