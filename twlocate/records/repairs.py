"""The list of departures from a format's standard that grows while a file is read."""

import re
from dataclasses import dataclass, field

from twlocate.records.record import Repair

SURE = "sure"
LIKELY = "likely"
GUESS = "guess"

LISTED_PLACE = re.compile(r"(.*?) (\d+|'.*')")
PLACES_SHOWN = 6


@dataclass
class RepairLog:
    """Collects repairs in the order in which they were made."""

    places: dict[tuple[str, str, str], list[str]] = field(default_factory=dict)
    """(what, assumed, confidence) to the places where it was met."""

    def add(self, what: str, where: str, assumed: str, confidence: str) -> None:
        """Write down one repair; the same departure met in several places is one repair."""
        places = self.places.setdefault((what, assumed, confidence), [])
        if where not in places:
            places.append(where)

    @property
    def repairs(self) -> tuple[Repair, ...]:
        """The repairs so far."""
        return tuple(Repair(what, merged(where), assumed, sure) for (what, assumed, sure), where in self.places.items())


def merged(places: list[str]) -> str:
    """Return several places as one text: ``CFG line 3, 4, 5``."""
    if len(places) == 1:
        return places[0]
    matches = [LISTED_PLACE.fullmatch(place) for place in places]
    kinds = {match[1] for match in matches if match}
    more = f" and {len(places) - PLACES_SHOWN} more" if len(places) > PLACES_SHOWN else ""
    if all(matches) and len(kinds) == 1:
        numbers = [match[2] for match in matches if match]
        return f"{kinds.pop()} {', '.join(numbers[:PLACES_SHOWN])}{more}"
    return "; ".join(places[:PLACES_SHOWN]) + more
