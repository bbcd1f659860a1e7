"""Schemes with a stated product: the fate, the centre and the leaving group come out without being typed.

The chemistry of each row is common textbook knowledge, stated from memory; what is checked is which atoms react
and what it is called, never how much forms. Atoms are counted from 0 in the component as written.
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.reading import read_scheme
from kb.materials.class_names import REAGENT_CLASSES
from kb.vocabulary import Confidence

PPH3 = "c1ccc(P(c2ccccc2)c2ccccc2)cc1"
DEAD = "CCOC(=O)N=NC(=O)OCC"

# scheme, fate, (component, atom) of the centre, leaving group, class of the nucleophile, why
DISPLACEMENTS = [
    ("CCCBr.[N-]=[N+]=[N-].[Na+]>>CCCN=[N+]=[N-]", (0, 2), "bromide", "azide", "azide ion"),
    ("CCCCI.[C-]#N.[Na+]>>CCCCC#N", (0, 3), "iodide", "cyanide", "cyanide through carbon"),
    ("CCCCI.[C-]#N.[Ag+]>>CCCC[N+]#[C-]", (0, 3), "iodide", "cyanide", "cyanide through nitrogen"),
    ("CCCCI.O=N[O-].[Na+]>>CCCC[N+](=O)[O-]", (0, 3), "iodide", "nitrite", "nitrite through nitrogen"),
    ("CCCCI.O=N[O-].[Na+]>>CCCCON=O", (0, 3), "iodide", "nitrite", "nitrite through oxygen"),
    ("CCCBr.[S-]C#N.[K+]>>CCCSC#N", (0, 2), "bromide", "thiocyanate", "thiocyanate through sulfur"),
    ("CCCBr.CC(=O)[S-].[K+]>>CCCSC(C)=O", (0, 2), "bromide", "thiocarboxylate", "thioacetate"),
    ("CCCBr.NC(N)=S>>CCCSC(N)=[NH2+].[Br-]", (0, 2), "bromide", "thiourea", "salt stated"),
    ("CCCBr.NC(N)=S>>CCCSC(=N)N", (0, 2), "bromide", "thiourea", "free base stated"),
    ("CCCBr.c1ccncc1>>CCC[n+]1ccccc1.[Br-]", (0, 2), "bromide", "aromatic_amine_base", "pyridinium"),
    ("CCCBr.CCCCN.Cl>>CCCCNCCC", (0, 2), "bromide", "primary_amine", "amine given as its salt"),
    ("CCCBr.CCC[NH3+].[Cl-]>>CCCNCCC", (0, 2), "bromide", "primary_amine", "amine given as ammonium"),
    ("CCCBr.Oc1ccccc1>O=C([O-])[O-].[K+].[K+]>CCCOc1ccccc1", (0, 2), "bromide", "phenoxide", "Williamson"),
    ("CI.O=c1cccc[nH]1>>Cn1ccccc1=O", (0, 0), "iodide", "azole", "2-pyridone through nitrogen"),
    ("CI.O=c1cccc[nH]1>>COc1ccccn1", (0, 0), "iodide", "phenoxide", "2-pyridone through oxygen"),
    ("CI.Cc1cnc[nH]1>>Cc1cncn1C", (0, 0), "iodide", "azole", "4-methylimidazole at one nitrogen"),
    ("CI.Cc1cnc[nH]1>>Cc1cn(C)cn1", (0, 0), "iodide", "aromatic_amine_base", "and at the other"),
    ("CCBr.CCOP(OCC)OCC>>CCP(=O)(OCC)OCC", (0, 1), "bromide", "phosphite", "Arbuzov"),
    ("CCBr." + PPH3 + ">>CC[P+](c1ccccc1)(c1ccccc1)c1ccccc1", (0, 1), "bromide", "phosphine", "phosphonium"),
    (
        "CCCCBr.CCOC(=O)CC(=O)OCC>CC[O-].[Na+]>CCCCC(C(=O)OCC)C(=O)OCC",
        (0, 3), "bromide", "active_methylene", "malonate",
    ),
    ("CCC(C)=O.CI>CC(C)[N-]C(C)C.[Li+]>CCC(=O)CC", (1, 0), "iodide", "enolate", "ketone enolate at its methyl"),
    ("CCCBr.C#CCC>[NH2-].[Na+]>CCCC#CCC", (0, 2), "bromide", "acetylide", "alkynide"),
    (
        "O=S1(=O)OCCCO1.[N-]=[N+]=[N-].[Na+]>>[N-]=[N+]=NCCCO",
        (0, 4), "sulfate", "azide", "cyclic sulfate, hydrolysed",
    ),
    ("COS(=O)(=O)OC.Oc1ccccc1>[OH-].[Na+]>COc1ccccc1", (0, 0), "sulfate", "phenoxide", "dimethyl sulfate"),
    (
        "COC(=O)OC.Oc1ccccc1>>COc1ccccc1",
        (0, 0), "carboxylate", "phenol", "dimethyl carbonate as methylating agent, no base named",
    ),
    ("C[S+](C)C.[O-]C(=O)c1ccccc1>>COC(=O)c1ccccc1", (0, 0), "sulfonium", "carboxylate", "sulfonium"),
    ("C[N+](C)(C)C.[O-]c1ccccc1>>COc1ccccc1", (0, 0), "ammonium", "phenoxide", "ammonium"),
    ("C=[N+]=[N-].OC(=O)c1ccccc1>>COC(=O)c1ccccc1", (0, 0), "diazonium", "carboxylate", "diazomethane"),
    ("CC1CO1.CN>>CNCC(C)O", (0, 2), "epoxide", "primary_amine", "epoxide at the free end"),
    ("CC1CO1.CN>>CNC(C)CO", (0, 1), "epoxide", "primary_amine", "epoxide at the substituted end"),
    ("C1OC1c1ccccc1.CO>OS(=O)(=O)O>COC(CO)c1ccccc1", (0, 2), "epoxide", "alcohol", "styrene oxide in acid"),
    ("O=C1CCCO1.Br>>OC(=O)CCCBr", (0, 4), "carboxylate", "bromide", "lactone opened at the alkyl carbon"),
    ("CC(=O)OCC=C.CNC>[Pd]>CN(C)CC=C", (0, 4), "carboxylate", "secondary_amine", "allyl acetate"),
    ("CCCCO>O=S(Cl)Cl>CCCCCl", (0, 3), "hydroxyl", "chloride", "thionyl chloride"),
    ("CCCCO.BrP(Br)Br>>CCCCBr", (0, 3), "hydroxyl", "bromide", "phosphorus tribromide"),
    ("CCCCO." + PPH3 + ".BrC(Br)(Br)Br>>CCCCBr", (0, 3), "hydroxyl", "bromide", "Appel"),
    ("CC(C)CO.Br>>CC(C)CBr", (0, 3), "hydroxyl", "bromide", "isobutyl alcohol with HBr does not rearrange"),
    ("CCCCO.CS(=O)(=O)Cl>CCN(CC)CC>CCCCCl", (0, 3), "hydroxyl", "chloride", "chloride by way of the mesylate"),
    (
        "C[C@H](O)CC.Oc1ccccc1>" + DEAD + "." + PPH3 + ">CC[C@@H](C)Oc1ccccc1",
        (0, 1), "hydroxyl", "phenoxide", "Mitsunobu",
    ),
    (
        "C[C@H](O)CCCC.OC(=O)c1ccccc1>" + DEAD + "." + PPH3 + ">C[C@@H](OC(=O)c1ccccc1)CCCC",
        (0, 1), "hydroxyl", "carboxylate", "Mitsunobu ester: the alcohol carbon is the centre",
    ),
    ("OCCCCCBr>[H-].[Na+]>C1CCOCC1", (0, 5), "bromide", "alkoxide", "ring closed within the molecule"),
    ("OCCBr>[OH-].[Na+]>C1CO1", (0, 2), "bromide", "alkoxide", "epoxide from a halohydrin"),
    (
        "BrCCCCCBr.NCc1ccccc1>>C1CCN(Cc2ccccc2)CC1",
        (0, 1), "bromide", "primary_amine", "ring closed by two displacements",
    ),
    ("BrCCCCBr.CCOC(=O)CC(=O)OCC>>CCOC(=O)C1(C(=O)OCC)CCCC1", (0, 1), "bromide", "active_methylene", "on carbon too"),
    ("CI.NCCc1ccccc1>>CN(C)CCc1ccccc1", (0, 0), "iodide", "primary_amine", "two portions of methyl iodide"),
    (
        "CCOC(=O)CBr.Oc1ccccc1>[OH-].[Na+]>OC(=O)COc1ccccc1",
        (0, 5), "bromide", "phenoxide", "ester hydrolysed besides",
    ),
    (
        "COC(=O)c1ccccc1CBr.NC>>CN1Cc2ccccc2C1=O",
        (0, 10), "bromide", "primary_amine", "lactam closes after displacement",
    ),
    ("CC(C)(C)Cl.O>>CC(C)(C)O", (0, 1), "chloride", "water", "solvolysis"),
    (
        "BrC12CC3CC(CC(C3)C1)C2.O>>OC12CC3CC(CC(C3)C1)C2",
        (0, 1), "bromide", "water", "1-adamantyl ionises, it is stated",
    ),
    ("C[13CH2]I.[2H]OC>>C[13CH2]OC", (0, 1), "iodide", "alcohol", "isotopes do not hide a match"),
]  # fmt: skip


@pytest.mark.parametrize(("scheme", "place", "group", "word", "why"), DISPLACEMENTS)
def test_a_displacement_is_read_with_its_centre_and_nucleophile(
    scheme: str, place: tuple[int, int], group: str, word: str, why: str
) -> None:
    reading = read_scheme(scheme)
    assert reading.confidence is Confidence.MATCHED, reading.reason
    assert str(reading.fate) == "substitution", reading.reason
    centre, nucleophile = reading.centre, reading.nucleophile
    assert centre is not None and (centre.component, centre.atom) == place, why
    assert str(centre.leaving_group) == group, why
    assert nucleophile is not None and nucleophile.nucleophile_class == word, why
    assert reading.possible[0].fate == "substitution"


OTHER_FATES = [
    ("CCC(C)Br.CC[O-].[Na+]>>C/C=C/C", "elimination", (0, 2), "bromide", "2-bromobutane, E-alkene"),
    ("CCC(C)Br.CC[O-].[Na+]>>C=CCC", "elimination", (0, 2), "bromide", "the less substituted alkene"),
    ("C[N+](C)(C)CCC>[OH-]>C=CC", "elimination", (0, 4), "ammonium", "Hofmann: the carbon with beta hydrogens"),
    ("CC(C)(O)c1ccccc1>Cc1ccc(S(=O)(=O)O)cc1>C=C(C)c1ccccc1", "elimination", (0, 1), "hydroxyl", "dehydration"),
    ("C=CBr>[NH2-].[Na+]>C#C", "elimination", (0, 1), "bromide", "vinyl bromide to alkyne"),
    ("BrC(C)C(C)Br>[OH-].[K+]>CC#CC", "elimination", (0, 1), "bromide", "vicinal dibromide to alkyne"),
    ("CC(Cl)(Cl)C>[NH2-].[Na+]>CC#C", "elimination", (0, 1), "chloride", "geminal dichloride to alkyne"),
    ("BrCCBr>[Zn]>C=C", "elimination", (0, 1), "bromide", "debromination by zinc"),
    ("CC(C)C(C)O.Br>>CCC(C)(C)Br", "rearranged", (0, 3), "hydroxyl", "3-methyl-2-butanol with HBr: hydride shift"),
    ("CC(C)(C)CBr>CCO>CCOC(C)(C)CC", "rearranged", (0, 4), "bromide", "neopentyl: methyl shift, capture by solvent"),
    ("CC(C)(C)CBr.O>>CC=C(C)C", "rearranged", (0, 4), "bromide", "neopentyl: methyl shift, loss of a proton"),
    ("OCC1CCC1.Br>>BrC1CCCC1", "rearranged", (0, 1), "hydroxyl", "cyclobutylmethyl: the ring grows"),
    ("OC(C)(C)C(C)(C)O>OS(=O)(=O)O>CC(=O)C(C)(C)C", "rearranged", (0, 1), "hydroxyl", "pinacol"),
    ("CC(C)C=C.Cl>>CCC(C)(C)Cl", "rearranged", (0, 1), None, "3-methyl-1-butene with HCl: hydride shift"),
    ("C/C=C/CCl.[N-]=[N+]=[N-].[Na+]>>C=CC(C)N=[N+]=[N-]", "transposed", (0, 3), "chloride", "crotyl chloride"),
    ("OC(C)C=C.Cl>>C/C=C/CCl", "transposed", (0, 1), "hydroxyl", "3-buten-2-ol to crotyl chloride"),
    ("CC1=CCCCC1.Br>>CC1(Br)CCCCC1", "addition", (0, 1), None, "Markovnikov"),
    ("CC1=CCCCC1.Br>>CC1CCCCC1Br", "addition", (0, 2), None, "anti-Markovnikov"),
    ("CC(C)=C.O>OS(=O)(=O)O>CC(C)(C)O", "addition", (0, 1), None, "hydration"),
    ("C=CC(=O)OC.CCN>>CCNCCC(=O)OC", "addition", (0, 0), None, "conjugate addition of an amine"),
    ("C=CC(=O)C.CCOC(=O)CC(=O)OCC>>CCOC(=O)C(CCC(C)=O)C(=O)OCC", "addition", (0, 0), None, "Michael"),
    ("C=CC(C)=O.CC=O>>CC(=O)CCC(C)=O", "addition", (0, 0), None, "Stetter: no alcohol forms"),
    ("C=Cc1ccccc1.SCc1ccccc1>>c1ccccc1CCSCc1ccccc1", "addition", (0, 0), None, "thiol to styrene"),
    ("C1=CCCCC1.BrBr>>Br[C@@H]1CCCC[C@H]1Br", "addition", (0, 0), None, "dibromide"),
    ("C1=CCCCC1.O=C1CCC(=O)N1Br.O>>OC1CCCCC1Br", "addition", (0, 0), None, "bromohydrin"),
    ("CC(C)(C)OC(=O)NCCc1ccccc1>OC(=O)C(F)(F)F>NCCc1ccccc1", "group-loss", (0, 1), "carboxylate", "Boc"),
    ("CC(C)(C)OC(=O)NCCc1ccccc1>Cl>[NH3+]CCc1ccccc1.[Cl-]", "group-loss", (0, 1), "carboxylate", "Boc, salt stated"),
    ("CC(C)(C)OC(=O)CCc1ccccc1>OC(=O)C(F)(F)F>OC(=O)CCc1ccccc1", "group-loss", (0, 1), "carboxylate", "tBu ester"),
    ("CC(C)(C)OCc1ccccc1.Cl>>OCc1ccccc1", "group-loss", (0, 1), "alkoxide", "tert-butyl ether"),
    ("C1CCOC(C1)OCc1ccccc1>Cl.CO>OCc1ccccc1", "group-loss", (0, 4), "alkoxide", "THP"),
    ("COCOc1ccccc1>Cl>Oc1ccccc1", "group-loss", (0, 2), "alkoxide", "MOM"),
    ("O=C(OCc1ccccc1)NCCC>Br.CC(=O)O>NCCC", "group-loss", (0, 3), "carboxylate", "Cbz in HBr"),
    ("CC(=O)OCCc1ccccc1>[OH-].[Na+].CO>OCCc1ccccc1", "group-loss", (0, 4), None, "acetate: its alcohol carbon"),
    ("CCC(C)O[Si](C)(C)C>Cl>CCC(C)O", "group-loss", (0, 2), None, "silyl ether: the carbon that keeps its oxygen"),
    ("CC1(C)OCC(C)O1>Cl.O>OCC(C)O", "group-loss", (0, 1), "alkoxide", "acetonide"),
    ("CC1(CC)OCCO1>Cl.O>CC(=O)CC", "group-loss", (0, 1), "alkoxide", "ketal"),
    ("OCC1CC1>Br>C=CCCBr", "rearranged", (0, 1), "hydroxyl", "cyclopropylmethanol: the homoallyl bromide"),
    ("BrCC1CC1.O>>C=CCCO", "rearranged", (0, 1), "bromide", "cyclopropylmethyl bromide, solvolysed"),
    ("CC[N+](C)(C)[O-]>>C=C", "elimination", (0, 1), "other", "Cope: an amine oxide loses its hydroxylamine"),
    ("CCC(C)[N+](C)(C)[O-]>>C=CCC", "elimination", (0, 2), "other", "Cope: the less substituted alkene too"),
]


@pytest.mark.parametrize(("scheme", "fate", "place", "group", "why"), OTHER_FATES)
def test_every_other_fate_at_an_sp3_centre_is_read(
    scheme: str, fate: str, place: tuple[int, int], group: str | None, why: str
) -> None:
    reading = read_scheme(scheme)
    assert (str(reading.confidence), str(reading.fate)) == ("matched", fate), (why, reading.reason)
    centre = reading.centre
    assert centre is not None and (centre.component, centre.atom) == place, (why, reading.reason)
    assert (str(centre.leaving_group) if centre.leaving_group else None) == group, why


NOT_AT_SP3_CARBON = [
    ("CCCCO.CS(=O)(=O)Cl>CCN(CC)CC>CCCCOS(C)(=O)=O", "mesylation keeps the C-O bond"),
    ("CCCCO.CC(=O)Cl>>CCCCOC(C)=O", "acylation"),
    ("CCCCO.CC(=O)O>OS(=O)(=O)O>CCCCOC(C)=O", "Fischer ester: the acid's OH leaves"),
    ("OCc1ccccc1.CC(=O)O>OS(=O)(=O)O>CC(=O)OCc1ccccc1", "Fischer ester, even of benzyl alcohol"),
    ("CC=O.C=CC(=O)OC>>CC(O)C(=C)C(=O)OC", "Baylis-Hillman: the alkene is kept"),
    ("CCCCN.CC(=O)O>>CCCCNC(C)=O", "amide coupling"),
    ("CC(C)(C)OC(=O)OC(=O)OC(C)(C)C.CCCN>>CCCNC(=O)OC(C)(C)C", "Boc protection"),
    ("COC(=O)CCc1ccccc1>[OH-].[Na+].O>OC(=O)CCc1ccccc1", "saponification of a methyl ester"),
    ("CC(C)(C)OC(=O)CCc1ccccc1>[OH-].[Na+].O>OC(=O)CCc1ccccc1", "a tert-butyl ester in alkali is saponified"),
    ("O=C(OCc1ccccc1)NCCC>[Pd].[H][H]>NCCC", "hydrogenolysis"),
    ("Clc1ccc([N+](=O)[O-])cc1.CN>>CNc1ccc([N+](=O)[O-])cc1", "SNAr"),
    ("C=CBr.c1ccccc1B(O)O>>C=Cc1ccccc1", "cross-coupling"),
    ("CCCC=O.CN>[BH3-]C#N.[Na+]>CCCCNC", "reductive amination"),
    ("CCCCC=O>[BH4-].[Na+]>CCCCCO", "reduction"),
    ("CC(O)CC>O=[Cr](=O)=O>CC(=O)CC", "oxidation"),
    ("CCCBr>CCCC[SnH](CCCC)CCCC>CCC", "hydrodehalogenation"),
    ("CC[Mg]Br.CC(C)=O>>CCC(C)(C)O", "carbonyl addition"),
    ("C[S+](C)=O.O=C1CCCCC1>[H-].[Na+]>C1CCC2(CC1)CO2", "epoxide from a sulfur ylide"),
    ("CCOC(=O)C=[N+]=[N-].CO>[Rh]>CCOC(=O)COC", "carbene insertion"),
    ("COc1ccccc1>BrB(Br)Br>Oc1ccccc1", "demethylation: the stated product is what left"),
    ("CCCCBr.[Mg]>>CCCC[Mg]Br", "a Grignard reagent"),
    ("CI.[Mg]>>C[Mg]I", "the smallest one"),
    ("CCCCBr.[Li]>>CCCC[Li]", "an alkyllithium"),
    ("BrCCCC.[Zn]>>CCCC[Zn]Br", "an organozinc"),
    ("CCCCBr>>CCCC[Mg]Br", "a Grignard reagent, the metal left out"),
    ("Brc1ccccc1.[Mg]>>Br[Mg]c1ccccc1", "an aryl one"),
    ("[CH3:1][CH2:2][Br:3].[Mg:4]>>[CH3:1][CH2:2][Mg:4][Br:3]", "a Grignard reagent, mapped"),
    ("ClC(Cl)Cl.[OH-]>>Cl[C]Cl", "a carbene: no alkene forms from one carbon"),
    ("CCOC(C)=O.[OH-].[Na+]>>CC(=O)[O-]", "saponification: the alkyl carbon keeps its oxygen"),
]


@pytest.mark.parametrize(("scheme", "why"), NOT_AT_SP3_CARBON)
def test_what_happens_elsewhere_is_called_other(scheme: str, why: str) -> None:
    reading = read_scheme(scheme)
    assert str(reading.fate) == "other", (why, reading.reason)
    assert reading.centres == ()


AMBIDENT_AND_ACIDS = [
    ("CCCBr.[S-]C#N>>CCCN=C=S", "thiocyanate", "thiocyanate through nitrogen"),
    ("CCCBr.[N-]=C=S>>CCCSC#N", "thiocyanate", "drawn as isothiocyanate"),
    ("CCCBr.[O-]C#N>>CCCN=C=O", "cyanate", "cyanate through nitrogen"),
    ("CCCBr.[N-]=C=O>>CCCN=C=O", "cyanate", "drawn the other way"),
    ("CCCBr.C[Si](C)(C)N=C=S>>CCCN=C=S", "thiocyanate", "its silyl compound"),
    ("CCCBr.CC(=O)O>>CCCOC(C)=O", "carboxylic_acid", "nothing takes the proton"),
    ("CCCBr.CC(=O)O>O=C([O-])[O-].[K+].[K+]>CCCOC(C)=O", "carboxylate", "carbonate does"),
    ("CCCBr.CC(=O)[O-].[Na+]>>CCCOC(C)=O", "carboxylate", "entered as the salt"),
    ("CCCBr.Oc1ccccc1>>CCCOc1ccccc1", "phenol", "nothing takes the proton"),
    ("CCCBr.Oc1ccccc1>[H-].[Na+]>CCCOc1ccccc1", "phenoxide", "hydride does"),
    ("CCCBr.Oc1ccccc1>[NaH]>CCCOc1ccccc1", "phenoxide", "hydride drawn with its bond"),
    ("CCCBr.CS>>CCCSC", "thiol", "nothing takes the proton"),
    ("CCCBr.CS>CCN(CC)CC>CCCSC", "thiolate", "an amine does"),
]


@pytest.mark.parametrize(("scheme", "word", "why"), AMBIDENT_AND_ACIDS)
def test_a_nucleophile_is_called_what_it_is_in_that_flask(scheme: str, word: str, why: str) -> None:
    nucleophile = read_scheme(scheme).nucleophile
    assert nucleophile is not None and nucleophile.nucleophile_class == word, why
    assert word in REAGENT_CLASSES


@pytest.mark.parametrize(
    ("scheme", "note"),
    [
        ("CC(=O)CCN(C)C.[C-]#N>>CC(=O)CCC#N", "displacement of amine by cyanide"),
        ("CCCS(=O)(=O)c1ccccc1.CC[O-]>>C=CC", "loss of sulfinate to an alkene"),
    ],
)
def test_a_group_that_has_no_word_of_its_own_is_called_what_it_is(scheme: str, note: str) -> None:
    reading = read_scheme(scheme)
    assert reading.possible[0].note == note
    assert not any("other" in f.note for f in reading.possible)


def test_an_ether_of_two_like_alcohols_is_left_unresolved_and_the_reason_given() -> None:
    reading = read_scheme("CCO.CC(C)O>OS(=O)(=O)O>CCOC(C)C")
    assert reading.confidence is Confidence.UNRESOLVED
    assert reading.fate is None and reading.centres == ()
    assert "nothing in the scheme tells" in reading.reason


def test_the_far_better_cation_settles_which_alcohol_gave_up_its_oxygen() -> None:
    reading = read_scheme("CCO.OC(c1ccccc1)(c1ccccc1)c1ccccc1>OS(=O)(=O)O>CCOC(c1ccccc1)(c1ccccc1)c1ccccc1")
    assert str(reading.fate) == "substitution"
    assert reading.centre is not None and reading.centre.component == 1


def test_a_product_that_is_the_starting_material_is_unreacted() -> None:
    assert str(read_scheme("CCCCBr.[Na+]>>CCCCBr").fate) == "unreacted"


def test_a_product_that_cannot_be_had_is_unresolved_and_says_so() -> None:
    reading = read_scheme("CCCCBr.N>>c1ccncc1CC(=O)O")
    assert reading.confidence is Confidence.UNRESOLVED
    assert reading.fate is None and reading.reason


def test_a_nucleophile_that_was_left_out_is_seen_by_comparison() -> None:
    reading = read_scheme("COc1ccc(CCBr)cc1>>COc1ccc(CCN2CCOCC2)cc1")
    assert str(reading.fate) == "substitution"
    assert reading.centre is not None and reading.centre.atom == 7
    assert reading.nucleophile is None
    assert "no stated component brings" in reading.reason


def test_the_stated_product_comes_first_and_side_products_follow() -> None:
    reading = read_scheme("CCC(C)Br.CC[O-].[Na+]>>CCOC(C)CC")
    assert reading.possible[0].product == "CCOC(C)CC"
    assert {"C/C=C/C", "C/C=C\\C", "C=CCC"} <= {p.product for p in reading.possible[1:]}
    products = [p.product for p in reading.possible]
    assert len(products) == len(set(products))


@given(st.integers(min_value=0, max_value=2**31 - 1))
def test_of_two_like_atoms_the_one_entered_first_is_named(seed: int) -> None:
    (text,) = Chem.MolToRandomSmilesVect(Chem.MolFromSmiles("BrCCCBr"), 1, randomSeed=seed)
    typed = Chem.MolFromSmiles(text)
    carbons = [a.GetIdx() for a in typed.GetAtoms() if any(n.GetSymbol() == "Br" for n in a.GetNeighbors())]
    centre = read_scheme(f"{text}.Oc1ccccc1>>BrCCCOc1ccccc1").centre
    assert centre is not None and centre.atom == min(carbons)
    assert typed.GetBondBetweenAtoms(centre.atom, centre.leaving_atom) is not None
