"""The named places a crew knows a route by: structures, manholes, valves, marker posts."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Place:
    """A named point on the route."""

    name: str
    section: int
    """Index of its section."""
    distance_m: float
    """From the section's from-node, along the section."""
    lat: float | None = None
    lon: float | None = None
