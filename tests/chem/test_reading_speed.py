"""How long a reading takes, in units of what RDKit needs merely to parse and write the same text (run by name).

It prints milliseconds for the record and asserts ratios only, so that a busy machine fails nothing.
"""

from __future__ import annotations

import csv
import time
from pathlib import Path

import pytest
from rdkit import Chem, rdBase

from kb.chem.reading import read_scheme

DATA = Path(__file__).parents[1] / "data" / "patent_reactions.csv"


def rdkit_alone(scheme: str) -> None:
    """Parse and write every molecule of a scheme."""
    for side in scheme.split(">"):
        if side:
            Chem.MolToSmiles(Chem.MolFromSmiles(side))


@pytest.mark.speed
@pytest.mark.parametrize("column", ["rxn_smiles_mapped", "rxn_smiles_unmapped"])
def test_a_reading_costs_a_modest_multiple_of_parsing_and_none_stands_out(
    column: str, capsys: pytest.CaptureFixture[str]
) -> None:
    with DATA.open(encoding="utf-8", newline="") as handle:
        schemes = [r[column] for r in csv.DictReader(handle)]
    spent, parsed = [], []
    with rdBase.BlockLogs():
        for scheme in schemes:
            start = time.process_time()
            rdkit_alone(scheme)
            middle = time.process_time()
            read_scheme(scheme, ignore_maps=True)
            spent.append(time.process_time() - middle)
            parsed.append(middle - start)
    spent.sort()
    parsed.sort()
    median, unit = spent[len(spent) // 2], parsed[len(parsed) // 2]
    with capsys.disabled():
        print(
            f"\n{column}: median {median * 1e3:.1f} ms, 95 % {spent[int(0.95 * len(spent))] * 1e3:.1f} ms, "
            f"slowest {spent[-1] * 1e3:.0f} ms; {median / unit:.1f} times parsing"
        )
    assert median < 25 * unit
    assert spent[-1] < 150 * median
