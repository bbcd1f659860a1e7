"""The condition profile of a set of conditions: which classes are in the flask, and what they amount to.

First version: the words only; `profile_of` follows.
"""

from __future__ import annotations

from kb.materials.class_names import OXIDANT_CLASSES, REAGENT_CLASSES, SOLVENT_CLASSES, add_wider

__all__ = ["OXIDANT_CLASSES", "REAGENT_CLASSES", "SOLVENT_CLASSES", "add_wider"]
