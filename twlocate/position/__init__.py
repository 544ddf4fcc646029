"""One estimator for every geometry: arrivals and a route in, a density over the whole route out."""

from twlocate.position.band import Piece, SectionDensity
from twlocate.position.budget import Contribution
from twlocate.position.estimate import Alternative, Estimate, Fit, Point, estimate
from twlocate.position.evidence import Reading, Station

__all__ = [
    "Alternative",
    "Contribution",
    "Estimate",
    "Fit",
    "Piece",
    "Point",
    "Reading",
    "SectionDensity",
    "Station",
    "estimate",
]
