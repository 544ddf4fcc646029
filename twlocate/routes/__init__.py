"""The route: sections between nodes, how long a wave takes along them, and the places a crew knows it by."""

from twlocate.routes.paths import (
    WavePath,
    again_path,
    direct_path,
    echo_path,
    mirror_path,
    node_echo_path,
    repeated_echo_path,
)
from twlocate.routes.places import Place
from twlocate.routes.route import Route, Section
from twlocate.routes.travel import TravelTime, transit_s, travel_time

__all__ = [
    "Place",
    "Route",
    "Section",
    "TravelTime",
    "WavePath",
    "again_path",
    "direct_path",
    "echo_path",
    "mirror_path",
    "node_echo_path",
    "repeated_echo_path",
    "transit_s",
    "travel_time",
]
