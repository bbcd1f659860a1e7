"""Products of losing one labile group that acid, base or fluoride takes off."""

from __future__ import annotations

from collections.abc import Iterator

from kb.chem.centre import LeavingSite
from kb.chem.facts import PossibleFate
from kb.chem.labile import LabileGroup, comes_off, find_labile_groups
from kb.chem.molgraph import Molgraph
from kb.chem.promoters import Promoters
from kb.chem.sketch import Sketch
from kb.vocabulary import Fate


def iter_losses(
    graph: Molgraph, promoters: Promoters, besides: LeavingSite | None = None
) -> Iterator[PossibleFate]:
    """Yield the molecule without each labile group that what is in the flask could take off.

    Args:
        graph: the substrate.
        promoters: what is in the flask.
        besides: the leaving group at the principal centre, which is no protecting group; None = none.
    """
    for group in find_labile_groups(graph):
        if besides is not None and (group.carbon, group.leaving) == (besides.centre, besides.leaving):
            continue
        if not comes_off(group, promoters):
            continue
        drawn = draw_loss(graph, group)
        if drawn is not None:
            by = {"acid": "acid", "base": "base", "silyl": "acid or fluoride"}.get(group.promoter, "strong acid")
            yield PossibleFate(fate=Fate.GROUP_LOSS, product=drawn, note=f"loss of {group.name} by {by}")


def draw_loss(graph: Molgraph, group: LabileGroup) -> str | None:
    """Return what remains after a labile group came off, or None when it cannot be drawn."""
    sketch = Sketch([graph])
    for loss in group.losses:
        sketch.cut(loss.kept, loss.gone)
    if any(loss.gain < 0 for loss in group.losses):
        # An acetal: the oxygen that stays becomes the carbonyl oxygen of the carbon that lost the other.
        carbon = next(loss.kept for loss in group.losses if loss.gain < 0)
        oxygen = next(loss.kept for loss in group.losses if loss.gain > 0)
        sketch.make_double(carbon, oxygen)
    else:
        for loss in group.losses:
            sketch.cap(loss.kept)
    return sketch.finish(group.losses[0].kept)
