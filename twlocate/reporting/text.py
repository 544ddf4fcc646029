"""A finding as text for people: the answer first, then what it rests on, then the cautions."""

import io

from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from twlocate.arrivals import Arrival
from twlocate.locating import Finding
from twlocate.position import Estimate, Fit, Piece, Reading
from twlocate.reporting.cautions import cautions_for
from twlocate.reporting.document import utc_text
from twlocate.routes import Route
from twlocate.scales import Scale, length_scale, length_text, time_scale, time_text, two_digits

FILE_WIDTH = 120
BUDGET_ROWS = 6
PLACE_ROWS = 8
SMALL_PROBABILITY = 0.005


def print_finding(finding: Finding) -> None:
    """Print the finding to stdout, as wide as the terminal."""
    Console(markup=False).print(finding_text(finding))


def plain_text(finding: Finding) -> str:
    """Return the finding as text without colours, :data:`FILE_WIDTH` characters wide."""
    console = Console(width=FILE_WIDTH, file=io.StringIO(), color_system=None, markup=False)
    with console.capture() as captured:
        console.print(finding_text(finding))
    return "\n".join(line.rstrip() for line in captured.get().splitlines()) + "\n"


def finding_text(finding: Finding) -> RenderableType:
    """Return the finding as something rich can print."""
    found, route = finding.estimate, finding.case.route
    parts: list[RenderableType] = [Text(finding.case.title, style="bold")] if finding.case.title else []
    if found:
        parts += [*_answer(found, route), *_alternatives(found, route), *_places(finding, found)]
    else:
        parts.append(Text(f"No position: {finding.reason}", style="bold"))
    parts += _arrivals(finding)
    if found:
        parts.append(_budget(found))
    parts += [_checks(finding), *_repairs(finding), _cautions(finding)]
    return Group(*(Padding(part, (0, 0, 1, 0)) for part in parts))


def _scale(found: Estimate, route: Route) -> Scale:
    """How positions are written: in a unit that suits the route, to a digit that suits the uncertainty."""
    return length_scale(max(section.length.value for section in route.sections), found.point.u_m)


def _answer(found: Estimate, route: Route) -> list[RenderableType]:
    scale = _scale(found, route)
    section = route.sections[found.point.section]
    where = f"{scale(found.point.distance_m)} from {section.from_node}"
    inside = f" in {section.name}" if len(route.sections) > 1 else f" towards {section.to_node}"
    best = Text.assemble("Look at ", (where, "bold"), inside, f", standard uncertainty {length_text(found.point.u_m)}")
    return [Group(best, *(_band_line(piece, found, route, scale) for piece in found.band))]


def _band_line(piece: Piece, found: Estimate, route: Route, scale: Scale) -> Text:
    section = route.sections[piece.section]
    from_end = section.length.value - piece.to_m, section.length.value - piece.from_m
    return Text(
        f"{found.coverage:.0%} band: {scale.number(piece.from_m)} to {scale(piece.to_m)} from {section.from_node}"
        f" = {scale.number(from_end[0])} to {scale(from_end[1])} from {section.to_node}"
    )


def _alternatives(found: Estimate, route: Route) -> list[RenderableType]:
    if len(found.alternatives) < 2 and found.in_one_run:
        return []
    table = _table("probability", "distance", "section", "attribution")
    for row in found.alternatives:
        section = route.sections[row.point.section]
        scale = length_scale(section.length.value, row.point.u_m)
        distance = f"{scale(row.point.distance_m)} ± {length_text(row.point.u_m)} from {section.from_node}"
        table.add_row(f"{row.probability:.1%}", distance, section.name, row.attribution)
    return [_titled("Alternatives", table)]


def _places(finding: Finding, found: Estimate) -> list[RenderableType]:
    likely = [place for place in finding.places if place.probability >= SMALL_PROBABILITY][:PLACE_ROWS]
    if not likely:
        return []
    scale = _scale(found, finding.case.route)
    table = _table("place", "probability", "distance", "lat, lon")
    for place in likely:
        section = finding.case.route.sections[place.section]
        where = "" if place.lat is None or place.lon is None else f"{place.lat:.6f}, {place.lon:.6f}"
        distance = f"{scale(place.distance_m)} from {section.from_node}"
        table.add_row(place.name, f"{place.probability:.0%}", distance, where)
    return [_titled("Nearest places, most probable first", table)]


def _arrivals(finding: Finding) -> list[RenderableType]:
    fits = finding.estimate.fits if finding.estimate else {}
    zero = utc_text(finding.zero_ns)
    tables: list[RenderableType] = [Text(f"Times count from {zero}")] if zero else []
    index = 0
    for observation in finding.observations:
        table = _table("time", "u", "sign", "SNR", "taken for", "residual")
        for arrival in observation.picks.arrivals:
            table.add_row(*_arrival_row(arrival, finding.readings[index], fits.get(index)))
            index += 1
        if not observation.picks.arrivals:
            table.add_row("none stands out of the noise")
        tables.append(_titled(f"Arrivals at {observation.terminal.node} in the {observation.wave.name}", table))
    return tables


def _arrival_row(arrival: Arrival, reading: Reading, fit: Fit | None) -> tuple[str, ...]:
    scale, small = time_scale(reading.time_s, reading.u_s), time_scale(reading.u_s, reading.u_s)
    sign = "+" if arrival.polarity > 0 else "−"
    used = (fit.path, small(fit.residual_s)) if fit else ("not used", "")
    return scale(reading.time_s), small(reading.u_s), sign, f"{arrival.snr_db:.0f} dB", *used


def _budget(found: Estimate) -> Group:
    table = _table("input", "its u", "contribution")
    for row in found.budget[:BUDGET_ROWS]:
        u = time_text(row.u) if row.unit == "s" else f"{two_digits(row.u)} {row.unit}"
        table.add_row(row.input, u, length_text(row.metres))
    rest = found.budget[BUDGET_ROWS:]
    if rest:
        table.add_row(f"{len(rest)} more", "", length_text(sum(row.metres**2 for row in rest) ** 0.5))
    table.add_row("together", "", length_text(found.point.u_m), style="bold")
    return _titled("What the uncertainty is made of", table)


def _checks(finding: Finding) -> Group:
    table = _table("", "check", "what was seen")
    for gate in finding.checks:
        table.add_row("ok" if gate.passed else "mind", gate.name, gate.detail, style=None if gate.passed else "bold")
    return _titled("Checks", table)


def _repairs(finding: Finding) -> list[RenderableType]:
    rows = [(o.record.path.name, repair) for o in finding.observations for repair in o.record.repairs]
    if not rows:
        return []
    table = _table("file", "what", "where", "assumed", "how sure")
    for file, repair in rows:
        table.add_row(file, repair.what, repair.where, repair.assumed, repair.confidence)
    return [_titled("Repairs made in reading", table)]


def _cautions(finding: Finding) -> Group:
    table = _table("", "")
    table.show_header = False
    for number, caution in enumerate(cautions_for(finding.case.kind), 1):
        table.add_row(str(number), caution)
    return _titled("Cautions", table)


def _table(*columns: str) -> Table:
    table = Table(*columns, box=None, pad_edge=False, header_style="dim")
    table.padding = (0, 2, 0, 0)
    return table


def _titled(title: str, table: Table) -> Group:
    return Group(Text(title, style="bold"), table)
