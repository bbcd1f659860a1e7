"""What a drawn configuration did is told in one word, and only where it was drawn on both sides.

The chemistry is textbook knowledge from memory: a displacement inverts; an epoxide closes from groups that stand anti.
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.configuration import STEREO_WORDS
from kb.chem.reading import read_scheme
from kb.vocabulary import Confidence

AZIDE = "[N-]=[N+]=[N-]"

# scheme, word, why
VERDICTS = [
    (f"C[C@@H](Br)CC.{AZIDE}>>CC[C@H](C)N=[N+]=[N-]", "inversion", "one displacement"),
    (f"C[C@@H](Br)CC.{AZIDE}>>CC[C@@H](C)N=[N+]=[N-]", "retention", "no single one"),
    (f"C[C@@H](Br)CC.{AZIDE}>>CCC(C)N=[N+]=[N-]", "", "product drawn flat"),
    (f"CC(Br)CC.{AZIDE}>>CC[C@@H](C)N=[N+]=[N-]", "", "substrate drawn flat"),
    (f"CCCCBr.{AZIDE}>>CCCCN=[N+]=[N-]", "", "no stereocentre"),
    (f"C[C@@H](Br)CC.{AZIDE}>>CC[C@H](C)N=[N+]=[N-].CC[C@@H](C)N=[N+]=[N-]", "scrambled", "both epimers stated"),
    ("C[C@@H](CC)CBr.CS>>C[C@@H](CC)CSC", "", "a stereocentre elsewhere"),
    ("O[C@@H]1CCCC[C@H]1Br.[OH-]>>C1CC[C@@H]2O[C@@H]2C1", "inversion", "trans bromohydrin closes to the cis epoxide"),
    ("O[C@@H]1CCCC[C@@H]1Br.[OH-]>>C1CC[C@@H]2O[C@@H]2C1", "impossible", "cis bromohydrin cannot"),
    ("O[C@H]1CCCC[C@H]1Br.[OH-]>>C1CC[C@@H]2O[C@@H]2C1", "impossible", "nor its mirror image"),
    ("O[C@@]1(C)CCCC[C@H]1Br.[OH-]>>C1CC[C@]2(C)O[C@@H]2C1", "impossible", "nor with a methyl group beside the oxygen"),
    ("C[C@H](O)[C@@H](C)Br.[OH-]>>C[C@@H]1O[C@H]1C", "inversion", "an open chain turns until they stand anti"),
    ("OC[C@H](Br)C.[OH-]>>C[C@H]1CO1", "inversion", "only the centre is a stereocentre"),
]


@pytest.mark.parametrize(("scheme", "word", "why"), VERDICTS)
def test_the_verdict_on_a_configuration(scheme: str, word: str, why: str) -> None:
    reading = read_scheme(scheme)
    assert str(reading.fate) == "substitution", reading.reason
    assert reading.stereo == word, why
    assert reading.as_dict()["stereo"] == word
    assert STEREO_WORDS[word] in reading.reason


MESO = "C1CC[C@@H]2O[C@@H]2C1"


@pytest.mark.parametrize("product", ["O[C@@H]1CCCC[C@H]1N=[N+]=[N-]", "O[C@H]1CCCC[C@@H]1N=[N+]=[N-]"])
@given(seed=st.integers(min_value=0, max_value=2**31 - 1))
def test_a_meso_epoxide_is_opened_at_the_carbon_that_is_inverted(product: str, seed: int) -> None:
    (text,) = Chem.MolToRandomSmilesVect(Chem.MolFromSmiles(MESO), 1, randomSeed=seed)
    reading = read_scheme(f"{text}.{AZIDE}>>{product}")
    assert reading.confidence is Confidence.MATCHED, reading.reason
    assert reading.stereo == "inversion", text
    opposite = read_scheme(f"{text}.{AZIDE}>>{mirrored(product)}")
    assert reading.centre is not None and opposite.centre is not None
    assert reading.centre.atom != opposite.centre.atom, "the enantiomer comes from the other end"


def mirrored(smiles: str) -> str:
    """Return the mirror image."""
    return smiles.replace("@@", "#").replace("@", "@@").replace("#", "@")
