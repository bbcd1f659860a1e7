"""Room in a 2D layout: measures how close strangers come, and pushes them apart.

Pure geometry on arrays, no RDKit. Two layout engines still lay bridged cages (bornanes, morphinans) with an
atom on a strange bond, which no scale can make legible; a few steps of springs and repulsion give up equal
bond lengths to win room. Deterministic: no random numbers. Lengths in bond lengths of the median bond.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

Array = Any
"""NumPy array; shapes are given where it is used."""

STRANGER = 0.95
"""Unbonded atoms are pushed to this distance [bond lengths]; judged by eye."""

OFF_BOND = 0.55
"""Atoms are pushed this far off bonds that are not theirs [bond lengths]; judged by eye."""

_STEPS = 50


def measure_room(points: Array, ends: Array) -> float:
    """Return the smallest distance of unbonded atoms and of atoms from strange bonds [median bond lengths].

    Args:
        points: places (n, 2) float, any unit.
        ends: bonds (m, 2) int.

    Returns:
        Infinity for a single atom.
    """
    if len(points) < 2:
        return math.inf
    unit = median_bond(points, ends)
    nearest = float(_strangers(points, ends).min())
    if len(ends):
        nearest = min(nearest, float(_off_bonds(points, ends)[0].min()))
    return nearest / unit


def median_bond(points: Array, ends: Array) -> float:
    """Return the median bond length, 1.5 (RDKit's) where there are no bonds."""
    if not len(ends):
        return 1.5
    return float(np.median(np.linalg.norm(points[ends[:, 0]] - points[ends[:, 1]], axis=1)))


def make_room(points: Array, ends: Array) -> Array:
    """Return places pushed apart, shape and unit as given; bonds stretch and shrink a little to allow it."""
    unit = median_bond(points, ends)
    spots = points / unit
    first, second = ends[:, 0], ends[:, 1]
    for step in range(_STEPS):
        push = np.zeros_like(spots)
        along = spots[second] - spots[first]
        length = np.maximum(np.linalg.norm(along, axis=1), 1e-6)
        pull = (0.35 * (length - 1.0) / length)[:, None] * along
        np.add.at(push, first, pull)
        np.add.at(push, second, -pull)
        distance = _strangers(spots, ends)
        close = np.maximum(STRANGER - distance, 0.0)
        offset = spots[:, None] - spots[None, :]
        push += ((0.25 * close / np.maximum(distance, 1e-3))[..., None] * offset).sum(axis=1)
        away, foot = _off_bonds(spots, ends)
        short = np.where(np.isfinite(away), np.maximum(OFF_BOND - away, 0.0), 0.0)
        atoms, bonds = np.nonzero(short)
        if len(atoms):
            direction = spots[atoms] - foot[atoms, bonds]
            size = np.linalg.norm(direction, axis=1)
            normal = np.stack([along[bonds, 1], -along[bonds, 0]], axis=1) / length[bonds][:, None]
            direction = np.where(size[:, None] > 1e-3, direction / np.maximum(size, 1e-3)[:, None], normal)
            shove = 0.3 * short[atoms, bonds][:, None] * direction
            np.add.at(push, atoms, shove)
            np.add.at(push, first[bonds], -0.5 * shove)
            np.add.at(push, second[bonds], -0.5 * shove)
        spots = spots + push * (1.0 - 0.5 * step / _STEPS)
    return spots * unit


def _strangers(points: Array, ends: Array) -> Array:
    """Return distances (n, n) of atoms, infinity for bonded pairs and for an atom with itself."""
    distance = np.linalg.norm(points[:, None] - points[None, :], axis=2)
    np.fill_diagonal(distance, math.inf)
    if len(ends):
        distance[ends[:, 0], ends[:, 1]] = math.inf
        distance[ends[:, 1], ends[:, 0]] = math.inf
    return distance


def _off_bonds(points: Array, ends: Array) -> tuple[Array, Array]:
    """Return distances (n, m) of atoms from bonds, infinity for its own atoms, and the feet (n, m, 2)."""
    start, along = points[ends[:, 0]], points[ends[:, 1]] - points[ends[:, 0]]
    square = np.maximum((along**2).sum(axis=1), 1e-9)
    share = ((points[:, None] - start[None]) * along[None]).sum(axis=2) / square
    foot = start[None] + np.clip(share, 0, 1)[..., None] * along[None]
    away = np.linalg.norm(points[:, None] - foot, axis=2)
    rows = np.arange(len(ends))
    away[ends[:, 0], rows] = math.inf
    away[ends[:, 1], rows] = math.inf
    return away, foot
