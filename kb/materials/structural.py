"""What a structure that is in no table does: its classes read off with SMARTS, its pKa taken as typical of them.

It owns the patterns. It is the last resort behind the catalogue, and says None where no pattern fits and the atoms
are not those of an ordinary organic molecule, so that the caller can say "cannot tell". The pKa values are
round figures typical of each class (common practice), good for levels and ranks, never for digits.

RDKit is imported when the first unknown structure arrives, never before.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from kb.materials.catalogue import Reagent
from kb.materials.class_names import add_wider

if TYPE_CHECKING:
    from rdkit import Chem

LONGEST_SMILES = 4000
MOST_ATOMS = 400
_ORDINARY = {"H", "B", "C", "N", "O", "F", "Si", "P", "S", "Cl", "Se", "Br", "I"}


@dataclass(frozen=True, slots=True)
class _Pattern:
    """A class, the SMARTS that earns it, and what a member typically does."""

    word: str
    smarts: str
    pkah: float | None = None
    bulk: str = "unhindered"
    nucleophile: str = "none"
    acidity: str = "none"
    pka: float | None = None
    lewis: str = "none"


_AMINE = "!$(N-C=[O,S,N]);!$(N-S(=O)=O);!$(N-P=O);!$(N-C#N);!$(N-[#7,#8]);!$(N-[Si,B,F,Cl,Br,I])"
_ALKYL_AMINE = f"[NX3;+0;{_AMINE};!$(N-a);!$(N-C=C)"

_FREE_N = "[NX3;!$(N-C=O);!$(N-[#7,#8])]"
_TWO_ACCEPTORS = "$(C(C=O)C=O),$(C(C#N)C=O),$(C(C#N)C#N),$(C(S(=O)=O)C=O),$(C(P(=O)[#8])C=O)"

PATTERNS: tuple[_Pattern, ...] = (
    # anions and reactive metals first: they decide what a fragment is
    _Pattern("alkyllithium", "[Li]-[#6]", 50, nucleophile="good"),
    _Pattern("grignard", "[Mg]-[#6]", 48, nucleophile="good"),
    _Pattern("organozinc", "[Zn]-[#6]", nucleophile="good"),
    _Pattern("organoaluminium", "[Al]-[#6]", nucleophile="good", lewis="strong"),
    _Pattern("organocuprate", "[Cu]-[#6;!$(C#N)]", nucleophile="good"),
    _Pattern("organostannane", "[Sn]-[#6]", nucleophile="weak"),
    _Pattern("organometallic", "[Zr,Ti,Ce,In,Mn]-[CX4,c]", nucleophile="good"),
    _Pattern("cyanide", "[C-]#[N;+0]", 9.2, nucleophile="good"),
    _Pattern("cyanide", "[Na,K,Li,Cu,Ag,Zn,Hg,Si]-C#N", nucleophile="good"),
    _Pattern("azide", "[N-]=[N+]=[N-]", 4.7, nucleophile="good"),
    _Pattern("azide", "[Si,Sn,P]-[N;D2]=[N+]=[N-]", nucleophile="good"),
    _Pattern("acetylide", "[C-]#C", 25, nucleophile="good"),
    _Pattern("tertiary_alkoxide", "[O-]-[CX4;H0]([#6])([#6])[#6]", 17, "hindered", "weak"),
    _Pattern("alkoxide", "[O-]-[CX4;!H0]", 16, nucleophile="good"),
    _Pattern("alkoxide", "[Na,K,Li]-O-[CX4]", 16, nucleophile="good"),
    _Pattern("phenoxide", "[O-]-c", 10, nucleophile="good"),
    _Pattern("carboxylate", "[O-]-C(=O)-[#6,#1]", 4.5, nucleophile="good"),
    _Pattern("thiocarboxylate", "[S-]C(=O)[#6]", 3.3, nucleophile="good"),
    _Pattern("thiocarboxylate", "[O-]C(=S)[#6]", 3.3, nucleophile="good"),
    _Pattern("thiocarboxylate", "[SX2;H1]C(=O)[#6]", nucleophile="good", acidity="weak", pka=3.3),
    _Pattern("xanthate", "[S-]C(=S)[O,N]", 2, nucleophile="good"),
    _Pattern("thiolate", "[S-]-[#6;!$(C=[O,S])]", 9, nucleophile="good"),
    _Pattern("sulfinate", "[O-]S(=O)[#6]", 2, nucleophile="good"),
    _Pattern("selenide", "[Se-,Se;H1]", 6, nucleophile="good"),
    _Pattern("stabilised_carbanion", f"[C-;X3;{_TWO_ACCEPTORS}]", 12, nucleophile="good"),
    _Pattern("phosphonate_anion", "[C-]P(=O)([#8])[#8]", 18, nucleophile="good"),
    _Pattern("enolate", "[C-;$(C[C,S]=O),$(C[N+]=O),$(CC#N)]", 22, nucleophile="good"),
    _Pattern("enolate", "[O-]C=C", 20, nucleophile="good"),
    _Pattern("enolate", "C=[N+]([O-])[O-]", 10, nucleophile="good"),
    _Pattern("imide_anion", "[N-](C=O)C=O", 8.5, nucleophile="good"),
    _Pattern("sulfonamide", "[N-]S(=O)=O", 10, nucleophile="good"),
    _Pattern("azolide", "[n-]", 13, nucleophile="good"),
    _Pattern(
        "metal_amide", "[N-;!$([N-]=*);!$([N-]C=O);!$([N-]S(=O)=O);!$([N-]~[N+])]([CX4,Si])", 36, "hindered", "weak"
    ),
    _Pattern("phosphide", "[P-;X2]", 22, nucleophile="good"),
    _Pattern("siloxide", "[O-][Si]", 12.7, nucleophile="good"),
    _Pattern("oxime", "[O-]N=C", 12, nucleophile="good"),
    # nitrogen
    _Pattern("primary_amine", f"{_ALKYL_AMINE};H2;!$(NC([#6])([#6])[#6])]", 10, nucleophile="good"),
    _Pattern("primary_amine", f"{_ALKYL_AMINE};H2;$(NC([#6])([#6])[#6])]", 10.5, "hindered", "weak"),
    _Pattern("secondary_amine", f"{_ALKYL_AMINE};H1;!$(N([CX4;!R;!H2;!H3])[CX4;!R;!H2;!H3])]", 10, nucleophile="good"),
    _Pattern("secondary_amine", f"{_ALKYL_AMINE};H1;$(N([CX4;!R;!H2;!H3])[CX4;!R;!H2;!H3])]", 11, "hindered", "weak"),
    _Pattern("tertiary_amine", f"{_ALKYL_AMINE};H0;X3]", 9.5, "hindered", "weak"),
    _Pattern("primary_amine", f"[NX3;H2;+0;{_AMINE};$(N-c)]", 4.5, nucleophile="good"),
    _Pattern("secondary_amine", f"[NX3;H1;+0;{_AMINE};$(N-c)]", 4.5, nucleophile="good"),
    _Pattern("aromatic_amine", f"[NX3;+0;{_AMINE};$(N-c)]", 4.5, nucleophile="weak"),
    _Pattern("aromatic_amine_base", "[nX2;+0;r6]", 4.5, nucleophile="weak"),
    _Pattern("aromatic_amine_base", "[nX2;+0;r5;$(n:c:[n;H0;X3]),$(n:c:[nH])]", 6.5, nucleophile="weak"),
    _Pattern("amidine_base", f"[NX2;+0;!$(N-[#7,#8]);$(N=[CX3;$(C[#6]),$([CH1])]{_FREE_N})]", 12, "hindered", "weak"),
    _Pattern("guanidine_base", "[NX2;+0;$(N=C([NX3;!$(N-C=O)])[NX3;!$(N-C=O)])]", 13.5, "hindered", "weak"),
    _Pattern("phosphazene_base", "N=P([NX3])([NX3])[NX3]", 16, "hindered"),
    _Pattern("hydrazine", "[NX3;+0;!$(N-C=O);!$(N-S(=O)=O);!$(N-[N+])]-[NX3;H2,H1;+0]", 8, nucleophile="good"),
    _Pattern("hydroxylamine", "[NX3;H2,H1;+0;!$(N-C=O)]-[OX2]", 5, nucleophile="good"),
    _Pattern("ammonium_salt", "[NX4+;!H0]", acidity="weak", pka=10),
    _Pattern("pyridinium_salt", "[nH+]", acidity="weak", pka=5),
    _Pattern("quaternary_ammonium", "[NX4+;H0;!$(N-[O-])]"),
    _Pattern("quaternary_ammonium", "[n+;H0;!$(n-[O-])]"),
    _Pattern("amine_oxide", "[N+,n+;H0]-[O-;X1;!$(O-[N+]=O)]", 4.5, nucleophile="weak"),
    _Pattern("azole", "[nH]", nucleophile="weak", pka=14),
    _Pattern("imide", "[NX3;H1](C=O)C=O", nucleophile="weak", pka=9),
    _Pattern("sulfonamide", "[NX3;!H0]S(=O)(=O)[#6]", nucleophile="weak", pka=10),
    _Pattern("carbamate", "[NX3;!H0]C(=O)[OX2]", nucleophile="none"),
    _Pattern("amide", "[NX3;!H0;!$(N(C=O)C=O)]C(=O)[#6,#7,#1]", nucleophile="none"),
    _Pattern("nitrile", "[NX1]#[CX2]-[#6]"),
    _Pattern("oxime", "[OX2;H1]N=C", nucleophile="weak", pka=11),
    _Pattern("diazo", "[C]=[N+]=[N-]"),
    # oxygen
    _Pattern("sulfonic_acid", "[OX2;H1]S(=O)(=O)[#6]", acidity="strong", pka=-2),
    _Pattern("mineral_acid", "[OX2;H1]S(=O)(=O)[OX2]", acidity="strong", pka=-2),
    _Pattern("mineral_acid", "[OX2;H1]P(=O)([#6,#8])[#6,#8]", acidity="strong", pka=2),
    _Pattern("perfluoro_acid", "[OX2;H1]C(=O)C(F)(F)[#6,F]", acidity="strong", pka=0.5),
    _Pattern("peracid", "[OX2;H1]OC(=O)[#6,#1]", acidity="weak", pka=8),
    _Pattern("carboxylic_acid", "[OX2;H1]C(=O)[#6,#1;!$(C(F)(F)[#6,F])]", nucleophile="weak", acidity="weak", pka=4.5),
    _Pattern("phenol", "[OX2;H1]c", nucleophile="weak", pka=10),
    _Pattern("alcohol", "[OX2;H1][CX4]", nucleophile="weak", pka=16),
    _Pattern("silanol", "[OX2;H1][Si]", nucleophile="weak", pka=11),
    _Pattern("hydroperoxide", "[OX2;H1][OX2][#6;!$(C=O)]", nucleophile="weak", pka=12),
    _Pattern("dialkyl_peroxide", "[#6][OX2][OX2][#6]"),
    _Pattern("epoxide", "[OX2r3]1[#6r3][#6r3]1"),
    _Pattern("epoxide", "[NX3r3]1[CX4r3][CX4r3]1"),
    _Pattern("aldehyde", "[CX3;H1,H2](=O)[#6,#1]"),
    _Pattern("ketone", "[#6][CX3](=O)[#6]"),
    _Pattern("ester", "[#6][CX3](=O)[OX2][#6;!$(C=O)]"),
    _Pattern("anhydride", "[#6]C(=O)OC(=O)[#6]"),
    _Pattern("carbonate_anhydride", "[#6]OC(=O)OC(=O)O[#6]"),
    _Pattern("acetal", "[CX4]([OX2;!H1][#6])[OX2;!H1][#6]"),
    _Pattern("enol_ether", "C=[CX3][OX2][CX4]"),
    _Pattern("silyl_enol_ether", "C=C[OX2][Si]", nucleophile="weak"),
    _Pattern("michael_acceptor", "[CX3;!H0]=[CX3][C;$(C=O),$(C#N)]"),
    _Pattern("michael_acceptor", "[CX3;!H0]=[CX3][$(S(=O)=O),$([N+](=O)[O-])]"),
    _Pattern("active_methylene", f"[CX4;!H0;{_TWO_ACCEPTORS}]", pka=12),
    _Pattern("nitroalkane", "[CX4;!H0][N+](=O)[O-]", pka=10),
    # sulfur, phosphorus, silicon, boron
    _Pattern("thiol", "[SX2;H1][#6;!$(C=[O,S])]", nucleophile="good", pka=9.5),
    _Pattern("thiourea", "[NX3]C(=S)[NX3]", nucleophile="good"),
    _Pattern("thioether", "[SX2;H0]([CX4,c])[CX4,c]", nucleophile="weak"),
    _Pattern("phosphine", "[PX3;+0]([#6])([#6])[#6,#1]", 5, nucleophile="good"),
    _Pattern("phosphite", "[PX3;+0]([OX2])([OX2])", nucleophile="good"),
    _Pattern("phosphite", "[PX4;H1]=O", nucleophile="weak"),
    _Pattern("ylide", "[P+]-[CX4;!H0,CX3-]"),
    _Pattern("ylide", "[PX4]=[CX3]", 18, nucleophile="good"),
    _Pattern("sulfonium_salt", "[S+;X3]([#6])([#6])[#6]"),
    _Pattern("oxonium_salt", "[O+;X3]"),
    _Pattern("silane", "[Si;!H0]"),
    _Pattern("boronic_acid", "[#6]B([OX2])[OX2]"),
    _Pattern("boronic_acid", "[#6][B-](F)(F)F"),
    _Pattern("borane", "[BX3;!H0]"),
    # halides and other electrophiles
    _Pattern("activated_halide", "[Cl,Br,I][CX4;$(C-C=O),$(C-c),$(C-C=C),$(C-C#[C,N]),$(C-[OX2][#6])]"),
    _Pattern("alkyl_halide", "[Cl,Br,I][CX4]"),
    _Pattern("aryl_halide", "[F,Cl,Br,I]c"),
    _Pattern("alkyl_sulfonate", "[CX4]OS(=O)(=O)[#6;!$(C(F)(F)F)]"),
    _Pattern("alkyl_triflate", "[CX4]OS(=O)(=O)C(F)(F)F"),
    _Pattern("dialkyl_sulfate", "[CX4]OS(=O)(=O)O[CX4]"),
    _Pattern("acyl_halide", "[Cl,Br,F]C(=O)[#6]"),
    _Pattern("chloroformate", "ClC(=O)[OX2]"),
    _Pattern("carbamoyl_chloride", "ClC(=O)[NX3]"),
    _Pattern("sulfonyl_chloride", "ClS(=O)(=O)[#6]", nucleophile="weak"),
    _Pattern("sulfonyl_fluoride", "FS(=O)(=O)[#6]"),
    _Pattern("silyl_chloride", "[Cl,Br][Si]"),
    _Pattern("silyl_iodide", "I[Si]", nucleophile="good", lewis="strong"),
    _Pattern("silyl_triflate", "[Si]OS(=O)(=O)C(F)(F)F", lewis="strong"),
    _Pattern("isocyanate", "N=C=[O,S]"),
    _Pattern("carbodiimide", "[#6]N=C=N[#6]"),
    _Pattern("azodicarboxylate", "C(=O)N=NC(=O)"),
    _Pattern("activated_ester", "C(=O)ON(C=O)C=O"),
    _Pattern("activated_ester", "C(=O)[n;r5]"),
    # metals that the table does not name in this form
    _Pattern("aluminium_halide", "[Al]-[Cl,Br,I]", lewis="strong"),
    _Pattern("boron_trihalide", "[BX3]([F,Cl,Br,I])([F,Cl,Br,I])[F,Cl,Br,I]", lewis="strong"),
    _Pattern("titanium_halide", "[Ti]", lewis="strong"),
    _Pattern("tin_halide", "[Sn]-[Cl,Br,I]", lewis="strong"),
    _Pattern("zinc_halide", "[Zn]-[Cl,Br,I]", lewis="strong"),
    _Pattern("iron_halide", "[Fe]-[Cl,Br]", lewis="strong"),
    _Pattern("silver_salt", "[Ag]"),
    _Pattern("mercury_salt", "[Hg]", lewis="mild"),
    _Pattern("copper", "[Cu]"),
    _Pattern("palladium", "[Pd]"),
    _Pattern("nickel", "[Ni]"),
    _Pattern("metal_catalyst", "[Pt,Rh,Ir,Co,Ru]"),
    _Pattern("chromium", "[Cr]=O"),
    _Pattern("permanganate", "[Mn](=O)(=O)=O"),
    _Pattern("osmium", "[Os]"),
    # oxidants
    _Pattern("n_haloimide", "[Cl,Br,I][NX3](C=O)"),
    _Pattern("electrophilic_fluorine", "F[N+,N;X3,X4]"),
    _Pattern("hypervalent_iodine", "[I;X2,X3,X4,X5;!$([I-])]([#6])~[O,N,Cl,F]"),
    _Pattern("ddq", "O=C1C(Cl)=C(Cl)C(=O)C=C1"),
    _Pattern("aminoxyl", "[NX3]-[O;X1;+0]"),
    # what is left of an ordinary molecule
    _Pattern("alkyne", "[CX2;H1]#C", pka=24),
    _Pattern("alkene", "[CX3;!$(C=[!#6])]=[CX3;!$(C=[!#6])]"),
)


def canonical_smiles(text: str) -> str | None:
    """Return the canonical SMILES of a text that is a structure, atom maps dropped; None for any other text."""
    return _parsed(text.strip())[0]


def classify_structure(smiles: str) -> Reagent | None:
    """Return what a structure does, judged by its groups; None where nothing can be said.

    Args:
        smiles: one fragment.

    Returns:
        Facts under the structure's canonical SMILES as name. An ordinary organic molecule without any group of the
        table is `inert_organic`.
    """
    return _classified(smiles.strip())


@lru_cache(maxsize=4096)
def _parsed(text: str) -> tuple[str | None, bool]:
    """Return (canonical SMILES, True), or (None, False) for what is no structure of workable size."""
    if not text or len(text) > LONGEST_SMILES or re.search(r"\s", text):
        return None, False
    mol = _mol(text)
    if mol is None or not 0 < mol.GetNumAtoms() <= MOST_ATOMS:
        return None, False
    from rdkit import Chem

    for atom in mol.GetAtoms():
        atom.SetAtomMapNum(0)
    return str(Chem.MolToSmiles(mol)), True


def _mol(text: str) -> Chem.Mol | None:
    from rdkit import Chem
    from rdkit.rdBase import BlockLogs

    with BlockLogs():
        return Chem.MolFromSmiles(text)


@lru_cache(maxsize=1)
def _queries() -> tuple[tuple[_Pattern, Chem.Mol], ...]:
    from rdkit import Chem

    return tuple((pattern, Chem.MolFromSmarts(pattern.smarts)) for pattern in PATTERNS)


def _is_ordinary(mol: Chem.Mol) -> bool:
    """Return True for a neutral closed-shell molecule of carbon and its usual companions; nitro and azido pass."""
    from rdkit import Chem

    in_neutral_group = {a for match in mol.GetSubstructMatches(_charged_but_neutral()) for a in match}
    return any(a.GetAtomicNum() == 6 for a in mol.GetAtoms()) and all(
        a.GetSymbol() in _ORDINARY
        and not a.GetNumRadicalElectrons()
        and (not a.GetFormalCharge() or a.GetIdx() in in_neutral_group)
        for a in Chem.Mol(mol).GetAtoms()
    )


@lru_cache(maxsize=1)
def _charged_but_neutral() -> Chem.Mol:
    from rdkit import Chem

    return Chem.MolFromSmarts("[N+;$([N+](=O)[O-]),$([N+](=N)=[N-])]~[O-,N-]")


@lru_cache(maxsize=4096)
def _classified(text: str) -> Reagent | None:
    canonical, is_structure = _parsed(text)
    mol = _mol(canonical) if is_structure and canonical else None
    if mol is None or canonical is None:
        return None
    hits = [pattern for pattern, query in _queries() if mol.HasSubstructMatch(query)]
    words = {pattern.word for pattern in hits}
    if not words:
        if not _is_ordinary(mol):
            return None
        words = {"inert_organic"}
    bases = [p for p in hits if p.pkah is not None]
    base = max(bases, key=lambda p: p.pkah or 0.0, default=None)
    acids = [p for p in hits if p.pka is not None]
    acid = min(acids, key=lambda p: p.pka or 0.0, default=None)
    acidity = max((p.acidity for p in hits), key=("none", "weak", "strong").index, default="none")
    if base is not None and acid is not None and (base.pkah or 0) > (acid.pka or 0) + 3 and acidity != "none":
        acidity = "none"  # an amino acid is its own salt
    return Reagent(
        name=canonical,
        smiles=canonical,
        classes=add_wider(words),
        pkah=base.pkah if base else None,
        bulk=base.bulk if base else None,
        acidity=acidity,
        pka=acid.pka if acid else None,
        lewis=max((p.lewis for p in hits), key=("none", "mild", "strong").index, default="none"),
        nucleophile=max((p.nucleophile for p in hits), key=("none", "weak", "good").index, default="none"),
        source="worked out from the structure; pKa typical of the class (common practice)",
    )
