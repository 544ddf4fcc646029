"""The case file: what the route is, where the recordings are, how far the clocks may be trusted (README)."""

import csv
import math
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from pydantic import Field, ValidationError

from twlocate.errors import CaseError
from twlocate.forms import (
    IMPEDANCE_UNIT,
    ROLES,
    Form,
    SectionForm,
    TerminalForm,
    Words,
    form_faults,
    positive,
    printable,
)
from twlocate.quantity import Quantity, parse_quantity
from twlocate.routes import Place, Route, Section

SPEED_OF_LIGHT = 299_792_458.0  # m/s, exact: SI definition of the metre

REFLECTS = {"low impedance": -1, None: 0, "high impedance": 1}
"""Sign of the reflection of voltage or pressure at a terminal, by what its bus is against the line or pipe."""

SPEEDS = {"line": (0.1 * SPEED_OF_LIGHT, SPEED_OF_LIGHT), "pipe": (10.0, 1e4)}
"""m/s. A line at a tenth of the speed of light would need a relative permittivity of 100; bubbly water and soft hoses
stay above 10 m/s; no pipe wave is faster than sound in steel, 5960 m/s. Meant to find slips of unit, so round."""

IMPEDANCES = {"line": (0.1, 1e5), "pipe": (1.0, 1e13)}
"""Ω, Pa·s/m³: as wide as any conductor or bore, gas or liquid (common practice, no source)."""

LONGEST_M = 4.0075e7
"""Circumference of the earth at the equator (WGS 84: 2π·6 378 137 m)."""

LEAST_SIGMAS = 3.0
"""Lengths, speeds and speeds against the flow are this many standard uncertainties or more above zero; below, a normal
density would give much to values that cannot be."""

LONGEST_NAME = 120
"""Characters of a file name that a message shows."""

PLACE_COLUMNS = "the columns are name, section, chainage and, if known, lat, lon, with commas between"

FAULTS_SHOWN = 5
"""Faults of a places file that are listed one by one."""


@dataclass(frozen=True)
class Terminal:
    """A node with a recorder."""

    node: str
    recording: Path
    channels: Mapping[str, str]
    """Role (see :data:`~twlocate.forms.ROLES`) to the channel's name in the recording."""
    clock: Quantity | None
    """Offset and standard uncertainty of its clock, s; None: take what the recording says."""
    clock_free: bool
    delay: Quantity
    """Transducer and secondary cabling, s."""
    reflects: int
    """Sign of what its bus makes of an arriving voltage or pressure wave: −1, +1, or 0 where that is not stated."""
    launches: str | None
    """``pulse`` or ``step`` where the terminal sends its own signal into the route; None where it only listens."""


@dataclass(frozen=True)
class Case:
    """A case file, checked and in SI."""

    path: Path
    title: str
    kind: str
    route: Route
    terminals: tuple[Terminal, ...]
    places: tuple[Place, ...]
    places_file: Path | None


def load_case(path: Path) -> Case:
    """Read a case file.

    Raises
    ------
    CaseError
        The file is missing, is not TOML, or has faults; the message lists every fault with its place.
    """
    tables = _read_toml(path)
    faults = [*_name_faults(tables, path.parent)]
    try:
        form = _CaseForm.model_validate(tables)
    except ValidationError as error:
        raise _case_error(path, [*form_faults(error, _CaseForm, _TABLES), *faults]) from error
    faults = faults or [*_value_faults(form)]
    if faults:
        raise _case_error(path, faults)
    route = _route(form)
    places_file = path.parent / form.places.file if form.places else None
    places, faults = _read_places(places_file, route) if places_file else ((), [])
    if faults:
        raise _case_error(path, faults)
    terminals = tuple(_terminal(table, path.parent) for table in form.terminal)
    return Case(path, form.title, form.kind, route, terminals, places, places_file)


def _case_error(path: Path, faults: list[str]) -> CaseError:
    count = f"{len(faults)} faults" if len(faults) > 1 else "1 fault"
    return CaseError("\n  ".join([f"{path}: {count} in the case file", *faults]))


def _read_toml(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8-sig"))  # some editors put a byte order mark first
    except OSError as error:
        raise CaseError(f"{path}: {error.strerror or error}; give the path of a case file") from error
    except UnicodeDecodeError as error:
        raise CaseError(f"{path}: not UTF-8 text at byte {error.start}; a case file is a TOML text file") from error
    except tomllib.TOMLDecodeError as error:
        raise CaseError(f"{path}: not TOML: {error}") from error
    except RecursionError as error:
        raise CaseError(
            f"{path}: brackets are nested too deep; a case file has tables in lists and no deeper"
        ) from error


# ---------------------------------------------------------------- the form


class _PlacesForm(Form):
    file: str


class _CaseForm(Form):
    title: Words = ""
    kind: Literal["line", "pipe"]
    section: list[SectionForm] = Field(min_length=1)
    terminal: list[TerminalForm] = Field(min_length=1)
    places: _PlacesForm | None = None


_TABLES: dict[str, type[Form]] = {"section": SectionForm, "terminal": TerminalForm, "places": _PlacesForm}


# ---------------------------------------------------------------- faults between fields


def _name_faults(tables: dict[str, Any], folder: Path) -> Iterator[str]:
    """Faults that names alone show; looks at the raw tables, so that they are listed beside faults of form."""
    sections = _tables(tables, "section")
    ends = [(table.get("from"), table.get("to")) for table in sections]
    nodes = {node for pair in ends for node in pair if isinstance(node, str)}
    yield from _shape_faults(ends)
    yield from _shared_channels(_tables(tables, "terminal"))
    seen: set[object] = set()
    for index, table in enumerate(_tables(tables, "terminal"), 1):
        node = table.get("node")
        if isinstance(node, str) and nodes and node not in nodes:
            yield f"terminal {index}, node: {node!r} is not a node of any section; nodes are {', '.join(sorted(nodes))}"
        if isinstance(node, str) and node in seen:
            yield f"terminal {index}, node: {node!r} has a terminal already; give each node one recorder"
        seen.add(node)
        yield from _file_faults(table.get("recording"), folder, f"terminal {index}, recording")
        yield from _role_faults(table.get("channels"), tables.get("kind"), index)
    places = tables.get("places")
    if isinstance(places, dict):
        yield from _file_faults(places.get("file"), folder, "places, file")


def _shared_channels(terminals: list[dict[str, Any]]) -> Iterator[str]:
    """One channel of one file cannot be two things; terminals may share a file, each with channels of its own."""
    users: dict[tuple[object, object], str] = {}
    for index, table in enumerate(terminals, 1):
        recording, channels = table.get("recording"), table.get("channels")
        named = channels.items() if isinstance(channels, dict) and isinstance(recording, str) else ()
        for role, name in named:
            if not isinstance(name, str):
                continue
            user = f"{role} of terminal {index}"
            first = users.setdefault((recording, name), user)
            if first != user:
                yield f"terminal {index}, channels: {role} is {name!r} of {recording!r}, which is {first} already"


def _tables(tables: dict[str, Any], key: str) -> list[dict[str, Any]]:
    rows = tables.get(key)
    return [row for row in rows if isinstance(row, dict)] if isinstance(rows, list) else []


def _shape_faults(ends: list[tuple[object, object]]) -> Iterator[str]:
    """A route is a tree: each section must bring exactly one new node to what the earlier ones reach."""
    group: dict[object, object] = {}

    def root(node: object) -> object:
        while group.setdefault(node, node) != node:
            node = group[node]
        return node

    for index, (start, end) in enumerate(ends, 1):
        if not (isinstance(start, str) and isinstance(end, str)):
            continue
        if root(start) == root(end):
            yield f"section {index}: {start}–{end} closes a loop; a route is in series or a tree"
        group[root(end)] = root(start)
    if len({root(node) for node in list(group)}) > 1:
        yield "section: the sections do not join up; each one must share a node with another"


def _file_faults(name: object, folder: Path, place: str) -> Iterator[str]:
    if isinstance(name, str) and not _is_file(folder / name):
        yield f"{place}: no file {_short(name)!r} beside the case file (looked in {folder.resolve()})"


def _short(name: str) -> str:
    return name if len(name) <= LONGEST_NAME else f"{name[:LONGEST_NAME]}…"


def _is_file(path: Path) -> bool:
    try:
        return path.is_file()
    except (OSError, ValueError):  # a name that no file can have: too long, or with a zero byte
        return False


def _role_faults(channels: object, kind: object, index: int) -> Iterator[str]:
    roles = ROLES.get(kind) if isinstance(kind, str) else None
    if roles is None or not isinstance(channels, dict):
        return
    for role in channels:
        if role not in roles:
            yield f"terminal {index}, channels: {role!r} is not a role on a {kind}; roles are {', '.join(roles)}"
    for phases in (("va", "vb", "vc"), ("ia", "ib", "ic")):
        given = [role for role in phases if role in channels]
        single = phases[0][0]
        if given and single in channels:
            yield f"terminal {index}, channels: {single} beside {', '.join(given)}; give three phases or one {single}"
        if given and len(given) < len(phases):
            lacking = ", ".join(role for role in phases if role not in given)
            yield f"terminal {index}, channels: {', '.join(given)} without {lacking}; give all three phases, or v or i"


def _value_faults(form: _CaseForm) -> Iterator[str]:
    for index, section in enumerate(form.section, 1):
        for fault in (*_length_faults(section), *_speed_faults(section, form.kind), *_flow_faults(section, form.kind)):
            yield f"section {index}, {fault}"
        if section.impedance is not None:
            yield from _impedance_faults(section.impedance, form.kind, index)


def _length_faults(section: SectionForm) -> Iterator[str]:
    if section.length.value > LONGEST_M:
        yield f"length: {section.length.value:g} m is longer than the equator; check the unit"
    yield from _vague("length", section.length, "m")


def _speed_faults(section: SectionForm, kind: str) -> Iterator[str]:
    low, high = SPEEDS[kind]
    speed = section.speed
    if kind == "line" and speed.value > SPEED_OF_LIGHT:
        yield f"speed: {speed.value:g} m/s is above the speed of light; check the unit"
    elif not low <= speed.value <= high:
        yield f"speed: {speed.value:g} m/s is outside {low:g} to {high:g} m/s, what a {kind} can have; check the unit"
    yield from _vague("speed", speed, "m/s")


def _flow_faults(section: SectionForm, kind: str) -> Iterator[str]:
    flow, speed = section.flow_speed, section.speed
    if kind == "line" and flow != Quantity(0.0):
        yield "flow_speed: only a pipe has a flow; leave it out on a line"
    if abs(flow.value) >= speed.value:
        yield f"flow_speed: {flow.value:g} m/s is not below the wave speed"
    elif flow != Quantity(0.0):
        against = Quantity(speed.value - abs(flow.value), math.hypot(speed.u, flow.u))
        yield from _vague("flow_speed: the wave speed against the flow", against, "m/s")


def _vague(what: str, quantity: Quantity, unit: str) -> Iterator[str]:
    if quantity.value < LEAST_SIGMAS * quantity.u:
        yield (
            f"{what}: {quantity.value:g} {unit} with a standard uncertainty of {quantity.u:g} {unit} may as well be 0; "
            f"state it to a third or better"
        )


def _impedance_faults(text: str, kind: str, index: int) -> Iterator[str]:
    low, high = IMPEDANCES[kind]
    try:
        value = positive(parse_quantity(text, IMPEDANCE_UNIT[kind])).value
    except ValueError as error:
        yield f"section {index}, impedance: {error}"
        return
    if not low <= value <= high:
        yield (
            f"section {index}, impedance: {value:g} {IMPEDANCE_UNIT[kind]} is outside {low:g} to {high:g}, "
            f"what a {kind} can have; check the unit"
        )


# ---------------------------------------------------------------- from the form to the facts


def _route(form: _CaseForm) -> Route:
    def impedance(text: str | None) -> float | None:
        return None if text is None else parse_quantity(text, IMPEDANCE_UNIT[form.kind]).value

    return Route(
        tuple(
            Section(s.from_node, s.to_node, s.length, s.speed, s.flow_speed, impedance(s.impedance))
            for s in form.section
        )
    )


def _terminal(table: TerminalForm, folder: Path) -> Terminal:
    free = table.clock == "free"
    return Terminal(
        node=table.node,
        recording=folder / table.recording,
        channels=dict(table.channels),
        clock=table.clock if isinstance(table.clock, Quantity) else None,
        clock_free=free,
        delay=table.delay,
        reflects=REFLECTS[table.bus],
        launches=table.launches,
    )


def _read_places(path: Path, route: Route) -> tuple[tuple[Place, ...], list[str]]:
    places: list[Place] = []
    faults: list[str] = []
    names = {_plain(section.name): index for index, section in enumerate(route.sections)}
    try:
        rows = csv.DictReader(path.read_text(encoding="utf-8-sig").splitlines(), skipinitialspace=True)
        rows.fieldnames = [name.strip().lower() for name in rows.fieldnames or ()]
        listed = list(rows)
    except UnicodeDecodeError as error:
        return (), [f"places, file: {path.name} is not UTF-8 text at byte {error.start}; save it as UTF-8"]
    except csv.Error as error:
        return (), [f"places, file: {path.name} is no comma-separated table: {error}"]
    lacking = [key for key in ("name", "section", "chainage") if key not in rows.fieldnames]
    if lacking:
        return (), [f"places, file: {path.name} has no column {', '.join(lacking)} in its first line; {PLACE_COLUMNS}"]
    for line, row in enumerate(listed, 2):
        try:
            places.append(_place_of(row, names, route))
        except ValueError as error:
            faults.append(f"places, file: {path.name} line {line}: {error}")
    more = len(faults) - FAULTS_SHOWN
    return tuple(places), [
        *faults[:FAULTS_SHOWN],
        *([f"places, file: {more} more lines like these"] if more > 0 else []),
    ]


def _plain(section_name: str) -> str:
    return section_name.replace("–", "-").strip()


def _place_of(row: dict[str, str | None], sections: dict[str, int], route: Route) -> Place:
    lacking = [key for key in ("name", "section", "chainage") if not row.get(key)]
    if lacking:
        raise ValueError(f"no {', '.join(lacking)}; {PLACE_COLUMNS}")
    section = sections.get(_plain(row["section"] or ""))
    if section is None:
        raise ValueError(f"no section {row['section']!r}; sections are {', '.join(sections)}")
    distance = parse_quantity(row["chainage"] or "", "m").value
    length = route.sections[section].length.value
    if not 0 <= distance <= length:
        raise ValueError(f"chainage {row['chainage']} is not on the section, which is {length:g} m long")
    lat, lon = (_degrees(row.get(key), key, limit) for key, limit in (("lat", 90.0), ("lon", 180.0)))
    return Place(printable(row["name"] or ""), section, distance, lat, lon)


def _degrees(text: str | None, key: str, limit: float) -> float | None:
    if not text:
        return None
    angle = float(text)
    if not -limit <= angle <= limit:
        raise ValueError(f"{key} {text} is not within ±{limit:g} degrees")
    return angle
