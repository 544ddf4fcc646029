"""The scenario file: a case file's sections and terminals, with what is to happen and how it is recorded."""

import tomllib
from pathlib import Path
from typing import Annotated, Literal

from pydantic import Field, ValidationError, model_validator

from twlocate.errors import CaseError
from twlocate.forms import (
    IMPEDANCE_UNIT,
    ROLES,
    Duration,
    Form,
    SectionForm,
    TerminalForm,
    form_faults,
    quantity_in,
)
from twlocate.quantity import Quantity, parse_quantity
from twlocate.simulation.events import FAULTS

FEWEST_SAMPLES, MOST_SAMPLES = 64, 2_000_000
"""Of a recording."""


class SimulatedSection(SectionForm):
    """A section as in a case file, and what only the simulator needs: loss, and the ground mode of three phases."""

    impedance: str
    loss_rate: Annotated[Quantity, quantity_in("1/s")] = Quantity(0.0)
    """R/L of a line, f·|v|/D of a pipe."""
    ground_speed: Annotated[Quantity | None, quantity_in("m/s")] = None
    ground_impedance: Annotated[Quantity | None, quantity_in("ohm")] = None

    @property
    def name(self) -> str:
        """The two nodes."""
        return f"{self.from_node}–{self.to_node}"


class SimulatedTerminal(TerminalForm):
    """A terminal as in a case file; its clock is drawn from what the file states."""

    recording: str = Field(pattern=r"^[^/\\]+\.(cfg|csv)$")
    clock: Duration = Quantity(0.0)


class EndForm(Form):
    """What hangs on a node: an impedance to the reference; 0 holds the node (a reservoir, a stiff source)."""

    node: str
    impedance: str


class FaultForm(Form):
    """A fault on a line."""

    kind: Literal["fault"]
    section: str
    distance: Annotated[Quantity, quantity_in("m")]
    onset: Annotated[Quantity, quantity_in("s")]
    type: str = "ag"
    """On three phases; on one conductor every fault is to ground."""
    resistance: Annotated[Quantity, quantity_in("ohm")]
    voltage: Annotated[Quantity, quantity_in("V")]
    """Peak, of the sources behind the ends, to ground."""
    angle: Annotated[Quantity, quantity_in("degree")] = Quantity(90.0)
    """Of phase a's source at the onset; 90° is its crest."""
    frequency: Annotated[Quantity, quantity_in("Hz")] = Quantity(50.0)


class BurstForm(Form):
    """A burst on a pipe: an outflow that grows from zero."""

    kind: Literal["burst"]
    section: str
    distance: Annotated[Quantity, quantity_in("m")]
    onset: Annotated[Quantity, quantity_in("s")]
    outflow: Annotated[Quantity, quantity_in("m**3/s")]
    opening: Annotated[Quantity, quantity_in("s")]
    pressure: Annotated[Quantity, quantity_in("Pa")] = Quantity(0.0)
    """At all terminals before."""


class RecorderForm(Form):
    """How the terminals record."""

    rate: Annotated[Quantity, quantity_in("Hz")]
    duration: Annotated[Quantity, quantity_in("s")]
    across_noise: float = Field(default=0.0, ge=0)
    """Standard deviation of white noise, V or Pa."""
    through_noise: float = Field(default=0.0, ge=0)
    """A or m³/s."""
    across_step: float = Field(default=0.0, ge=0)
    """Size of one converter step; 0 leaves the readings as they are."""
    through_step: float = Field(default=0.0, ge=0)


class Scenario(Form):
    """A scenario, checked; quantities in SI."""

    title: str = ""
    kind: Literal["line", "pipe"]
    section: list[SimulatedSection] = Field(min_length=1)
    terminal: list[SimulatedTerminal] = Field(min_length=1)
    end: list[EndForm] = Field(default_factory=list)
    event: FaultForm | BurstForm = Field(discriminator="kind")
    recorder: RecorderForm

    @property
    def phases(self) -> int:
        """Conductors of every section: three where a terminal records phases."""
        return 3 if any(role in ("va", "ia") for terminal in self.terminal for role in terminal.channels) else 1

    @property
    def event_section(self) -> int:
        """Index of the section in which the event happens."""
        plain = [section.name.replace("–", "-") for section in self.section]
        return plain.index(self.event.section.replace("–", "-"))

    @model_validator(mode="after")
    def _names_and_sizes(self) -> "Scenario":
        faults = [
            *self._section_faults(),
            *self._impedance_faults(),
            *self._node_faults(),
            *self._event_faults(),
            *self._recorder_faults(),
        ]
        if faults:
            raise ValueError("; ".join(faults))
        return self

    def _section_faults(self) -> list[str]:
        faults = []
        for index, section in enumerate(self.section, 1):
            if section.flow_speed.value != 0:
                faults.append(f"section {index}, flow_speed: the simulator knows no flow; leave it out")
            if section.loss_rate.value < 0:
                faults.append(f"section {index}: loss_rate {section.loss_rate.value:g} 1/s is negative")
            if self.phases == 3 and (section.ground_speed is None or section.ground_impedance is None):
                faults.append(f"section {index}: three phases need ground_speed and ground_impedance")
        return faults

    def _impedance_faults(self) -> list[str]:
        unit, faults = IMPEDANCE_UNIT[self.kind], []
        stated = [(f"section {k}", s.impedance, False) for k, s in enumerate(self.section, 1)]
        stated += [(f"end {k}", end.impedance, True) for k, end in enumerate(self.end, 1)]
        for place, text, may_be_zero in stated:
            try:
                value = parse_quantity(text, unit).value
            except ValueError as error:
                faults.append(f"{place}, impedance: {error}")
                continue
            if value < 0 or (value == 0 and not may_be_zero):
                faults.append(f"{place}, impedance: {text!r} must be above 0{' or 0' if may_be_zero else ''}")
        return faults

    def _recorder_faults(self) -> list[str]:
        samples = self.recorder.rate.value * self.recorder.duration.value
        files = [terminal.recording for terminal in self.terminal]
        faults = [
            f"terminal, recording: {name!r} is named twice" for name in sorted(set(files)) if files.count(name) > 1
        ]
        if not FEWEST_SAMPLES <= samples <= MOST_SAMPLES:
            limits = f"{FEWEST_SAMPLES} to {MOST_SAMPLES}"
            faults.append(f"recorder: rate times duration is {samples:g} samples; it must be {limits}")
        return faults

    def _node_faults(self) -> list[str]:
        nodes = {name for section in self.section for name in (section.from_node, section.to_node)}
        named = [*(("terminal", t.node) for t in self.terminal), *(("end", e.node) for e in self.end)]
        roles = [role for terminal in self.terminal for role in terminal.channels]
        one, three = (set(roles) & set(group) for group in (("v", "i"), ROLES["line"][:6]))
        faults = [
            f"terminal {index}, launches: the simulator launches no pulses; leave it out"
            for index, terminal in enumerate(self.terminal, 1)
            if terminal.launches
        ]
        faults += [
            f"{table}: {name!r} is not a node; nodes are {', '.join(sorted(nodes))}"
            for table, name in named
            if name not in nodes
        ]
        faults += [
            f"channels: {role!r} is not a role on a {self.kind}" for role in roles if role not in ROLES[self.kind]
        ]
        return faults + ["channels: all terminals record phases (va … ic), or none does"] * bool(one and three)

    def _event_faults(self) -> list[str]:
        event, names = self.event, [section.name.replace("–", "-") for section in self.section]
        if (event.kind == "fault") != (self.kind == "line"):
            return [f"event: a {event.kind} cannot happen on a {self.kind}; a line has faults, a pipe has bursts"]
        if event.section.replace("–", "-") not in names:
            return [f"event, section: no section {event.section!r}; sections are {', '.join(names)}"]
        length = self.section[self.event_section].length.value
        faults = [
            f"event, {name}: must be above 0"
            for name in ("resistance", "opening", "frequency", "outflow", "voltage")
            if getattr(event, name, Quantity(1.0)).value <= 0
        ]
        if not 0 < event.distance.value < length:
            faults.append(f"event, distance: {event.distance.value:g} m is not inside the section of {length:g} m")
        if isinstance(event, FaultForm) and event.type not in FAULTS:
            faults.append(f"event, type: {event.type!r} is unknown; choose one of {', '.join(FAULTS)}")
        if not 0 < event.onset.value < self.recorder.duration.value:
            faults.append(f"event, onset: {event.onset.value:g} s is not inside the recording")
        return faults


_TABLES: dict[str, type[Form]] = {
    "section": SimulatedSection,
    "terminal": SimulatedTerminal,
    "end": EndForm,
    "fault": FaultForm,
    "burst": BurstForm,
    "recorder": RecorderForm,
}


def load_scenario(path: Path) -> Scenario:
    """Read a scenario file.

    Raises
    ------
    CaseError
        The file is missing, is not TOML, or has faults; the message lists them.
    """
    try:
        return Scenario.model_validate(tomllib.loads(path.read_text(encoding="utf-8")))
    except OSError as error:
        raise CaseError(f"{path}: {error.strerror or error}; give the path of a scenario file") from error
    except ValidationError as error:
        raise CaseError(
            "\n  ".join([f"{path}: the scenario is wrong", *form_faults(error, Scenario, _TABLES)])
        ) from error
    except ValueError as error:  # not UTF-8, or not TOML
        raise CaseError(f"{path}: not a TOML text file: {error}") from error
