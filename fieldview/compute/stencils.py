"""First-derivative stencils along one axis: which nodes they take, and with what weights.

A scheme is a list of choices in order of preference. A node takes the first whose nodes are all valid; the
first of the list is the scheme itself, the others stand in near edges and gaps. Two mirrored choices of
the list are never both open to a node without an earlier one being open too, so that a mirrored field
gets mirrored derivatives.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError


@dataclass(frozen=True)
class Choice:
    """A stencil over the nodes i + first ... i + first + count - 1.

    Its weights are the slope at node i of the polynomial of ``degree`` that fits them: through all of
    them where there are degree + 1, by least squares otherwise.
    """

    first: int
    count: int
    degree: int

    @property
    def last(self) -> int:
        return self.first + self.count - 1

    @property
    def offsets(self) -> range:
        return range(self.first, self.last + 1)

    def weights(self, axis: np.ndarray, nodes: np.ndarray) -> np.ndarray:
        """Weights (len(nodes), count) at these nodes of the axis. [1/length]"""
        members = nodes[:, None] + np.arange(self.first, self.last + 1)
        arms = axis[members] - axis[nodes][:, None]
        reach = np.abs(arms).max(axis=1)
        powers = (arms / reach[:, None])[:, :, None] ** np.arange(self.degree + 1)
        return np.linalg.pinv(powers)[:, 1, :] / reach[:, None]


_CENTRAL = (Choice(-1, 3, 2), Choice(0, 3, 2), Choice(-2, 3, 2), Choice(0, 2, 1), Choice(-1, 2, 1))


def _shifted(degree: int) -> tuple[Choice, ...]:
    """Five nodes, centred if possible, else the more one-sided the nearer the edge."""
    return tuple(Choice(first, 5, degree) for first in (-2, -1, -3, 0, -4))


@dataclass(frozen=True)
class Scheme:
    """A derivative scheme.

    Attributes
    ----------
    choices : tuple of Choice
        In order of preference.
    across : bool
        Whether the first choice is averaged over three lines, with weights (1, 2, 1)/4 where they are
        evenly spaced, when all of them are valid.
    order : int
        Order of accuracy away from gaps and edges.
    title : str
    """

    choices: tuple[Choice, ...]
    order: int
    title: str
    across: bool = False


SCHEMES: dict[str, Scheme] = {
    "central": Scheme(_CENTRAL, 2, "Central differences"),
    "richardson": Scheme(_shifted(4) + _CENTRAL, 4, "Richardson extrapolation, five points"),
    "least_squares": Scheme(_shifted(2) + _CENTRAL, 2, "Least squares over five points"),
    "circulation": Scheme(_CENTRAL, 2, "Circulation around the eight neighbours", across=True),
}
"""The derivative schemes by name, as in the session file."""


def scheme_named(name: str) -> Scheme:
    """Raises InputError naming the known schemes."""
    if name not in SCHEMES:
        raise InputError(f'derivative scheme "{name}" is not known; the schemes are: {", ".join(SCHEMES)}')
    return SCHEMES[name]


def across_weights(axis: np.ndarray) -> np.ndarray:
    """Weights (n - 2, 3) of the inner nodes' lines: half for the middle, no first moment, sum 1."""
    below, above = np.diff(axis)[:-1], np.diff(axis)[1:]
    share = 0.5 / (below + above)
    return np.stack([share * above, np.full(below.size, 0.5), share * below], axis=1)
