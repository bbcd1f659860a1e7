"""What one cell of a table says: a split, products seen, a date, a controlled word.

It owns the small languages that chemists keep in spreadsheet cells and that the exports write back (materials and
solvents: `material_cells.py`). It knows no columns (`headings.py`) and no rows (`rows.py`). It refuses what can be read
in two ways (03/04/2024) instead of choosing, and raises `QuantityError` or `InvalidRecord` with the value in the
sentence; the row reader adds the place.

    split       substitution 88; elimination 10; unreacted 2            [percent]
    products    C=CCCC 12 (elimination); CCCCC=C                        [percent]; the fate may be left out

Cells that say nothing was recorded ("n.d.", "-", "n/a") are empty; a measured zero stays a zero.
"""

from __future__ import annotations

import datetime as dt
import re
from dataclasses import dataclass

from kb.errors import InvalidRecord, QuantityError
from kb.plain import quoted
from kb.quantity import parse_number, parse_percent
from kb.vocabulary import Cause, Fate, Method, Verdict

NOT_RECORDED = frozenset(
    {"", "-", "–", "—", "?", "na", "n/a", "n.a.", "nd", "n.d.", "none", "null", "not recorded", "not determined"}
)
"""Cells that record nothing. "0" is not among them."""

MAX_ITEMS = 60
"""Most materials, solvents or products in one cell; more is a pasted paragraph, not a list."""

_FATES: dict[str, Fate] = {
    **{str(f): f for f in Fate},
    **dict.fromkeys(("sub", "subst", "sn", "sn1", "sn2", "displacement"), Fate.SUBSTITUTION),
    **dict.fromkeys(("elim", "e1", "e2", "alkene", "olefin"), Fate.ELIMINATION),
    **dict.fromkeys(("rearr", "rearrangement", "shift"), Fate.REARRANGED),
    **dict.fromkeys(("transposition", "sn2'"), Fate.TRANSPOSED),
    **dict.fromkeys(("loss", "group loss", "grouploss", "deprotected"), Fate.GROUP_LOSS),
    **dict.fromkeys(("add", "adduct"), Fate.ADDITION),
    **dict.fromkeys(("sm", "rsm", "starting material", "recovered", "unconverted", "un-reacted"), Fate.UNREACTED),
    **dict.fromkeys(("others", "rest", "unknown"), Fate.OTHER),
}
_VERDICTS: dict[str, Verdict] = {
    **{str(v): v for v in Verdict},
    **dict.fromkeys(("work", "works", "ok", "success", "successful", "good", "yes", "y"), Verdict.WORKED),
    **dict.fromkeys(("partial", "partially", "part", "so-so", "poor", "mixed"), Verdict.PARTLY),
    **dict.fromkeys(("fail", "failure", "no", "n", "unsuccessful", "bad"), Verdict.FAILED),
}
_METHODS: dict[str, Method] = {
    **{str(m): m for m in Method},
    **dict.fromkeys(("1h nmr", "h nmr", "crude nmr", "1h-nmr", "19f nmr", "qnmr", "13c nmr"), Method.NMR),
    **dict.fromkeys(("gc-fid", "gcms", "gc-ms", "gc fid", "gc/ms", "gc ms"), Method.GC),
    **dict.fromkeys(("lc", "lcms", "lc-ms", "uplc", "lc/ms", "hplc-uv", "lc ms"), Method.HPLC),
    **dict.fromkeys(("isolation", "weighed", "isolated yield"), Method.ISOLATED),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class ProductText:
    """One product as a cell gives it; `share` 0..1, None = seen but not measured; `fate` None = not said."""

    smiles: str
    share: float | None = None
    fate: Fate | None = None


def is_recorded(text: str | None) -> bool:
    """Return False for a cell that says nothing ("", "n.d.", "-")."""
    return text is not None and text.strip().casefold() not in NOT_RECORDED


def read_split(text: str, *, per: float = 100.0) -> list[tuple[Fate, float | None]]:
    """Return (fate, share 0..1) in order; None for `elimination ?`, seen but not measured.

    Args:
        text: `substitution 88; elimination 10` or `substitution=88,elimination=10`.
        per: what the figures are parts of: 100 = percent, 1 = fractions.

    Raises:
        InvalidRecord: a fate that is none, or one named twice.
        QuantityError: a share that is none.
    """
    shares: dict[Fate, float | None] = {}
    for item in re.split(r"[;\n]|,(?!\d)|\s+/\s+|(?<=[%\d])/", text):
        if not item.strip():
            continue
        found = re.fullmatch(r"\s*(.+?)\s*(?:[:=]|\s)\s*(-?\d[\d.,]*\s*%?|\?)\s*", item) or re.fullmatch(
            r"\s*(\d[\d.,]*\s*%?)\s*(.+?)\s*", item
        )
        if not found:
            raise InvalidRecord(
                f"{quoted(item)} is no share of a split.", "Write it like: substitution 88; elimination 10.", item
            )
        word, number = (found[1], found[2]) if not found[1][0].isdigit() else (found[2], found[1])
        fate = read_fate(word)
        if fate in shares:
            raise InvalidRecord(f"{fate} stands twice in the split.", "Add the two up.", text)
        shares[fate] = read_share(number, per=per) if number != "?" else None
    return list(shares.items())


def read_share(text: str, *, per: float = 100.0) -> float:
    """Return a share 0..1 from a percentage, or from a fraction where `per` is 1."""
    if per == 1:
        value = parse_number(text.strip(), "share", "Write a fraction between 0 and 1.")
        if not 0 <= value <= 1:
            raise QuantityError(f"The share {quoted(text)} is not between 0 and 1.", "Write a fraction.", text)
        return value
    return round(parse_percent(text, what="share") / 100, 12)


def read_products(text: str, *, per: float = 100.0) -> list[ProductText]:
    """Return the products of a cell: SMILES, then a share, then the fate in brackets; both may be missing.

    `SMILES=12` is read as a share, so a SMILES that ends in a ring closure with its bond (`C1CC=1`) wants a blank and
    a share behind it, or another spelling.

    Raises:
        InvalidRecord: a fate that is none. QuantityError: a share that is none.
    """
    found = []
    for item in re.split(r"[;\n]", text):
        if not item.strip():
            continue
        match = re.fullmatch(r"\s*(\S+?)(?:(?:\s*=\s*|\s+)(-?\d[\d.,]*\s*%?))?\s*(?:\(([^()]+)\))?\s*", item)
        if not match:
            raise InvalidRecord(f"{quoted(item)} is no product.", "Write it like: C=CCCC 12 (elimination).", item)
        found.append(
            ProductText(
                smiles=match[1],
                share=read_share(match[2], per=per) if match[2] else None,
                fate=read_fate(match[3]) if match[3] else None,
            )
        )
    if len(found) > MAX_ITEMS:
        raise InvalidRecord(f"The cell lists {len(found)} products.", f"Give at most {MAX_ITEMS}.", len(found))
    return found


def read_fate(text: str) -> Fate:
    """Return the fate that a word or a customary abbreviation of it means.

    Raises:
        InvalidRecord: no such fate; the hint names the nearest or all of them.
    """
    word = " ".join(text.strip().casefold().replace("_", " ").split())
    fate = _FATES.get(word) or _FATES.get(word.replace(" ", "-"))
    if fate is None:
        from rapidfuzz import process

        near = process.extractOne(word, list(map(str, Fate)), score_cutoff=60)
        hint = f"Did you mean {near[0]}?" if near else f"Use one of {', '.join(Fate)}."
        raise InvalidRecord(f"{quoted(text)} is no fate.", hint, text)
    return fate


def read_verdict(text: str) -> Verdict:
    """Return the verdict; customary words ("ok", "fail", "partial") are understood.

    Raises:
        InvalidRecord: no such verdict.
    """
    found = _VERDICTS.get(text.strip().casefold())
    if found is None:
        raise InvalidRecord(f"{quoted(text)} is no verdict.", f"Use one of {', '.join(Verdict)}.", text)
    return found


def read_method(text: str) -> Method:
    """Return the method of measurement; customary names ("1H NMR", "LCMS") are understood.

    Raises:
        InvalidRecord: no such method.
    """
    found = _METHODS.get(" ".join(text.strip().casefold().split()))
    if found is None:
        raise InvalidRecord(f"{quoted(text)} is no method.", f"Use one of {', '.join(Method)}.", text)
    return found


def read_cause(text: str) -> Cause:
    """Return suspected or confirmed.

    Raises:
        InvalidRecord: neither.
    """
    try:
        return Cause(text.strip().casefold())
    except ValueError as error:
        raise InvalidRecord(f"{quoted(text)} is no cause.", f"Use one of {', '.join(Cause)}.", text) from error


def read_date(text: str, order: str | None = None) -> dt.date:
    """Return a day: `2024-05-17`, `17.05.2024`, `17 May 2024`, `20240517`, `17/05/2024`.

    Args:
        text: as written.
        order: "dmy" or "mdy" for dates with slashes; None = only those that can be read in one way.

    Raises:
        QuantityError: no date, or one that can be read in two ways.
    """
    plain = re.sub(r"[T ]\d{2}:\d{2}(?::\d{2}(?:\.\d+)?)?(?:Z|[+-]\d{2}:?\d{2})?$", "", text.strip())
    hint = "Write it like 2024-05-17."
    found = re.fullmatch(r"(\d{1,4})([-./])(\d{1,2})\2(\d{1,4})", plain)
    try:
        if not found:
            return _written_date(plain)
        a, sep, b, c = int(found[1]), found[2], int(found[3]), int(found[4])
        if len(found[1]) == 4:
            return dt.date(a, b, c)
        if len(found[4]) != 4:
            raise QuantityError(f"The date {quoted(text)} has a year of two digits.", hint, text)
        if sep == "." or order == "dmy" or (a > 12 and order is None):
            return dt.date(c, b, a)
        if order == "mdy" or (b > 12 and order is None):
            return dt.date(c, a, b)
        if a == b:
            return dt.date(c, a, b)
    except ValueError as error:
        if isinstance(error, QuantityError):
            raise
        raise QuantityError(f"{quoted(text)} is no date.", hint, text) from error
    raise QuantityError(
        f"The date {quoted(text)} can be read in two ways.",
        "Write it like 2024-05-17, or say which comes first, the day or the month.",
        text,
    )


def _written_date(plain: str) -> dt.date:
    for form in ("%Y%m%d", "%d %b %Y", "%d %B %Y", "%b %d %Y", "%B %d %Y", "%d-%b-%Y"):
        try:
            return dt.datetime.strptime(plain.replace(",", ""), form).date()
        except ValueError:
            continue
    raise ValueError(plain)
