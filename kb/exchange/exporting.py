"""Runs into files: the format told from the ending, written beside the place and moved there when complete.

It owns that an export is whole or absent: a full disk or a stop leaves the file that was there before. It refuses an
RXN file for several runs. What each format carries: JSON Lines all; the others what `row_out` lists; RXN and SMILES
lists the scheme only.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path

from kb.errors import Cancelled, ChemistryError, ImportFileError
from kb.exchange.ctfile import RDF_HEAD, mol_block, rdf_record, rxn_block, sdf_record
from kb.exchange.jsonlines import write_json_lines
from kb.exchange.row_out import row_of
from kb.exchange.sources import format_of
from kb.exchange.tables_out import write_csv, write_xlsx
from kb.progress import Progress, Silent
from kb.record.run import Run


def export_file(
    runs: Iterable[Run],
    path: Path,
    progress: Progress | None = None,
    *,
    format_name: str | None = None,
    total: int | None = None,
) -> int:
    """Write runs to a file; return how many.

    Args:
        runs: read as a stream.
        path: the file; replaced when the new one is complete.
        progress: told runs done of `total`; asked whether to stop.
        format_name: overrules the ending.
        total: how many runs there are; None = not known.

    Raises:
        ImportFileError: no such format, no place to write to, or several runs for an RXN file.
        Cancelled: the user stopped it; the file that was there stays.
    """
    kind = format_name or format_of(path)
    writers: dict[str, Callable[[Iterable[Run], Path], int]] = {
        "csv": write_csv,
        "xlsx": write_xlsx,
        "jsonl": write_json_lines,
        "rdf": _write_rdf,
        "sdf": _write_sdf,
        "rxn": _write_rxn,
        "smi": _write_smi,
    }
    if kind not in writers:
        raise ImportFileError(f"{kind!r} is no format.", f"Use one of {', '.join(writers)}.", kind)
    watched = _watched(runs, progress or Silent(), total)
    try:
        handle, name = tempfile.mkstemp(prefix=f".{path.name[:40]}.", suffix=".part", dir=path.parent)
        os.close(handle)
    except OSError as error:
        raise _unwritable(path, error) from error
    part = Path(name)
    try:
        if kind == "csv" and path.suffix.casefold() in (".tsv", ".tab"):
            written = write_csv(watched, part, delimiter="\t")
        else:
            written = writers[kind](watched, part)
        part.chmod(0o666 & ~_umask())
        part.replace(path)
    except OSError as error:
        raise _unwritable(path, error) from error
    finally:
        part.unlink(missing_ok=True)
    return written


def _watched(runs: Iterable[Run], progress: Progress, total: int | None) -> Iterator[Run]:
    for done, run in enumerate(runs):
        if done % 100 == 0:
            if progress.cancelled():
                raise Cancelled("The export was stopped.", "Nothing was written.")
            progress.advance(done, total, "runs written")
        yield run


def _write_rdf(runs: Iterable[Run], path: Path) -> int:
    written = 0
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(RDF_HEAD)
        for written, run in enumerate(runs, start=1):
            file.write(rdf_record(written, _drawn(run), _data(run)))
    return written


def _write_sdf(runs: Iterable[Run], path: Path) -> int:
    written = 0
    with path.open("w", encoding="utf-8", newline="\n") as file:
        for run in runs:
            written += 1
            try:
                block = mol_block(run.scheme.split(">")[0].split(".")[0])
            except ChemistryError:
                block = "\n      Sidepath\n\n  0  0  0  0  0  0  0  0  0  0999 V2000\nM  END\n"
            file.write(sdf_record(block, _data(run)))
    return written


def _write_rxn(runs: Iterable[Run], path: Path) -> int:
    several = list(zip(range(2), runs, strict=False))
    if len(several) != 1:
        raise ImportFileError("An RXN file holds one run.", "Choose one run, or write an .rdf file.", str(path))
    path.write_text(_drawn(several[0][1]), encoding="utf-8")
    return 1


def _write_smi(runs: Iterable[Run], path: Path) -> int:
    written = 0
    with path.open("w", encoding="utf-8", newline="\n") as file:
        for run in runs:
            name = " ".join((run.reference or run.code or "").split())
            file.write(f"{run.scheme.split()[0]}\t{name}\n" if name else f"{run.scheme.split()[0]}\n")
            written += 1
    return written


def _drawn(run: Run) -> str:
    """Return the run's RXN block; one without molecules where its scheme cannot be drawn (the text stays as data)."""
    try:
        return rxn_block(run.scheme, run.code or "")
    except ChemistryError:
        return f"$RXN\n{run.code or ''}\n      Sidepath\n\n  0  0\n"


def _data(run: Run) -> dict[str, str]:
    return {name: text for name, text in row_of(run).items() if text}


def _umask() -> int:
    mask = os.umask(0o022)
    os.umask(mask)
    return mask


def _unwritable(path: Path, error: OSError) -> ImportFileError:
    return ImportFileError(
        f"{path} cannot be written: {error.strerror or error}.", "Name another place, or free some room.", str(path)
    )
