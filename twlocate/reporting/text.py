"""A finding as text for people: the answer first, then what it rests on, then the cautions."""

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from twlocate.locating import Finding
from twlocate.position import Estimate, Piece
from twlocate.reporting.cautions import cautions_for
from twlocate.reporting.document import utc_text
from twlocate.reporting.lengths import Scale, length_scale, time_scale, two_digits
from twlocate.routes import Route

BUDGET_ROWS = 6
PLACE_ROWS = 8
SMALL_PROBABILITY = 0.005


def finding_text(finding: Finding) -> RenderableType:
    """Return the finding as something rich can print."""
    parts: list[RenderableType] = [Text(finding.case.title, style="bold")] if finding.case.title else []
    if finding.estimate:
        parts += _answer(finding.estimate, finding.case.route)
        parts += _places(finding)
    else:
        parts.append(Text(f"No position: {finding.reason}", style="bold"))
    parts += [_arrivals(finding)]
    if finding.estimate:
        parts.append(_budget(finding.estimate, finding.case.route))
    parts += [_checks(finding), *_repairs(finding), _cautions(finding)]
    return Group(*(Padding(part, (0, 0, 1, 0)) for part in parts))


def _scale(found: Estimate, route: Route) -> Scale:
    longest = max(section.length.value for section in route.sections)
    return length_scale(longest, found.point.u_m)


def _answer(found: Estimate, route: Route) -> list[RenderableType]:
    scale = _scale(found, route)
    section = route.sections[found.point.section]
    lines = [
        Text.assemble(
            ("Look at ", ""),
            (f"{scale(found.point.distance_m)} from {section.from_node}", "bold"),
            f" in {section.name} (standard uncertainty {scale(found.point.u_m)})",
        ),
        *(_band_line(piece, found, route, scale) for piece in found.band),
    ]
    answer: list[RenderableType] = [Group(*lines)]
    if len(found.alternatives) > 1 or not found.in_one_run:
        answer.append(_alternatives(found, route, scale))
    return answer


def _band_line(piece: Piece, found: Estimate, route: Route, scale: Scale) -> Text:
    section = route.sections[piece.section]
    back = section.length.value
    return Text(
        f"{found.coverage:.0%} band: {scale.number(piece.from_m)} to {scale(piece.to_m)} from {section.from_node} "
        f"({scale.number(back - piece.to_m)} to {scale(back - piece.from_m)} from {section.to_node})"
    )


def _alternatives(found: Estimate, route: Route, scale: Scale) -> Table:
    table = _table("Alternatives", "probability", "section", "from", "distance", "attribution")
    for row in found.alternatives:
        section = route.sections[row.point.section]
        distance = f"{scale.number(row.point.distance_m)} ± {scale(row.point.u_m)}"
        table.add_row(f"{row.probability:.1%}", section.name, section.from_node, distance, row.attribution)
    return table


def _places(finding: Finding) -> list[RenderableType]:
    likely = [place for place in finding.places if place.probability >= SMALL_PROBABILITY][:PLACE_ROWS]
    if not likely or finding.estimate is None:
        return []
    scale = _scale(finding.estimate, finding.case.route)
    table = _table("Nearest places, most probable first", "place", "section", "distance", "probability", "lat, lon")
    for place in likely:
        section = finding.case.route.sections[place.section]
        where = "" if place.lat is None or place.lon is None else f"{place.lat:.6f}, {place.lon:.6f}"
        distance = f"{scale(place.distance_m)} from {section.from_node}"
        table.add_row(place.name, section.name, distance, f"{place.probability:.0%}", where)
    return [table]


def _arrivals(finding: Finding) -> Table:
    zero = utc_text(finding.zero_ns)
    title = f"Arrivals, after {zero}" if zero else "Arrivals, from the start of the recording"
    table = _table(title, "terminal", "wave", "time", "u", "sign", "SNR", "taken for", "residual")
    arrivals = [(o, arrival) for o in finding.observations for arrival in o.picks.arrivals]
    for index, ((observation, arrival), reading) in enumerate(zip(arrivals, finding.readings, strict=True)):
        scale = time_scale(reading.time_s, reading.u_s)
        small = time_scale(reading.u_s, reading.u_s)
        fit = finding.estimate.fits.get(index) if finding.estimate else None
        table.add_row(
            observation.terminal.node,
            observation.wave.name,
            scale(reading.time_s),
            small(reading.u_s),
            "+" if arrival.polarity > 0 else "−",
            f"{arrival.snr_db:.0f} dB",
            fit.path if fit else "not used",
            small(fit.residual_s) if fit else "",
        )
    return table


def _budget(found: Estimate, route: Route) -> Table:
    table = _table("What the uncertainty is made of", "input", "u", "sensitivity", "contribution")
    scale = _scale(found, route)
    for row in found.budget[:BUDGET_ROWS]:
        u = f"{two_digits(row.u)} {row.unit}" if row.unit != "s" else time_scale(row.u, row.u)(row.u)
        table.add_row(row.input, u, f"{row.sensitivity:.3g} m per {row.unit}", scale(row.metres))
    rest = found.budget[BUDGET_ROWS:]
    if rest:
        table.add_row(f"{len(rest)} more", "", "", scale(sum(row.metres**2 for row in rest) ** 0.5))
    table.add_row("together", "", "", scale(found.point.u_m), style="bold")
    return table


def _checks(finding: Finding) -> Table:
    table = _table("Checks", "", "check", "what was seen")
    for gate in finding.checks:
        table.add_row("ok" if gate.passed else "mind", gate.name, gate.detail, style=None if gate.passed else "bold")
    return table


def _repairs(finding: Finding) -> list[RenderableType]:
    rows = [(o.record.path.name, repair) for o in finding.observations for repair in o.record.repairs]
    if not rows:
        return []
    table = _table("Repairs made in reading", "file", "what", "where", "assumed", "how sure")
    for file, repair in rows:
        table.add_row(file, repair.what, repair.where, repair.assumed, repair.confidence)
    return [table]


def _cautions(finding: Finding) -> Table:
    table = _table("Cautions", "", "")
    table.show_header = False
    for number, caution in enumerate(cautions_for(finding.case.kind), 1):
        table.add_row(str(number), caution)
    return table


def _table(title: str, *columns: str) -> Table:
    table = Table(*columns, title=title, title_justify="left", title_style="bold", box=None, pad_edge=False)
    table.padding = (0, 2, 0, 0)
    return table
