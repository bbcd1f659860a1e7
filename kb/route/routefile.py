"""A route file, TOML or JSON, read into a draft whose yields still have to be looked up.

It owns the format, which stands here, and the sentences that refuse what does not fit it. It opens no book: whoever
holds one turns `runs` and `plan` into yields (`kb.book.routes`).

    title = "Azide to amide"            # optional
    target = "2 g"                      # or "5 mmol"; optional
    product = "CC(=O)NCCc1ccccc1"       # SMILES of the end, for grams; optional
    money = "EUR"                       # optional

    [material.bromide]                  # optional; what is not named here is a material without price
    smiles = "BrCCc1ccccc1"
    price_per_g = 0.4                   # 0 = costs nothing
    molar_mass = 185.06                 # g/mol, where there is no SMILES

    [[step]]
    name = "azide"
    from = "bromide"                    # default: the step before; for the first one "starting material"
    run = "R-0042"                      # recorded: one code or a list

    [[step]]
    name = "amine"
    yield = "82 (75 to 89)"             # given: percent with its 80 % interval, or alone and then taken as exact
    cheap_input = true                  # or easy_separation, volatile_by_product: a poor yield does not matter here
    cost_per_mmol = 0.1

    [[step]]
    name = "amide"
    from = ["amine", { name = "anhydride", equiv = 1.2 }]      # main line first
    plan = { scheme = "NCCc1ccccc1.CC(=O)OC(C)=O>>CC(=O)NCCc1ccccc1", temperature = "rt" }   # estimated

A step has exactly one of `yield`, `run` and `plan`; the words of `plan` are those of a planned step everywhere. A
`yield` may have a `plan` beside it: the yield is then the one that is given, and the plan is checked for its findings.
"""

from __future__ import annotations

import difflib
import json
import re
import stat
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from kb.errors import ImportFileError, InvalidRecord
from kb.quantity import parse_number
from kb.record.finding import Interval
from kb.route.imagined import parse_target
from kb.route.sequence import Input, Material, molar_mass_of

LARGEST_BYTES = 1_000_000
MOST_STEPS = 200
"""The longest published sequences have fewer than a hundred steps; a longer list is another kind of file."""
FORGIVEN = {
    "cheap_input": "cheap input",
    "easy_separation": "easy separation",
    "volatile_by_product": "volatile by-product",
}
"""Flag to the words for why a poor yield does not matter."""
_STEP = {"name", "from", "yield", "run", "plan", "product", "cost_per_mmol", *FORGIVEN}
_TOP = {"title", "target", "product", "money", "material", "step"}
_MATERIAL = {"smiles", "price_per_g", "molar_mass"}
_START = "starting material"
_RANGE = re.compile(r"^\s*(?:(?P<mean>[^(]+?)\s*\()?\s*(?P<low>[^()]+?)\s*(?:to|–|-)\s*(?P<high>[^()]+?)\s*\)?\s*$")


@dataclass(frozen=True, slots=True, kw_only=True)
class StepDraft:
    """One step as written; one of `given`, `runs` and `plan` is there, or `given` with a plan that is only checked."""

    name: str
    inputs: tuple[Input, ...]
    given: Interval | None = None
    runs: tuple[str, ...] = ()
    plan: Mapping[str, Any] | None = None
    product: str | None = None
    cost_per_mmol: float | None = None
    forgiven: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class RouteDraft:
    """A route as written."""

    title: str
    steps: tuple[StepDraft, ...]
    materials: tuple[Material, ...]
    target_mmol: float | None = None
    target_molar_mass: float | None = None
    money: str = ""


def read_route(path: Path) -> RouteDraft:
    """Read a route file.

    Raises:
        ImportFileError: the file is not there, too large, or neither TOML nor JSON.
        InvalidRecord, QuantityError: something in it cannot be.
    """
    try:
        seen = path.stat()
        if stat.S_ISCHR(seen.st_mode) or stat.S_ISBLK(seen.st_mode):
            raise OSError("a device has no end")
        size = seen.st_size
        text = path.read_text(encoding="utf-8") if size <= LARGEST_BYTES else ""
    except (OSError, ValueError) as error:
        raise ImportFileError(f"{path.name} {_why(error)}.", "Give a TOML or JSON file in UTF-8.", str(path)) from None
    if size > LARGEST_BYTES:
        raise ImportFileError(
            f"{path.name} holds {size:,} bytes; no route is that long.", "Is it the right file?", size
        )
    try:
        words = json.loads(text) if path.suffix.lower() == ".json" else tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        raise ImportFileError(f"{path.name}: {error}.", "Write it as the example of `sidepath route --help`.") from None
    return draft_route(words, path.stem)


def _why(error: OSError | ValueError) -> str:
    """Return why a file cannot be read, in words that follow its name."""
    if isinstance(error, FileNotFoundError):
        return "is not there"
    if isinstance(error, IsADirectoryError):
        return "is a folder"
    if isinstance(error, PermissionError):
        return "may not be read by you"
    return "is no text in UTF-8" if isinstance(error, UnicodeDecodeError) else "cannot be read"


def draft_route(words: Any, name: str = "route") -> RouteDraft:
    """Turn the words of a file into a draft; see the module for the format.

    Raises:
        InvalidRecord, QuantityError: something in it cannot be.
    """
    _table(words, "The route")
    _known(words, _TOP, "The route")
    listed = words.get("step")
    if not isinstance(listed, list) or not listed:
        raise InvalidRecord("The route has no steps.", "Give at least one [[step]].")
    if len(listed) > MOST_STEPS:
        raise InvalidRecord(f"The route has {len(listed):,} steps.", f"At most {MOST_STEPS} are reckoned.", len(listed))
    steps: list[StepDraft] = []
    for number, step in enumerate(listed, 1):
        steps.append(_step(step, number, steps[-1].name if steps else _START))
    materials = _materials(words.get("material") or {}, steps)
    product = _text(words, "product", "The route")
    molar_mass = _molar_mass(product, "The product") if product else None
    return RouteDraft(
        title=_text(words, "title", "The route") or name,
        steps=tuple(steps),
        materials=materials,
        target_mmol=_target(words.get("target"), molar_mass),
        target_molar_mass=molar_mass,
        money=_text(words, "money", "The route") or "",
    )


def parse_yield(value: Any, where: str = "The yield") -> Interval:
    """Return a yield [%] with its 80 % interval: `82`, "82 %", "82 (75 to 89)", "75 to 89" (the middle is the mean).

    Raises:
        QuantityError: it cannot be read. InvalidRecord: it is no percentage.
    """
    if isinstance(value, bool) or not isinstance(value, (int, float, str)):
        raise InvalidRecord(f"{where} is {value!r}.", 'Write percent: 82 or "82 (75 to 89)".', value)
    text = str(value).replace("%", " ").strip()
    found = _RANGE.match(text)
    if found is None:
        mean = low = high = parse_number(text, what="yield", hint='Write percent: 82 or "82 (75 to 89)".')
    else:
        low, high = parse_number(found["low"], what="yield"), parse_number(found["high"], what="yield")
        mean = parse_number(found["mean"], what="yield") if found["mean"] else (low + high) / 2
    if not 0 <= low <= mean <= high <= 100 or mean <= 0:
        raise InvalidRecord(f"{where} is {text}.", "A yield lies above 0 and up to 100 %, between its bounds.", value)
    return Interval(mean=mean, low=low, high=high)


def _step(words: Any, number: int, before: str) -> StepDraft:
    where = f"Step {number}"
    _table(words, where)
    _known(words, _STEP, where)
    sources = [key for key in ("yield", "run", "plan") if words.get(key) not in (None, "", [])]
    if len(sources) != 1 and sources != ["yield", "plan"]:
        raise InvalidRecord(
            f"{where} has {' and '.join(sources) if sources else 'no yield'}.",
            "Give exactly one of `yield`, `run` (a recorded run) and `plan` (to be estimated).",
        )
    if "plan" in sources:
        _plan(words["plan"], f"The plan of step {number}")
    if product := _text(words, "product", where):
        _molar_mass(product, f"The product of step {number}")
    runs = words.get("run") or []
    runs = [runs] if isinstance(runs, str) else runs
    if not isinstance(runs, list) or not all(isinstance(code, str) for code in runs):
        raise InvalidRecord(f"{where}: run is {words['run']!r}.", 'Write run = "R-0042" or a list of codes.')
    flagged = [key for key in FORGIVEN if words.get(key) not in (None, False)]
    for key in flagged:
        if words[key] is not True:
            raise InvalidRecord(f"{where}: {key} is {words[key]!r}.", "Write true or leave it out.", words[key])
    return StepDraft(
        name=_text(words, "name", where) or f"step {number}",
        inputs=_inputs(words.get("from", before), where),
        given=parse_yield(words["yield"], f"The yield of step {number}") if "yield" in sources else None,
        runs=tuple(runs),
        plan=words["plan"] if "plan" in sources else None,
        product=product,
        cost_per_mmol=_number(words, "cost_per_mmol", where),
        forgiven=tuple(FORGIVEN[key] for key in flagged),
    )


def _plan(words: Any, where: str) -> None:
    """Refuse what is no text or list of texts; which words a plan has is known where plans are read."""
    _table(words, where)
    for key, value in words.items():
        if not isinstance(value, str) and not (isinstance(value, list) and all(isinstance(v, str) for v in value)):
            raise InvalidRecord(
                f"{where}: {key} is {value!r}.", 'Write it as text, or as a list of texts: "60 C", ["DMF"].', value
            )


def _inputs(value: Any, where: str) -> tuple[Input, ...]:
    found = []
    for one in value if isinstance(value, list) else [value]:
        if isinstance(one, str) and one.strip():
            found.append(Input(name=one))
        elif isinstance(one, Mapping) and isinstance(one.get("name"), str) and set(one) <= {"name", "equiv"}:
            equiv = _number(one, "equiv", where)
            found.append(Input(name=one["name"], equiv=1.0 if equiv is None else equiv))
        else:
            raise InvalidRecord(f"{where}: from holds {one!r}.", 'Write "name" or { name = "...", equiv = 1.2 }.')
    return tuple(found)


def _materials(words: Any, steps: list[StepDraft]) -> tuple[Material, ...]:
    _table(words, "material")
    made = {step.name for step in steps}
    used = dict.fromkeys(one.name for step in steps for one in step.inputs if one.name not in made)
    found = []
    for name in dict.fromkeys([*used, *words]):
        table = words.get(name) or {}
        where = f"Material {name!r}"
        _table(table, where)
        _known(table, _MATERIAL, where)
        smiles = _text(table, "smiles", where)
        mass = _number(table, "molar_mass", where)
        if smiles:
            reckoned = _molar_mass(smiles, where)
            mass = mass if mass is not None else reckoned
        if mass == 0:
            raise InvalidRecord(f"{where}: molar_mass is 0.", "Give it in g/mol, or leave it out.", mass)
        if name not in used:
            raise InvalidRecord(f"{where} goes into no step.", f"Used are: {', '.join(used)}.", name)
        price = _number(table, "price_per_g", where)
        found.append(Material(name=name, smiles=smiles, molar_mass=mass, price_per_g=price))
    return tuple(found)


def _molar_mass(smiles: str, where: str) -> float:
    mass = molar_mass_of(smiles)
    if mass is None or mass <= 0:
        raise InvalidRecord(f"{where}: {smiles[:60]!r} is no structure.", "Check the SMILES.", smiles)
    return mass


def _target(value: Any, molar_mass: float | None) -> float | None:
    if value is None or value == "":
        return None
    if not isinstance(value, str):
        raise InvalidRecord(f"The target is {value!r}.", 'Write it with its unit: "2 g" or "5 mmol".', value)
    return parse_target(value, molar_mass)


def _table(value: Any, where: str) -> None:
    if not isinstance(value, Mapping):
        raise InvalidRecord(f"{where} is no table.", "See the example of `sidepath route --help`.", value)


def _known(words: Mapping[str, Any], known: set[str], where: str) -> None:
    for key in words:
        if key not in known:
            near = difflib.get_close_matches(str(key), known, n=1)
            meant = f"Did you mean {near[0]!r}? " if near else ""
            raise InvalidRecord(f"{where} has no {key!r}.", f"{meant}Known: {', '.join(sorted(known))}.", key)


def _text(words: Mapping[str, Any], key: str, where: str) -> str | None:
    value = words.get(key)
    if value is not None and not isinstance(value, str):
        raise InvalidRecord(f"{where}: {key} is {value!r}.", "Write it as text.", value)
    return value or None


def _number(words: Mapping[str, Any], key: str, where: str) -> float | None:
    value = words.get(key)
    if value is None:
        return None
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not 0 <= value < float("inf"):
        raise InvalidRecord(f"{where}: {key} is {value!r}.", "Write a number of zero or more.", value)
    return float(value)
