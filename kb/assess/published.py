"""The published estimate for a plan: structure and condition profile in, shares per fate with intervals out.

It owns the translation between what a scheme and a flask are called here and what the models of
`kb.physorg` ask for; the models own the chemistry. It refuses where the reading has no centre, where the
step is one that the tables do not cover (additions, losses of a protecting group), and wherever the model
refuses. Shares are of what reacts.
"""

from __future__ import annotations

import contextlib
from dataclasses import dataclass

from rdkit import Chem, rdBase

from kb.assess.published_centre import describe_centre
from kb.assess.published_medium import medium_of
from kb.assess.published_sites import fastest_site
from kb.chem.facts import Reading
from kb.errors import ChemistryError
from kb.materials.profile import ConditionProfile
from kb.physorg.competition import AlkeneShare, Channel, Competition, Share, compete
from kb.physorg.step import StepFacts
from kb.physorg.stereo import StereoOutcome, expect_stereo
from kb.record.finding import Interval
from kb.vocabulary import CarbonClass, Confidence, Fate, LeavingGroup

NOT_COVERED = frozenset({Fate.ADDITION, Fate.GROUP_LOSS})


@dataclass(frozen=True, slots=True, kw_only=True)
class PublishedEstimate:
    """What published chemistry expects of a plan.

    Attributes:
        fates: shares 0..1 with 80 % intervals, largest first; empty = no honest number.
        channels: what made them, largest share first; each lists its terms and sources.
        alkenes: each alkene's share of all that reacts and of the alkenes.
        stereo: what becomes of a drawn centre; None = no centre drawn, or no number.
        half_life_h: to about a factor of ten, at 1 M of reagent [h]; None without a number.
        note: plain words: what it rests on, or why there is no number.
        sources: in order of appearance.
        step: the step as the models were asked; None where it could not be put so.
    """

    fates: tuple[tuple[Fate, Interval], ...] = ()
    channels: tuple[Channel, ...] = ()
    alkenes: tuple[AlkeneShare, ...] = ()
    stereo: StereoOutcome | None = None
    half_life_h: Interval | None = None
    note: str = ""
    sources: tuple[str, ...] = ()
    step: StepFacts | None = None


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
    return _translate(compete(facts), facts)


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
    nucleophile = reading.nucleophile.nucleophile_class if reading.nucleophile else None
    medium = medium_of(profile, nucleophile, is_activated, base_smiles)
    step = StepFacts(centre=described, leaving_group=centre.leaving_group, medium=medium)
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


def _translate(result: Competition, facts: StepFacts) -> PublishedEstimate:
    if not result.fates:
        return PublishedEstimate(note=result.no_number, step=facts)
    half_life = result.half_life_h
    return PublishedEstimate(
        fates=tuple((fate, _interval(share)) for fate, share in result.fates),
        channels=result.channels,
        alkenes=result.alkenes,
        stereo=expect_stereo(facts, result) if facts.centre.is_stereocentre else None,
        half_life_h=Interval(mean=half_life.mean, low=half_life.low, high=half_life.high) if half_life else None,
        note=" ".join(result.notes),
        sources=result.sources,
        step=facts,
    )


def _interval(share: Share) -> Interval:
    return Interval(mean=round(share.mean, 4), low=round(share.low, 4), high=round(share.high, 4))
