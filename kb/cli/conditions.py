"""The condition flags that `check` and `record` share, turned into Conditions.

It owns the flags' names and help; reading the values is `kb.quantity` and `kb.materials`.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Annotated, Optional

import typer

if TYPE_CHECKING:
    from kb.record.conditions import Conditions

Names = Optional[list[str]]  # noqa: UP045 - typer reads the annotation at run time
Text = Optional[str]  # noqa: UP045

WithFlag = Annotated[Names, typer.Option("--with", metavar="NAME[=EQUIV]", help="Nucleophile or reagent; repeatable.")]
BaseFlag = Annotated[Names, typer.Option("--base", metavar="NAME[=EQUIV]", help="Base; repeatable.")]
AcidFlag = Annotated[Names, typer.Option("--acid", metavar="NAME[=EQUIV]", help="Acid or Lewis acid; repeatable.")]
AddFlag = Annotated[Names, typer.Option("--add", metavar="NAME[=EQUIV]", help="Additive or catalyst; repeatable.")]
SolventFlag = Annotated[Names, typer.Option("--solvent", metavar="NAME[:PARTS]", help="Solvent; repeatable.")]
TempFlag = Annotated[Text, typer.Option("--temp", metavar="T", help="60C, 333 K, rt, reflux, '0C to rt'.")]
TimeFlag = Annotated[Text, typer.Option("--time", metavar="T", help="4 h, 30 min, overnight.")]
ConcFlag = Annotated[Text, typer.Option("--conc", metavar="C", help="0.2 M.")]
ScaleFlag = Annotated[Text, typer.Option("--scale", metavar="N", help="5 mmol.")]
AtmosphereFlag = Annotated[Text, typer.Option("--atmosphere", metavar="WORD", help="N2, air.")]


def parse_conditions(
    reagents: Sequence[str] | None,
    bases: Sequence[str] | None,
    acids: Sequence[str] | None,
    additives: Sequence[str] | None,
    solvents: Sequence[str] | None,
    temperature: str | None,
    time: str | None,
    concentration: str | None,
    scale: str | None,
    atmosphere: str | None,
) -> Conditions:
    """Read the flags.

    Raises:
        QuantityError: a value that cannot be read.
        NameUnknown: a name that is neither in the catalogue nor a SMILES.
    """
    from kb.book.plan_words import conditions_from_words

    return conditions_from_words(
        {
            "reagents": reagents,
            "bases": bases,
            "acids": acids,
            "additives": additives,
            "solvents": solvents,
            "temperature": temperature,
            "time": time,
            "concentration": concentration,
            "scale": scale,
            "atmosphere": atmosphere,
        }
    )
