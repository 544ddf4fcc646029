"""The list of departures from a format's standard that grows while a file is read."""

from dataclasses import dataclass, field

from twlocate.records.record import Repair

SURE = "sure"
LIKELY = "likely"
GUESS = "guess"


@dataclass
class RepairLog:
    """Collects repairs in the order in which they were made."""

    entries: list[Repair] = field(default_factory=list)

    def add(self, what: str, where: str, assumed: str, confidence: str) -> None:
        """Write down one repair, once: the same departure met again is the same repair."""
        repair = Repair(what, where, assumed, confidence)
        if repair not in self.entries:
            self.entries.append(repair)
