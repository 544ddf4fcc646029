"""The ways a wave can take from the event to a terminal."""

from dataclasses import dataclass
from enum import Enum

from twlocate.routes.route import Route


class Extent(Enum):
    """Which part of a section a leg covers; x is the event's distance from the section's from-node."""

    WHOLE = "whole"
    UP_TO_X = "0 to x"
    BEYOND_X = "x to end"


@dataclass(frozen=True)
class Leg:
    """A piece of a wave's way: a section, or the part of it before or beyond the event."""

    section: int
    along: bool
    """True where the wave runs from → to."""
    extent: Extent = Extent.WHOLE


@dataclass(frozen=True)
class WavePath:
    """A named way from the origin of the waves to a terminal, for an event in one given section."""

    name: str
    legs: tuple[Leg, ...]


def direct_path(route: Route, section: int, node: str) -> WavePath:
    """Return the way of the wave from an event in `section` straight to `node`."""
    home = route.sections[section]
    ways = {
        home.from_node: Leg(section, along=False, extent=Extent.UP_TO_X),
        home.to_node: Leg(section, along=True, extent=Extent.BEYOND_X),
    }
    for exit_node, first_leg in ways.items():
        hops = route.hops(exit_node, node)
        if all(index != section for index, _ in hops):
            return WavePath("direct", (first_leg, *_whole(hops)))
    raise AssertionError(f"{node} is not on the route")  # the case file's door has refused this


def echo_path(route: Route, section: int, node: str) -> WavePath:
    """Return the way of a pulse launched at `node`, to an event in `section` and back."""
    home = direct_path(route, section, node).legs
    return WavePath("echo of the event", (*_reversed(home), *home))


def repeated_echo_path(route: Route, section: int, node: str) -> WavePath:
    """Return the way of a pulse that runs from `node` to the event and back twice."""
    return WavePath("second echo of the event", echo_path(route, section, node).legs * 2)


def again_path(route: Route, section: int, node: str) -> WavePath:
    """Return the way of a wave that reaches `node`, is thrown back to the event, and returns."""
    home = direct_path(route, section, node).legs
    return WavePath("direct, and again by the event", (*home, *_reversed(home), *home))


def mirror_path(route: Route, section: int, node: str, mirror: str) -> WavePath | None:
    """Return the way of the wave from an event in `section` to the node `mirror` and from there to `node`.

    None where `mirror` lies on the direct way: what it throws back does not reach `node`.
    """
    direct = direct_path(route, section, node)
    away = direct_path(route, section, mirror)
    if {leg.section for leg in away.legs} <= {leg.section for leg in direct.legs} and away.legs[0] == direct.legs[0]:
        return None
    return WavePath(f"by {mirror}", (*away.legs, *_whole(route.hops(mirror, node))))


def node_echo_path(route: Route, node: str, mirror: str) -> WavePath:
    """Return the way of a pulse launched at `node`, to the node `mirror` and back."""
    back = _whole(route.hops(mirror, node))
    return WavePath(f"echo of {mirror}", (*_reversed(back), *back))


def _whole(hops: tuple[tuple[int, bool], ...]) -> tuple[Leg, ...]:
    return tuple(Leg(section, along) for section, along in hops)


def _reversed(legs: tuple[Leg, ...]) -> tuple[Leg, ...]:
    return tuple(Leg(leg.section, not leg.along, leg.extent) for leg in reversed(legs))
