"""Connection-table files: RDfile, SDF and RXN framing in both directions; molecules are written as V2000.

It owns the frames of records and data, not what stands in an RXN block or molfile (`kb.chem.schemefile`) and not what
the data mean (`headings`, `rows`). It refuses a record longer than LONGEST_RECORD and reads on behind it. Text
of data is carried to the letter: a line of it that starts with `$`, `>` or a backslash gets a backslash in front, which
reading takes off.

Source of the frames: Biovia, CTfile Formats (2020), chapters on RXN files, RDfiles and SDfiles (memory).
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from kb.exchange.text_in import LineTooLong, TextLines

LONGEST_RECORD = 4_000_000
"""Longest record of an RDfile or SDF [characters]."""

_RDF_START = re.compile(r"\$(?:RFMT|MFMT)\b")
_SDF_DATUM = re.compile(r">.*?<([^<>]{1,200})>")


@dataclass(frozen=True, slots=True, kw_only=True)
class Record:
    """One record of a structure file.

    Attributes:
        number: from 1.
        block: RXN block or molfile; "" where the record could not be framed.
        data: field name to text, in file order.
        raw: the record as it stands, for a rejects file.
        trouble: why the record could not be framed; None = it could.
    """

    number: int
    block: str = ""
    data: Mapping[str, str] = field(default_factory=dict)
    raw: str = ""
    trouble: str | None = None


class CtFile:
    """An RDfile, SDF or RXN file; iterating gives its records."""

    def __init__(self, path: Path, kind: str) -> None:
        self._lines = TextLines(path)
        self._kind = kind

    def __iter__(self) -> Iterator[Record]:
        with self._lines as lines:
            for number, (raw, trouble) in enumerate(_pieces(lines, self._kind), start=1):
                yield Record(number=number, raw=raw, trouble=trouble) if trouble else _record(number, raw, self._kind)

    @property
    def done_share(self) -> float:
        """Return the part of the file that was read, 0..1."""
        return self._lines.done_bytes / max(self._lines.size_bytes, 1)


def rxn_block(scheme: str, name: str = "") -> str:
    """Return a scheme as an RXN block (V2000), drawn flat; agents are counted behind the products.

    Raises:
        ChemistryError: the scheme cannot be understood.
    """
    from kb.chem.scheme import parse_scheme

    parsed = parse_scheme(scheme)
    sides = (parsed.reactants, parsed.products, parsed.agents)
    counts = "".join(f"{len(side):3d}" for side in (sides if parsed.agents else sides[:2]))
    blocks = [f"$MOL\n{mol_block(f.smiles_as_entered)}" for side in sides for f in side]
    return f"$RXN\n{_one_line(name)}\n      Sidepath\n\n{counts}\n" + "".join(blocks)


def mol_block(smiles: str) -> str:
    """Return a structure as a molfile with flat coordinates, ending in a new line.

    Raises:
        StructureError: no structure.
    """
    from rdkit import Chem
    from rdkit.Chem import rdDepictor

    from kb.chem.structure import parse_molecule

    mol = parse_molecule(smiles)
    rdDepictor.Compute2DCoords(mol)
    return str(Chem.MolToMolBlock(mol))


def rdf_record(number: int, block: str, data: Mapping[str, str]) -> str:
    """Return one record of an RDfile."""
    lines = [f"$RFMT $RIREG {number}\n", block]
    for name, text in data.items():
        lines.append(f"$DTYPE {_one_line(name)}\n$DATUM {_escaped(text)}\n")
    return "".join(lines)


def sdf_record(block: str, data: Mapping[str, str]) -> str:
    """Return one record of an SDF."""
    lines = [block]
    for name, text in data.items():
        lines.append(
            f">  <{_one_line(name).replace('<', '(').replace('>', ')')}>\n{_escaped(text, blank_ends=True)}\n\n"
        )
    return "".join(lines) + "$$$$\n"


RDF_HEAD = "$RDFILE 1\n$DATM 01/01/00 00:00\n"
"""First lines of an RDfile. The date is fixed: two exports of the same runs are the same file."""


def _pieces(lines: TextLines, kind: str) -> Iterator[tuple[str, str | None]]:
    """Yield (record text, trouble) of a file, bounded."""
    held: list[str] = []
    size, trouble = 0, None
    is_open = kind == "rxn" or kind == "sdf"
    while True:
        try:
            line = next(lines)
        except StopIteration:
            break
        except LineTooLong as error:
            trouble, line = str(error), ""
        starts = kind == "rdf" and bool(_RDF_START.match(line))
        if starts:
            if is_open:
                yield "".join(held), trouble
            held, size, trouble, is_open = [], 0, None, True
        ends = kind == "sdf" and line.startswith("$$$$")
        if is_open and trouble is None and not ends:
            size += len(line)
            if size > LONGEST_RECORD:
                trouble = f"The record is longer than {LONGEST_RECORD:,} characters."
                held = held[:50]
            else:
                held.append(line)
        if ends:
            if "".join(held).strip() or trouble:
                yield "".join(held), trouble
            held, size, trouble = [], 0, None
    if is_open and ("".join(held).strip() or trouble):
        yield "".join(held), trouble


def _record(number: int, raw: str, kind: str) -> Record:
    text = raw.replace("\r\n", "\n").replace("\r", "\n")
    if kind == "rxn":
        return Record(number=number, block=text, raw=raw)
    if kind == "sdf":
        block, data = _sdf_parts(text)
        return Record(number=number, block=block, data=data, raw=raw)
    _, _, body = text.partition("\n")
    block, _, rest = body.partition("\n$DTYPE")
    data = _rdf_data("$DTYPE" + rest) if rest else {}
    if not block.strip():
        return Record(number=number, raw=raw, trouble="The record holds no reaction and no molecule.")
    return Record(number=number, block=block + "\n", data=data, raw=raw)


def _rdf_data(text: str) -> dict[str, str]:
    data: dict[str, str] = {}
    for piece in re.split(r"^\$DTYPE[ ]?", text, flags=re.M)[1:]:
        name, _, datum = piece.partition("\n$DATUM")
        value = datum.removeprefix(" ").removesuffix("\n")
        data.setdefault(name.strip()[:200], _unescaped(value))
    return data


def _sdf_parts(text: str) -> tuple[str, dict[str, str]]:
    block, end, rest = text.partition("M  END")
    data: dict[str, str] = {}
    name: str | None = None
    held: list[str] = []
    for line in rest.split("\n"):
        found = _SDF_DATUM.match(line)
        if found:
            name, held = found[1], []
            data.setdefault(name, "")
        elif name is not None and line == "":
            data[name] = _unescaped("\n".join(held))
            name = None
        elif name is not None:
            held.append(line)
    if name is not None:
        data[name] = _unescaped("\n".join(held))
    return block + end + "\n", data


def _one_line(text: str) -> str:
    return " ".join(text.split())[:80]


def _escaped(text: str, blank_ends: bool = False) -> str:
    """Return data text whose lines cannot be taken for a frame; with `blank_ends`, empty lines are marked too."""
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    return "\n".join(
        "\\" + line if line[:1] in ("$", ">", "\\") or (blank_ends and not line) else line for line in lines
    )


def _unescaped(text: str) -> str:
    return "\n".join(line[1:] if line.startswith("\\") else line for line in text.split("\n"))


__all__: Sequence[str] = [
    "RDF_HEAD",
    "CtFile",
    "Record",
    "mol_block",
    "rdf_record",
    "rxn_block",
    "sdf_record",
]
