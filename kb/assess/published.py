"""The published estimate for a plan: structure and condition profile in, shares per fate with intervals out.

It owns the translation between what a scheme and a flask are called here and what the models of
`kb.physorg` ask for; the models own the chemistry. It refuses where the reading has no centre, where the
step is one that the tables do not cover (additions, losses of a protecting group), and wherever the model
refuses. `fates` are shares of everything after the time of the plan (a day where it gives none); `of_what_reacts`
leaves the starting material out, as published splits do.
"""

from __future__ import annotations

import contextlib
import dataclasses

from rdkit import Chem, rdBase

from kb.assess.published_centre import describe_centre
from kb.assess.published_closure import find_closure
from kb.assess.published_medium import medium_of
from kb.assess.published_sites import fastest_site
from kb.assess.published_words import PublishedEstimate, pace_words
from kb.chem.facts import Reading
from kb.errors import ChemistryError
from kb.materials.profile import ConditionProfile
from kb.physorg.closure import closure_refused
from kb.physorg.competition import Share, compete
from kb.physorg.conversion import DEFAULT_TIME_H
from kb.physorg.possible import possible_fates
from kb.physorg.step import StepFacts
from kb.physorg.stereo import expect_stereo
from kb.record.finding import Interval
from kb.vocabulary import CarbonClass, Confidence, Fate, LeavingGroup

__all__ = ["NOT_COVERED", "PublishedEstimate", "published_estimate", "step_facts"]

NOT_COVERED = frozenset({Fate.ADDITION, Fate.GROUP_LOSS})
_PALLADIUM = (
    "Palladium opens another way at an allylic or propargylic carbon, by a palladium complex; the published tables "
    "cover displacement without metal. No honest number."
)
_BASES_ONLY = frozenset({"carbonate_base", "bicarbonate"})
"""Not what attacks where the scheme says that the substrate does itself (common practice)."""


def published_estimate(
    reading: Reading, substrate_smiles: str, profile: ConditionProfile, base_smiles: str | None = None
) -> PublishedEstimate:
    """Return what published rates expect, or why they give no number.

    Args:
        reading: of the scheme; its principal centre is the one that competes.
        substrate_smiles: the component with that centre, atoms in the order in which they were entered;
            used only where `reading.scheme` cannot be split again.
        profile: of the conditions.
        base_smiles: the base where its structure is known, for its bulk; None = by class.
    """
    facts = step_facts(reading, substrate_smiles, profile, base_smiles)
    if isinstance(facts, str):
        return PublishedEstimate(note=facts)
    return _translate(facts, profile)


def step_facts(
    reading: Reading, substrate_smiles: str, profile: ConditionProfile, base_smiles: str | None = None
) -> StepFacts | str:
    """Return the step as the models ask for it, or a sentence that says why it cannot be put so."""
    centre = reading.centre
    if not reading.ok or centre is None:
        return "No reacting centre was read, so there are no published rates to ask."
    if _is_of_another_kind(reading) or centre.leaving_group is None or centre.leaving_atom is None:
        return "The published tables cover loss of a leaving group from carbon; this step is of another kind."
    mol = _fragment(reading, substrate_smiles)
    if mol is None:
        return "The structure of the substrate could not be matched with its reading. No honest number."
    described = describe_centre(mol, centre.atom, centre.leaving_atom, centre.carbon_class)
    is_activated = centre.leaving_group in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE)
    attacker = reading.nucleophile
    is_within = attacker is not None and attacker.component == centre.component
    named = (attacker.atom, attacker.nucleophile_class) if attacker is not None and is_within else None
    closure = None
    # What activates an alcohol meets an amine beside it first: then only the scheme can say that a ring closes.
    if named[0] < mol.GetNumAtoms() if named is not None else not is_activated:
        closure = find_closure(mol, centre.atom, centre.leaving_atom, profile.base_pkah, named)
    if closure is not None and closure.is_asked and (refused := closure_refused(closure)):
        return refused
    word = attacker.nucleophile_class if attacker is not None and not is_within else None
    if "palladium" in profile.reagent_classes and {"allylic", "propargylic"} & set(described.activations):
        return _PALLADIUM
    medium = medium_of(profile, word, is_activated, base_smiles)
    is_aside = attacker is not None and not is_within and reading.confidence is Confidence.MATCHED
    if closure is not None and is_aside and reading.fate is Fate.SUBSTITUTION:
        closure = dataclasses.replace(closure, is_aside=True)
    if closure is not None and closure.is_asked and medium.nucleophile in _BASES_ONLY:
        medium = dataclasses.replace(medium, nucleophile=None, nucleophile_n=None, nucleophile_molar=None)
    step = StepFacts(centre=described, leaving_group=centre.leaving_group, medium=medium, closure=closure)
    return fastest_site(mol, centre.leaving_atom, step) if reading.confidence is Confidence.INFERRED else step


def _is_of_another_kind(reading: Reading) -> bool:
    """Return True for additions and losses of a group; a bridgehead that was only guessed at is asked why not."""
    if reading.fate not in NOT_COVERED:
        return False
    is_only_guessed = reading.confidence is not Confidence.MATCHED
    centre = reading.centre
    return not (is_only_guessed and centre is not None and centre.carbon_class is CarbonClass.BRIDGEHEAD)


def _fragment(reading: Reading, substrate_smiles: str) -> Chem.Mol | None:
    """Return the component with the centre, in the atom order that the reading counts in."""
    from kb.chem.scheme import parse_scheme

    centre = reading.centre
    if centre is None:
        return None
    texts = []
    with contextlib.suppress(ChemistryError, IndexError):
        texts.append(parse_scheme(reading.scheme).left[centre.component].smiles_as_entered)
    texts.append(substrate_smiles)
    for text in texts:
        with rdBase.BlockLogs():
            mol = Chem.MolFromSmiles(text) if text else None
        if mol is None or centre.leaving_atom is None:
            continue
        count = mol.GetNumAtoms()
        if centre.atom < count and centre.leaving_atom < count:
            is_carbon = mol.GetAtomWithIdx(centre.atom).GetAtomicNum() == 6
            if is_carbon and mol.GetBondBetweenAtoms(centre.atom, centre.leaving_atom) is not None:
                return mol
    return None


def _translate(facts: StepFacts, profile: ConditionProfile) -> PublishedEstimate:
    result = compete(facts, profile.time_h or DEFAULT_TIME_H)
    possible = possible_fates(facts)
    if not result.fates:
        return PublishedEstimate(note=result.no_number, step=facts, possible=possible)
    half_life = result.half_life_h
    of_what_reacts = tuple((fate, _interval(share)) for fate, share in result.fates)
    return PublishedEstimate(
        fates=tuple((fate, _interval(share)) for fate, share in result.fates_after) or of_what_reacts,
        of_what_reacts=of_what_reacts,
        possible=possible,
        channels=result.channels,
        alkenes=result.alkenes,
        stereo=expect_stereo(facts, result) if facts.centre.is_stereocentre else None,
        half_life_h=Interval(mean=half_life.mean, low=half_life.low, high=half_life.high) if half_life else None,
        note=" ".join((*result.notes, pace_words(result, profile))),
        sources=result.sources,
        step=facts,
    )


def _interval(share: Share) -> Interval:
    return Interval(mean=round(share.mean, 4), low=round(share.low, 4), high=round(share.high, 4))
