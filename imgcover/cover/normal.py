"""The normal equations of a fit in which every pore has unknowns of its own, and all share some."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.openings import FAR, LOCAL, ROWS, Expected
from imgcover.cover.places import Places

Floats = NDArray[np.float64]

CONJUGATES, CLOSE, ROUGH = 40, 1e-6, 1e-4
"""Conjugate gradient steps at most, and the remaining error (squared) at which they may stop; the
last where nothing shared is told by it."""


ATOMS = (
    *(("first", "light"), ("second", "light"), ("light", "first"), ("light", "second")),
    *(("first", "offset"), ("second", "offset"), ("offset", "first"), ("offset", "second")),
    *(("first dense", "light"), ("second dense", "light")),
    *(("light", "first dense"), ("light", "second dense")),
    *(("far first", "light"), ("far second", "light")),
    *(("light", "far first"), ("light", "far second")),
    ("light", "light"),
    *(("blur", "light"), ("light", "blur")),
    *(("first dense", "light"), ("second dense", "light")),
    *(("light", "first dense"), ("light", "second dense")),
    *(("roundness", "light"), ("light", "roundness")),
    ("even", "even"),
)
"""Every derivative of a patch is a profile across times a profile down, or a sum of two such:
these products, in the order of `openings.LOCAL`, `FAR`, the light, and `openings.SHARED`."""
MEMBERS = (*range(LOCAL + FAR + 1), 17, 17, 18, 18, 19, 19, 20, 20, 21)
"""The unknown that each of `ATOMS` belongs to."""


@dataclass(frozen=True, slots=True, eq=False)
class Products:
    """Products of the derivatives with each other and with what is left over, patch by patch.

    Parameters
    ----------
    gram : ndarray, shape (n, 22, 22)
        Unknowns: 12 own, 4 far, the light, 5 shared.
    toward : ndarray, shape (n, 22)
    """

    gram: Floats
    toward: Floats


def multiply(expected: Expected, off: NDArray[np.float32], counts: NDArray[np.bool_]) -> Products:
    """Multiply the derivatives of all patches.

    Parameters
    ----------
    expected : Expected
    off : ndarray, shape (n, height, width)
        Light less expected light; 0 where nothing is to be learnt.
    counts : ndarray, shape (n, height, width), bool
        Pixels that something is learnt from.

    Notes
    -----
    Derivatives are taken for straight edges. Where edges lean the products are a little off,
    which slows the steps but hardly moves where they end.
    """
    x_rows = [ROWS.index(x) for x, _ in ATOMS]
    y_rows = [ROWS.index(y) for _, y in ATOMS]
    across = np.asarray(counts.any(axis=1), np.bool_)
    down = np.asarray(counts.any(axis=2), np.bool_)
    seen_x, seen_y = expected.across * across[:, None], expected.down * down[:, None]
    toward = (seen_y @ off @ seen_x.transpose(0, 2, 1))[:, y_rows, x_rows]
    if np.array_equal(counts, down[:, :, None] & across[:, None, :]):
        # Products of profiles need no pixel: sums along x times sums along y.
        by_x = seen_x @ seen_x.transpose(0, 2, 1)
        by_y = seen_y @ seen_y.transpose(0, 2, 1)
        gram = by_x[:, x_rows][:, :, x_rows] * by_y[:, y_rows][:, :, y_rows]
    else:
        atoms = seen_y[:, y_rows, :, None] * seen_x[:, x_rows, None, :] * counts[:, None]
        atoms = atoms.reshape(len(off), len(ATOMS), -1)
        gram = atoms @ atoms.transpose(0, 2, 1)
    scale = np.repeat(expected.bare[:, None], len(ATOMS), axis=1)
    scale[:, -1] = 1  # glare is not light that came through
    member = np.zeros((len(ATOMS), MEMBERS[-1] + 1), np.float32)
    member[np.arange(len(ATOMS)), MEMBERS] = 1
    gram = member.T @ (gram * scale[:, :, None] * scale[:, None, :]) @ member
    return Products(gram.astype(np.float64), ((toward * scale) @ member).astype(np.float64))


def by_terms(columns: Floats, terms: Floats) -> Floats:
    """Give the light's column to its six coefficients: (n, k, 1 + 5) to (n, k, 6 + 5)."""
    light = columns[..., :1] * terms[:, None, :]
    return np.concatenate([light, columns[..., 1:]], axis=2)


@dataclass(frozen=True, slots=True, eq=False)
class Normal:
    """Normal equations: each pore's own unknowns, what all share, and how they meet.

    Parameters
    ----------
    gram : ndarray, shape (n, 16, 16)
        Products of the derivatives by own and far edges, patch by patch.
    expected : ndarray, shape (n, 12, 12)
        What is known of each pore's own edges before looking.
    cross : ndarray, shape (n, 12, 11)
    shared : ndarray, shape (11, 11)
    toward_own, toward_shared : ndarray, shapes (n, 12) and (11,)
    meets : Meets
    """

    gram: Floats
    expected: Floats
    cross: Floats
    shared: Floats
    toward_own: Floats
    toward_shared: Floats
    meets: Meets
    square: Floats
    usual: float
    light: NDArray[np.float32]

    def solved(self, damping: float) -> tuple[Floats, Floats, Floats, Floats]:
        """Eliminate the pores' own unknowns.

        Parameters
        ----------
        damping : float
            Share added to each pore's own curvature.

        Returns
        -------
        alone : ndarray, shape (n, 12)
            Steps of the pores' own unknowns were the shared ones to stay.
        carried : ndarray, shape (n, 12, 11)
            How own unknowns answer to shared ones, with the sign turned.
        matrix, toward : ndarray, shapes (11, 11) and (11,)
        """
        wanted = np.concatenate([self.cross, self.toward_own[..., None]], axis=2)
        found = self._conjugate(wanted, damping, CLOSE)
        carried, alone = found[..., :-1], found[..., -1]
        matrix = self.shared - np.einsum("nak,nal->kl", self.cross, carried)
        toward = self.toward_shared - np.einsum("nak,na->k", carried, self.toward_own)
        return alone, carried, matrix, toward

    def alone(self, damping: float) -> Floats:
        """Give the steps of the pores' own unknowns were the shared ones to stay: (n, 12)."""
        return self._conjugate(self.toward_own[..., None], damping, ROUGH)[..., 0]

    def _conjugate(self, wanted: Floats, damping: float, close: float) -> Floats:
        """Solve for the pores' own unknowns by conjugate gradients, each pore's block first."""
        block = self.gram[:, :LOCAL, :LOCAL] + self.expected
        block = block + self.meets.gather_diagonal(self.gram)[..., None] * np.eye(LOCAL)
        stiff = damping * np.einsum("naa->na", block)[..., None]
        # It only has to lead the right way: single precision takes half the time.
        inverse = np.linalg.inv((block + stiff * np.eye(LOCAL)).astype(np.float32))
        inverse = inverse.astype(np.float64)
        gram = self.gram.copy()
        gram[:, :LOCAL, :LOCAL] += self.expected + stiff * np.eye(LOCAL)

        def apply(own: Floats) -> Floats:
            return self.meets.gather(gram @ self.meets.spread(own))

        answer = inverse @ wanted
        least = close * np.einsum("nak,nak->k", wanted, answer) + 1e-300
        rest = wanted - apply(answer)
        towards = inverse @ rest
        heading, size = towards, np.einsum("nak,nak->k", rest, towards)
        for _ in range(CONJUGATES):
            if np.all(size < least):
                break
            pushed = apply(heading)
            far = size / np.maximum(np.einsum("nak,nak->k", heading, pushed), 1e-300)
            answer = answer + far * heading
            pushed *= far
            rest -= pushed
            towards = inverse @ rest
            before, size = size, np.einsum("nak,nak->k", rest, towards)
            heading = heading * (size / np.maximum(before, 1e-300))
            heading += towards
        return answer


class Meets:
    """Which pore's which edge bounds the far side of each of a patch's four threads."""

    def __init__(self, places: Places) -> None:
        self._far = (
            (places.beside[:, 1], 1),
            (places.beside[:, 3], 0),
            (places.above[:, 1], 3),
            (places.above[:, 3], 2),
        )
        # a pore stands in for the neighbour it lacks; of the others no two have the same
        alone = [pore == np.arange(len(pore)) for pore, _ in self._far]
        self._onto = [
            (pore[mine], edge, LOCAL + k, mine)
            for k, (pore, edge) in enumerate(self._far)
            for mine in (np.flatnonzero(alone[k]), np.flatnonzero(~alone[k]))
        ]

    def spread(self, own: Floats) -> Floats:
        """Give each patch its own unknowns and the far ones: (n, 12, k) to (n, 16, k)."""
        far = [own[pore, edge] for pore, edge in self._far]
        return np.concatenate([own, np.stack(far, axis=1)], axis=1)

    def gather(self, seen: Floats) -> Floats:
        """Add up for each pore what its edges do in all patches: (n, 16, k) to (n, 12, k)."""
        own = seen[:, :LOCAL].copy()
        for pore, edge, far, mine in self._onto:
            own[pore, edge] += seen[mine, far]
        return own

    def gather_diagonal(self, gram: Floats) -> Floats:
        """Add up the far edges' own curvature for each pore: shape (n, 12)."""
        diagonal = np.einsum("naa->na", gram).copy()
        diagonal[:, :LOCAL] = 0
        return self.gather(diagonal[..., None])[..., 0]


__all__ = ["Meets", "Normal", "Products", "by_terms", "multiply"]
