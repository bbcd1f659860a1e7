"""Structure files as sources of runs: RDfile, RXN and SDF records, and lists of reaction SMILES.

It joins the drawing of a record with its data fields, which are matched like the headings of a table (the part behind
the last colon of a long field name counts). The drawing is the scheme; a `scheme` field that means the same keeps its
spelling. In an SDF the drawing is the substrate unless a field tells the scheme.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping
from functools import lru_cache
from itertools import islice
from pathlib import Path
from typing import Any

from kb.errors import ChemistryError, ImportFileError, SidepathError
from kb.exchange.ctfile import CtFile, Record
from kb.exchange.headings import MAX_FIELDS_SHOWN, ColumnMapping, ColumnUse, match_headings
from kb.exchange.lookups import is_structure
from kb.exchange.rows import Rejection, RowReader, RowRefused
from kb.exchange.source import Read
from kb.exchange.text_in import LineTooLong, TextLines


class StructureSource:
    """Records of an RDfile, RXN, SDF or SMILES list to runs."""

    def __init__(self, path: Path, kind: str, saved: Mapping[str, Any] | None) -> None:
        self.format_name = kind
        self.unknown_names: Counter[str] = Counter()
        self._saved = saved
        self._met: dict[str, ColumnUse] = {}
        self._file: CtFile | _SmilesList = _SmilesList(path) if kind == "smi" else CtFile(path, kind)
        self._mapping_of = lru_cache(maxsize=256)(self._match)
        if kind in ("rdf", "rxn"):
            _check_head(path, kind)
        if not _holds_something(path, kind):
            raise ImportFileError(
                f"{path.name} holds no {_WHAT[kind]}.", "Is it the right file, and was it exported whole?", path.name
            )

    def __iter__(self) -> Iterator[Read]:
        for record in self._file:
            yield self._read(record)

    @property
    def mapping(self) -> ColumnMapping | None:
        """Return what the data fields met so far are taken for."""
        return ColumnMapping(columns=tuple(self._met.values())) if self._met else None

    @property
    def done_share(self) -> float:
        """Return the part of the file that was read, 0..1."""
        return self._file.done_share

    def _read(self, record: Record) -> Read:
        if record.trouble:
            return self._refused(record, None, record.trouble)
        try:
            data = dict(record.data)
            data["scheme"] = self._scheme(record)
            mapping = self._mapping_of(tuple(data))
            reader = RowReader(mapping=mapping, unknown_names=self.unknown_names)
            return Read(row=record.number, raw=record.raw, run=reader.read(list(data.values())))
        except RowRefused as error:
            column, reason = error.value if isinstance(error.value, tuple) else (None, str(error))
            return self._refused(record, column, reason)
        except SidepathError as error:
            return self._refused(record, None, str(error))

    def _scheme(self, record: Record) -> str:
        written = next((text.strip() for name, text in record.data.items() if _short(name) == "scheme"), "")
        if self.format_name == "smi":
            return record.block
        from kb.chem.schemefile import scheme_of_block

        drawn = scheme_of_block(record.block)
        if self.format_name == "sdf":
            return written or drawn
        return written if written and _same(written, drawn) else drawn

    def _match(self, names: tuple[str, ...]) -> ColumnMapping:
        mapping = match_headings([_short(name) for name in names], self._saved)
        for use in mapping.columns:
            if len(self._met) < MAX_FIELDS_SHOWN:
                self._met.setdefault(use.heading, use)
        return mapping

    def _refused(self, record: Record, column: str | None, reason: str) -> Read:
        return Read(
            row=record.number, raw=record.raw, rejection=Rejection(row=record.number, column=column, reason=reason)
        )


class _SmilesList:
    """Reaction SMILES, one a line, perhaps with a name behind; lines that start with `#` are remarks."""

    def __init__(self, path: Path) -> None:
        self._lines = TextLines(path)

    def __iter__(self) -> Iterator[Record]:
        with self._lines as lines:
            while True:
                try:
                    text = next(lines)
                except StopIteration:
                    return
                except LineTooLong as error:
                    yield Record(number=lines.line, trouble=str(error))
                    continue
                bare = text.strip()
                if not bare or bare.startswith("#"):
                    continue
                scheme, _, name = bare.partition("\t") if "\t" in bare else bare.partition(" ")
                data = {"reference": name.strip()} if name.strip() else {}
                yield Record(number=lines.line, block=scheme, data=data, raw=text)

    @property
    def done_share(self) -> float:
        return self._lines.done_bytes / max(self._lines.size_bytes, 1)


_WHAT = {"rdf": "reaction", "rxn": "reaction", "sdf": "molecule", "smi": "reaction SMILES"}
LOOKED_AT = 200
"""Records of a file that are looked at before it is refused for holding none."""


def _holds_something(path: Path, kind: str) -> bool:
    """Return whether one of the first records has the look of what the ending promises; a bad one may be mended."""
    if kind == "smi":
        first = islice(_SmilesList(path), LOOKED_AT)
        return any("<" not in r.block and (r.block.count(">") >= 2 or is_structure(r.block)) for r in first)
    marks = ("M  END", "V2000", "V3000") if kind == "sdf" else ("$RXN", "$MOL", "V2000", "V3000", "M  V30")
    return any(
        any(mark in (r.block or r.raw) for mark in marks) or (r.raw.count("\n") > 3 and bool(r.trouble))
        for r in islice(CtFile(path, kind), LOOKED_AT)
    )


def _check_head(path: Path, kind: str) -> None:
    with TextLines(path) as lines:
        for _ in range(5):
            try:
                text = next(lines, "")
            except LineTooLong:
                break
            if text.startswith(("$RDFILE", "$RFMT", "$MFMT") if kind == "rdf" else "$RXN"):
                return
    wanted = "$RDFILE" if kind == "rdf" else "$RXN"
    again = "Export it again from the drawing program."
    raise ImportFileError(f"{path.name} does not start with {wanted}.", again, path.name)


def _short(name: str) -> str:
    return name.rsplit(":", 1)[-1].strip()


def _same(written: str, drawn: str) -> bool:
    """Return whether two schemes mean the same structures on each side, atom maps and order aside."""
    from kb.chem.scheme import parse_scheme

    try:
        one, other = parse_scheme(written), parse_scheme(drawn)
    except ChemistryError:
        return False
    return all(
        sorted(f.smiles for f in getattr(one, side)) == sorted(f.smiles for f in getattr(other, side))
        for side in ("reactants", "agents", "products")
    )
