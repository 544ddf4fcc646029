"""Sections between nodes as admittances, and the across values that injected through values cause."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np

from twlocate.arrays import ComplexArray
from twlocate.simulation.media import Medium

BLOCK = 4096
"""Frequencies solved at a time, which bounds the memory."""

Shunt = Callable[[ComplexArray], ComplexArray]
"""s, shape (frequencies,) → admittance of a node to the reference, shape (frequencies, n, n)."""


@dataclass(frozen=True)
class Span:
    """A uniform section between two nodes."""

    start: str
    end: str
    length_m: float
    medium: Medium


@dataclass(frozen=True)
class Network:
    """Spans of one number of conductors, in any tree or mesh."""

    spans: tuple[Span, ...]
    shunts: Mapping[str, Shunt] = field(default_factory=dict)
    """What hangs on a node: a load, a source's own impedance, a fault. A node without one is an open or closed end."""
    held: frozenset[str] = frozenset()
    """Nodes whose across value does not change: stiff sources, reservoirs."""

    @property
    def nodes(self) -> tuple[str, ...]:
        """Names in the order in which the spans give them."""
        return tuple(dict.fromkeys(name for span in self.spans for name in (span.start, span.end)))

    @property
    def conductors(self) -> int:
        """Number of conductors of every span."""
        return len(self.spans[0].medium.transform)


def solve(
    network: Network,
    s: ComplexArray,
    injected: Mapping[str, ComplexArray],
    imposed: Mapping[str, ComplexArray] | None = None,
) -> dict[str, ComplexArray]:
    """Return the across value of every node.

    Parameters
    ----------
    network : Network
        Spans, shunts and held nodes.
    s : ndarray, shape (frequencies,)
        Laplace variable, real part above zero.
    injected : mapping
        Through value put into a node from outside, shape (frequencies, n).
    imposed : mapping, optional
        Across value of a held node, shape (frequencies, n); zero where it is not given.

    Raises
    ------
    ValueError
        The spans differ in their number of conductors, or a name is not a node.

    References
    ----------
    N. R. Watson and J. Arrillaga, Power Systems Electromagnetic Transients Simulation, 2003, frequency-domain methods
    (from memory); for pipes the impedance method of E. B. Wylie and V. L. Streeter, Fluid Transients in Systems, 1993.
    """
    imposed = imposed or {}
    _check(network, injected, imposed)
    blocks = [slice(first, first + BLOCK) for first in range(0, s.size, BLOCK)]
    solved = [_solve_block(network, s[b], _rows(injected, b), _rows(imposed, b)) for b in blocks]
    return {name: np.concatenate([block[name] for block in solved]) for name in network.nodes}


def _rows(values: Mapping[str, ComplexArray], block: slice) -> dict[str, ComplexArray]:
    return {name: value[block] for name, value in values.items()}


def _solve_block(
    network: Network, s: ComplexArray, injected: Mapping[str, ComplexArray], imposed: Mapping[str, ComplexArray]
) -> dict[str, ComplexArray]:
    free = [name for name in network.nodes if name not in network.held]
    n, at = network.conductors, {name: index for index, name in enumerate(free)}
    matrix = np.zeros((s.size, n * len(free), n * len(free)), dtype=np.complex128)
    for span in network.spans:
        _add_span(matrix, span, s, at, n)
    for name, shunt in network.shunts.items():
        if name in at:
            block = _block(at[name], n)
            matrix[:, block, block] += shunt(s)
    right = np.zeros((s.size, n * len(free), 1), dtype=np.complex128)
    for name, through in injected.items():
        if name in at:
            right[:, _block(at[name], n), 0] += through
    for name, value in imposed.items():
        _draw(right, network, s, at, name, value)
    found = np.asarray(np.linalg.solve(matrix, right)[:, :, 0], dtype=np.complex128)
    zero = np.zeros((s.size, n), dtype=np.complex128)
    held = {name: imposed.get(name, zero) for name in network.held}
    return {name: held[name] if name in held else found[:, _block(at[name], n)] for name in network.nodes}


def through_into(network: Network, s: ComplexArray, across: Mapping[str, ComplexArray], node: str) -> ComplexArray:
    """Return the through value that flows from `node` into its spans, shape (frequencies, n)."""
    total = np.zeros((s.size, network.conductors), dtype=np.complex128)
    for span in network.spans:
        if node in (span.start, span.end):
            other = span.end if node == span.start else span.start
            own, mutual = span_admittance(span, s)
            total += (own @ across[node][:, :, None] + mutual @ across[other][:, :, None])[:, :, 0]
    return total


def span_admittance(span: Span, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """Return own and mutual admittance of a span, shape (frequencies, n, n): coth(γl)/Z and −1/(Z·sinh γl)."""
    gamma, z = span.medium.modes(s)
    once = np.exp(-gamma * span.length_m)  # decaying, so that long spans do not overflow
    twice = once * once
    own, mutual = (1 + twice) / (1 - twice) / z, -2 * once / (1 - twice) / z
    t = span.medium.transform
    back = np.linalg.inv(t)
    return (t * own[:, None, :]) @ back, (t * mutual[:, None, :]) @ back


def _add_span(matrix: ComplexArray, span: Span, s: ComplexArray, at: Mapping[str, int], n: int) -> None:
    own, mutual = span_admittance(span, s)
    ends = [_block(at[name], n) if name in at else None for name in (span.start, span.end)]
    for row in ends:
        for column in ends:
            if row is not None and column is not None:
                matrix[:, row, column] += own if row == column else mutual


def _draw(
    right: ComplexArray, network: Network, s: ComplexArray, at: Mapping[str, int], name: str, across: ComplexArray
) -> None:
    """Bring what a held node of known across value sends into its neighbours to the right-hand side."""
    n = network.conductors
    for span in network.spans:
        neighbour = {span.start: span.end, span.end: span.start}.get(name, "")
        if neighbour in at:
            _, mutual = span_admittance(span, s)
            right[:, _block(at[neighbour], n), :] -= mutual @ across[:, :, None]


def _block(index: int, n: int) -> slice:
    return slice(index * n, (index + 1) * n)


def _check(network: Network, injected: Mapping[str, ComplexArray], imposed: Mapping[str, ComplexArray]) -> None:
    sizes = {len(span.medium.transform) for span in network.spans}
    if len(sizes) != 1:
        raise ValueError(f"spans of {sorted(sizes)} conductors; all spans of a network need the same number")
    unknown = sorted({*network.shunts, *network.held, *injected, *imposed} - set(network.nodes))
    if unknown:
        raise ValueError(f"{', '.join(unknown)}: not a node of any span; nodes are {', '.join(network.nodes)}")
    loose = sorted(set(imposed) - network.held)
    if loose:
        raise ValueError(f"{', '.join(loose)}: an across value is imposed on a node that is not held; add it to `held`")
