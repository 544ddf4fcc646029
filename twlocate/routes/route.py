"""Sections between nodes: the ground that waves run over and positions are given on."""

from dataclasses import dataclass
from functools import cached_property

from twlocate.quantity import Quantity


@dataclass(frozen=True)
class Section:
    """A uniform stretch of line, cable or pipe from one node to the next.

    Positions on it are metres from `from_node`. `flow` is the speed of the liquid or gas, positive
    from → to; a wave runs at speed + flow with the stream and speed − flow against it.
    """

    from_node: str
    to_node: str
    length: Quantity
    """m"""
    speed: Quantity
    """Wave speed relative to the medium, m/s."""
    flow: Quantity = Quantity(0.0)
    """m/s"""
    impedance: float | None = None
    """Ω, or Pa·s/m³ for a pipe."""

    @property
    def name(self) -> str:
        """The two nodes, as a crew would say it."""
        return f"{self.from_node}–{self.to_node}"


@dataclass(frozen=True)
class Route:
    """Sections joined at nodes into a tree (in series, or with tees)."""

    sections: tuple[Section, ...]

    @cached_property
    def nodes(self) -> tuple[str, ...]:
        """All nodes, in the order in which the sections name them."""
        return tuple(dict.fromkeys(node for s in self.sections for node in (s.from_node, s.to_node)))

    @cached_property
    def neighbours(self) -> dict[str, tuple[tuple[int, str], ...]]:
        """For each node, the (section index, node at the other end) that meet there."""
        meeting: dict[str, list[tuple[int, str]]] = {node: [] for node in self.nodes}
        for index, section in enumerate(self.sections):
            meeting[section.from_node].append((index, section.to_node))
            meeting[section.to_node].append((index, section.from_node))
        return {node: tuple(links) for node, links in meeting.items()}

    @property
    def length_m(self) -> float:
        """Sum of the section lengths."""
        return sum(section.length.value for section in self.sections)

    def nodes_within_reach(self, node: str) -> frozenset[str]:
        """Return the nodes that sections connect to `node`, itself included."""
        reached = {node}
        frontier = [node]
        while frontier:
            found = {other for _, other in self.neighbours[frontier.pop()]} - reached
            reached |= found
            frontier += sorted(found)
        return frozenset(reached)

    def hops(self, start: str, end: str) -> tuple[tuple[int, bool], ...]:
        """Return the way from node to node as (section index, whether it is run from → to).

        In a tree there is exactly one.
        """
        trail: dict[str, tuple[tuple[int, bool], ...]] = {start: ()}
        frontier = [start]
        while frontier and end not in trail:
            node = frontier.pop(0)
            for index, other in self.neighbours[node]:
                if other not in trail:
                    trail[other] = (*trail[node], (index, self.sections[index].from_node == node))
                    frontier.append(other)
        return trail[end]
