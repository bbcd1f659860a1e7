"""Bit planes against plain numpy: whatever order rows come in, each plane says which rows have its bit."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

from kb.search.planes import (
    BLOCK_ROWS,
    BitPlanes,
    count_planes,
    counts_of,
    popcounts,
    rows_of,
    transpose_bits,
    words_of,
)


def some_rows(n: int, n_bits: int, seed: int = 0) -> np.ndarray:
    return np.random.default_rng(seed).integers(0, 256, (n, n_bits // 8), dtype=np.uint8)


def as_bits(rows: np.ndarray) -> np.ndarray:
    return np.unpackbits(rows, axis=1, bitorder="little").astype(bool)


@given(cuts=st.lists(st.integers(0, 9000), max_size=6), n=st.integers(0, 9000))
@hypothesis_settings(max_examples=25)
def test_rows_added_in_any_pieces_give_the_same_planes(cuts: list[int], n: int) -> None:
    rows = some_rows(n, 128)
    planes = BitPlanes(128)
    edges = sorted({0, n, *(c for c in cuts if c < n)})
    for start, end in itertools.pairwise(edges):
        planes.append(rows[start:end].tobytes())
    bits = as_bits(rows)
    assert planes.n_rows == n
    for bit in (0, 1, 63, 64, 127):
        assert rows_of(planes.plane(bit), n).tolist() == np.flatnonzero(bits[:, bit]).tolist()


@pytest.mark.parametrize("n", [1, BLOCK_ROWS - 1, BLOCK_ROWS, BLOCK_ROWS + 1, 3 * BLOCK_ROWS + 5])
def test_a_row_comes_back_as_it_went_in(n: int) -> None:
    rows = some_rows(n, 256)
    planes = BitPlanes(256, reserve=2 * BLOCK_ROWS)
    planes.append(rows.tobytes())
    for number in {0, n // 2, n - 1}:
        assert planes.row(number) == rows[number].tobytes()


@pytest.mark.parametrize("density", [0.0, 0.0005, 0.3, 1.0])
def test_masks_and_words_are_each_other_s_inverse(density: float) -> None:
    mask = np.random.default_rng(3).random(10_000) < density
    assert rows_of(words_of(mask), len(mask)).tolist() == np.flatnonzero(mask).tolist()


def test_bits_beyond_the_last_row_are_not_reported() -> None:
    planes = BitPlanes(64)
    planes.append(some_rows(100, 64).tobytes())
    everything = np.full(planes.n_words, ~np.uint64(0))
    assert rows_of(everything, 100).tolist() == list(range(100))


def test_transposing_moves_bit_b_of_word_p_to_bit_p_of_word_b() -> None:
    x = np.random.default_rng(5).integers(0, 2**63, (2, 64, 3), dtype=np.uint64)
    want = np.unpackbits(x.view(np.uint8).reshape(2, 64, 3, 8), axis=-1, bitorder="little").transpose(0, 3, 2, 1)
    transpose_bits(x)
    got = np.unpackbits(x.view(np.uint8).reshape(2, 64, 3, 8), axis=-1, bitorder="little").transpose(0, 1, 2, 3)
    assert (got == want).all()


@given(bits=st.lists(st.integers(0, 511), max_size=300))
@hypothesis_settings(max_examples=25)
def test_planes_add_up_to_counts_by_row(bits: list[int]) -> None:
    rows = some_rows(5000, 512)
    planes = BitPlanes(512)
    planes.append(rows.tobytes())
    got = counts_of(count_planes([planes.plane(b) for b in bits]), 5000)
    assert (got == as_bits(rows)[:, bits].sum(axis=1)).all()


def test_popcounts_count_the_bits_of_each_row(monkeypatch: pytest.MonkeyPatch) -> None:
    rows = some_rows(50, 2048)
    want = as_bits(rows).sum(axis=1).tolist()
    assert popcounts(rows.tobytes(), 256).tolist() == want
    monkeypatch.delattr(np, "bitwise_count", raising=False)  # numpy before 2.0
    assert popcounts(rows.tobytes(), 256).tolist() == want
