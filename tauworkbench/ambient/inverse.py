r"""The band of the inverse of a banded matrix, from its Cholesky factor, exactly.

Takahashi's recursion goes from the last column to the first and needs only the corner S of the
inverse just behind: with v the scaled column of L below its diagonal,

.. math:: S \leftarrow T S T' + e_1 e_1' / l^2, \qquad T = \begin{pmatrix} -v' \\ I \; 0
          \end{pmatrix}.

One column at a time that is slow in an interpreted language, so the columns are cut into blocks
that are worked on side by side: over a block S depends on the corner E behind it as
:math:`D + R' E R`. A first pass finds D and R of all blocks, a short loop hands the corner from
block to block, a second pass fills in the band.
"""

from __future__ import annotations

import numpy as np

from ..records import FloatArray

__all__ = ["inverse_band"]

_LONGEST_BLOCK, _SHORTEST_BLOCK = 256, 16


def inverse_band(factor: FloatArray) -> FloatArray:
    """Return the band of (L L')^-1, lower form, from the band of L.

    Parameters
    ----------
    factor : ndarray, shape (width + 1, n)
        Lower form: row d holds L[j + d, j].
    """
    width, n = factor.shape[0] - 1, factor.shape[1]
    if width == 0:
        return np.asarray(factor**-2.0)
    length = min(max(int(np.sqrt(n)), _SHORTEST_BLOCK), _LONGEST_BLOCK)
    blocks = -(-n // length)
    padded = np.zeros((width + 1, blocks * length))
    padded[:, :n] = factor
    padded[0, n:] = 1.0
    for d in range(1, width + 1):  # what stands beyond the matrix's end is anybody's
        padded[d, max(n - d, 0) : n] = 0.0
    # Column c of every block lies together.
    columns = np.ascontiguousarray(padded.reshape(width + 1, blocks, length).transpose(2, 0, 1))
    below = -columns[:, 1:] / columns[:, :1]
    own = columns[:, 0] ** -2.0
    corner = _corners(below, own)
    # The band takes the factor's place, column by column.
    for c in range(length - 1, -1, -1):
        side = np.einsum("abn,bn->an", corner, below[c])
        corner = _moved(corner, side, below[c], own[c])
        columns[c, 0] = corner[0, 0]
        columns[c, 1:] = side
    return np.ascontiguousarray(columns.transpose(1, 2, 0)).reshape(width + 1, -1)[:, :n]


def _moved(corner: FloatArray, side: FloatArray, below: FloatArray, own: FloatArray) -> FloatArray:
    """One column further: T S T' + e1 e1' / l^2 of all blocks; shape (width, width, blocks)."""
    new = np.empty_like(corner)
    new[0, 0] = own + np.einsum("an,an->n", side, below)
    new[1:, 0] = new[0, 1:] = side[:-1]
    new[1:, 1:] = corner[:-1, :-1]
    return new


def _corners(below: FloatArray, own: FloatArray) -> FloatArray:
    """Corner of the inverse just behind each block; shape (width, width, blocks)."""
    length, width, blocks = below.shape
    inner = np.zeros((width, width, blocks))
    reach = np.zeros((width, width, blocks))
    reach[np.arange(width), np.arange(width)] = 1.0
    for c in range(length - 1, -1, -1):
        side = np.einsum("abn,bn->an", inner, below[c])
        inner = _moved(inner, side, below[c], own[c])
        first = np.einsum("bn,bkn->kn", below[c], reach)
        reach[1:] = reach[:-1].copy()
        reach[0] = first
    inner, reach = inner.transpose(2, 0, 1).copy(), reach.transpose(2, 0, 1).copy()
    out = np.zeros((blocks, width, width))
    for i in range(blocks - 2, -1, -1):
        after = reach[i + 1]
        out[i] = inner[i + 1] + after @ out[i + 1] @ after.T
    return np.ascontiguousarray(out.transpose(1, 2, 0))
