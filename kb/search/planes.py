"""Bit planes: packed fingerprints of many structures, stored bit by bit instead of structure by structure.

A query asks for some dozens of bits. Stored by structure, every structure's words would have to be read;
stored by bit, one plane of n/64 words answers one bit for all structures, so a query reads only what it
asks for.

Layout. Row r (structures in the order they came) lies in block r // 4096; within the block, row 64 * p + g
is bit p of word g. That order is not the obvious one, and is chosen so that turning rows into planes is a
64 x 64 bit transposition over contiguous words, which numpy does at memory speed. `rows_of` and `words_of`
are the only places that translate. Bits beyond the last row are always zero.

Source of the transposition: recursive block exchange, the standard method for bit matrices (Knuth, The Art of
Computer Programming 4A, 7.1.3).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterable

    from numpy.typing import NDArray

BLOCK_ROWS = 4096
BLOCK_WORDS = 64
_GROWTH = 1.5
"""Factor by which planes grow; pages that no row has touched yet are not in memory."""
_BLOCKS_AT_ONCE = 4
"""Blocks turned into planes together: they stay in the processor's cache."""
_WORDS_IN_CACHE = 2**16
"""Words transposed together, half a MB: all stages find them in the cache, which takes half the time (measured)."""
_STAGES = (
    (32, np.uint64(0x00000000FFFFFFFF)),
    (16, np.uint64(0x0000FFFF0000FFFF)),
    (8, np.uint64(0x00FF00FF00FF00FF)),
    (4, np.uint64(0x0F0F0F0F0F0F0F0F)),
    (2, np.uint64(0x3333333333333333)),
    (1, np.uint64(0x5555555555555555)),
)


class BitPlanes:
    """Fingerprints of one kind, by bit.

    Args:
        n_bits: width of a fingerprint, a multiple of 64.
        reserve: rows to make room for at once; more may be added.
    """

    def __init__(self, n_bits: int, reserve: int = 0) -> None:
        self.n_bits = n_bits
        self.n_rows = 0
        self._row_words = n_bits // 64
        blocks = -(-reserve // BLOCK_ROWS)
        self._planes = np.zeros((n_bits, blocks * BLOCK_WORDS), np.uint64)
        self._tail = np.zeros((BLOCK_ROWS, self._row_words), np.uint64)
        self._is_open = False

    def __getstate__(self) -> dict[str, Any]:
        """Return what to keep: the planes in use, without the room to grow."""
        if self._is_open:
            self._close_block(self.n_rows // BLOCK_ROWS)
        return self.__dict__ | {
            "_planes": self._planes[:, : self.n_words].copy(),
            "_tail": self._tail[: self.n_rows % BLOCK_ROWS].copy(),
        }

    def __setstate__(self, state: dict[str, Any]) -> None:
        """Take up what was kept; rows may be added as before."""
        self.__dict__.update(state)
        self._tail = np.zeros((BLOCK_ROWS, self._row_words), np.uint64)
        self._tail[: len(state["_tail"])] = state["_tail"]

    @property
    def n_words(self) -> int:
        """Return how many words of a plane are in use."""
        return -(-self.n_rows // BLOCK_ROWS) * BLOCK_WORDS

    @property
    def nbytes(self) -> int:
        """Return the bytes in use, room to grow left out."""
        return self.n_bits * self.n_words * 8 + self._tail.nbytes

    def plane(self, bit: int) -> NDArray[np.uint64]:
        """Return one bit of every row (n_words,) uint64, a view."""
        if self._is_open:
            self._close_block(self.n_rows // BLOCK_ROWS)
        return self._planes[bit, : self.n_words]

    def all_of(self, bits: Iterable[int]) -> NDArray[np.uint64]:
        """Return the rows that have all of some bits, as words (n_words,)."""
        words = np.full(self.n_words, ~np.uint64(0))
        for bit in bits:
            words &= self.plane(int(bit))
        return words

    def append(self, packed: bytes) -> None:
        """Add rows; a block is turned into planes when it is full, or when somebody asks.

        Args:
            packed: fingerprints one behind the other, n_bits / 8 bytes each.
        """
        rows = np.frombuffer(packed, "<u8").reshape(-1, self._row_words)
        self._make_room(self.n_rows + len(rows))
        while len(rows):
            at = self.n_rows % BLOCK_ROWS
            if at == 0 and len(rows) >= BLOCK_ROWS:
                taken = min(len(rows) // BLOCK_ROWS, _BLOCKS_AT_ONCE) * BLOCK_ROWS
                blocks = rows[:taken].reshape(-1, BLOCK_ROWS, self._row_words)
                self._set_blocks(self.n_rows // BLOCK_ROWS, blocks)
            else:
                taken = min(len(rows), BLOCK_ROWS - at)
                self._tail[at : at + taken] = rows[:taken]
                self._is_open = True
                if at + taken == BLOCK_ROWS:
                    self._close_block(self.n_rows // BLOCK_ROWS)
                    self._tail[:] = 0
            self.n_rows += taken
            rows = rows[taken:]

    def row(self, number: int) -> bytes:
        """Return the fingerprint of one row, packed as it came."""
        if self._is_open:
            self._close_block(self.n_rows // BLOCK_ROWS)
        word, bit = _place(number)
        bits = self._planes[:, word] >> np.uint64(bit) & np.uint64(1)
        return np.packbits(bits.astype(np.uint8), bitorder="little").tobytes()

    def _close_block(self, block: int) -> None:
        """Turn the rows at the end, which may not fill their block yet, into planes."""
        self._set_blocks(block, self._tail[None])
        self._is_open = False

    def _make_room(self, n_rows: int) -> None:
        needed = -(-n_rows // BLOCK_ROWS) * BLOCK_WORDS
        have = self._planes.shape[1]
        if needed > have:
            room = max(needed, int(have * _GROWTH) // BLOCK_WORDS * BLOCK_WORDS)
            planes = np.zeros((self.n_bits, room), np.uint64)
            planes[:, : self.n_words] = self._planes[:, : self.n_words]
            self._planes = planes

    def _set_blocks(self, block: int, rows: NDArray[np.uint64]) -> None:
        """Turn whole blocks of rows (blocks, 4096, row words) into planes, from this block on."""
        blocks = len(rows)
        x = np.ascontiguousarray(
            rows.reshape(blocks, 64, BLOCK_WORDS, self._row_words).transpose(3, 1, 0, 2)
        ).reshape(self._row_words, 64, blocks * BLOCK_WORDS)
        transpose_bits(x)
        first = block * BLOCK_WORDS
        self._planes[:, first : first + blocks * BLOCK_WORDS] = x.reshape(self.n_bits, -1)


def transpose_bits(x: NDArray[np.uint64]) -> None:
    """Transpose 64 x 64 bit matrices in place: bit b of word p becomes bit p of word b.

    Args:
        x: (any, 64, width) uint64, contiguous; one matrix per position of the first and last axis.
    """
    outer, _, width = x.shape
    at_once = max(1, _WORDS_IN_CACHE // (64 * width))
    if outer > at_once:
        for start in range(0, outer, at_once):
            transpose_bits(x[start : start + at_once])
        return
    for distance, mask in _STAGES:
        halves = x.reshape(outer, 64 // (2 * distance), 2, distance, width)
        low, high = halves[:, :, 0], halves[:, :, 1]
        shift = np.uint64(distance)
        swap = low >> shift
        swap ^= high
        swap &= mask
        high ^= swap
        swap <<= shift
        low ^= swap


def rows_of(words: NDArray[np.uint64], n_rows: int) -> NDArray[np.int64]:
    """Return the rows whose bit is set, ascending (k,) int64.

    Args:
        words: one plane, or planes joined.
        n_rows: rows in all; set bits beyond are not reported.
    """
    used = np.flatnonzero(words)
    if len(used) * 8 < len(words):
        word, bit = np.nonzero(_unpacked(words[used]))
        word = used[word]
        rows = word // BLOCK_WORDS * BLOCK_ROWS + bit * 64 + word % BLOCK_WORDS
        rows.sort()
    else:
        by_block = _unpacked(words).reshape(-1, BLOCK_WORDS, 64).transpose(0, 2, 1)
        rows = np.flatnonzero(by_block)
    return rows[: np.searchsorted(rows, n_rows)]


def words_of(mask: NDArray[np.bool_]) -> NDArray[np.uint64]:
    """Return a row mask (n,) as words of a plane, whole blocks."""
    blocks = -(-len(mask) // BLOCK_ROWS)
    padded = np.zeros(blocks * BLOCK_ROWS, np.uint8)
    padded[: len(mask)] = mask
    by_word = np.ascontiguousarray(padded.reshape(blocks, 64, BLOCK_WORDS).transpose(0, 2, 1))
    return np.packbits(by_word.reshape(-1), bitorder="little").view("<u8")


def count_planes(planes: list[NDArray[np.uint64]]) -> list[NDArray[np.uint64]]:
    """Add up planes: how many of them are set in each row, as binary digits, lowest first.

    Three planes of one weight become one of that weight and one of twice it (a full adder), until each weight
    has one plane left; that is five operations for 64 structures where counting bits one by one takes many.
    """
    digits: list[NDArray[np.uint64]] = []
    weight = list(planes)
    while weight:
        carried: list[NDArray[np.uint64]] = []
        while len(weight) > 2:
            a, b, c = weight.pop(), weight.pop(), weight.pop()
            half = a ^ b
            carried.append((a & b) | (half & c))
            weight.append(half ^ c)
        if len(weight) == 2:
            a, b = weight
            carried.append(a & b)
            weight = [a ^ b]
        digits.append(weight[0])
        weight = carried
    return digits


def counts_of(digits: list[NDArray[np.uint64]], n_rows: int) -> NDArray[np.uint16]:
    """Return counts by row (n_rows,) from the binary digits that `count_planes` gave."""
    if not digits:
        return np.zeros(n_rows, np.uint16)
    small = np.uint8 if len(digits) <= 8 else np.uint16
    counts = np.zeros(len(digits[0]) * 64, small)
    for place, digit in enumerate(digits):
        counts += _unpacked(digit).reshape(-1) * small(1 << place)  # type: ignore[misc]
    return counts.reshape(-1, BLOCK_WORDS, 64).transpose(0, 2, 1).reshape(-1)[:n_rows].astype(np.uint16)


def popcounts(packed: bytes, n_bytes: int) -> NDArray[np.uint16]:
    """Return how many bits each fingerprint of n_bytes bytes has set (n,) uint16."""
    rows = np.frombuffer(packed, np.uint8).reshape(-1, n_bytes)
    if hasattr(np, "bitwise_count"):
        wide = rows.view("<u8") if n_bytes % 8 == 0 else rows
        return np.bitwise_count(wide).sum(axis=1, dtype=np.uint16)
    return _BYTE_COUNTS[rows].sum(axis=1, dtype=np.uint16)


_BYTE_COUNTS = np.array([number.bit_count() for number in range(256)], np.uint8)


def _unpacked(words: NDArray[np.uint64]) -> NDArray[np.uint8]:
    """Return the bits of words as 0 and 1 (n, 64), lowest bit first."""
    return np.unpackbits(words.view(np.uint8), bitorder="little").reshape(-1, 64)


def _place(row: int) -> tuple[int, int]:
    """Return (word, bit) of a row."""
    block, within = divmod(row, BLOCK_ROWS)
    bit, group = divmod(within, 64)
    return block * BLOCK_WORDS + group, bit
