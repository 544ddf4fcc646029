"""A finding as plain data for JSON; the keys are stable (README, "What the JSON says")."""

from datetime import UTC, datetime, timedelta
from typing import Any

from twlocate.locating import Finding
from twlocate.position import Alternative, Piece, Point
from twlocate.reporting.cautions import cautions_for
from twlocate.routes import Route

NS = 1e-9
DIGITS = 10
"""Significant digits kept of computed values: more than any of them deserves, fewer than differ between machines."""


def finding_document(finding: Finding) -> dict[str, Any]:
    """Return the finding as nested dicts, lists, text and numbers."""
    route = finding.case.route
    found = finding.estimate
    return {
        "status": finding.status,
        "reason": finding.reason,
        "title": finding.case.title,
        "kind": finding.case.kind,
        "position": _point(found.point, route) if found else None,
        "coverage": found.coverage if found else None,
        "band": _band(found.band, route) if found else [],
        "alternatives": [_alternative(row, route) for row in found.alternatives] if found else [],
        "arrivals": _arrivals(finding),
        "time_zero": {"utc": utc_text(finding.zero_ns), "ns_since_1970": finding.zero_ns},
        "budget": _budget(finding),
        "places": [
            {
                "name": place.name,
                "section": route.sections[place.section].name,
                "distance_m": _round(place.distance_m),
                "probability": _round(place.probability),
                "lat": place.lat,
                "lon": place.lon,
            }
            for place in finding.places
        ],
        "checks": [{"name": gate.name, "passed": gate.passed, "detail": gate.detail} for gate in finding.checks],
        "repairs": _repairs(finding),
        "cautions": list(cautions_for(finding.case.kind)),
        "inputs": [{"file": file.file, "sha256": file.sha256} for file in finding.inputs],
        "version": finding.version,
    }


def utc_text(moment_ns: int | None) -> str | None:
    """Write integer nanoseconds since 1970 as ISO 8601 with nine decimals; None stays None."""
    if moment_ns is None:
        return None
    seconds, rest = divmod(moment_ns, 1_000_000_000)
    moment = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(seconds=seconds)
    return f"{moment:%Y-%m-%dT%H:%M:%S}.{rest:09d}Z"


def _round(value: float) -> float:
    return float(f"{value:.{DIGITS}g}")


def _point(point: Point, route: Route) -> dict[str, Any]:
    section = route.sections[point.section]
    return {
        "section": section.name,
        "from_node": section.from_node,
        "distance_m": _round(point.distance_m),
        "u_m": _round(point.u_m),
    }


def _band(pieces: tuple[Piece, ...], route: Route) -> list[dict[str, Any]]:
    return [
        {"section": route.sections[p.section].name, "from_m": _round(p.from_m), "to_m": _round(p.to_m)} for p in pieces
    ]


def _alternative(row: Alternative, route: Route) -> dict[str, Any]:
    return {
        "position": _point(row.point, route),
        "band": _band(row.band, route),
        "probability": _round(row.probability),
        "attribution": row.attribution,
    }


def _arrivals(finding: Finding) -> list[dict[str, Any]]:
    arrivals = [(o, arrival) for o in finding.observations for arrival in o.picks.arrivals]
    fits = finding.estimate.fits if finding.estimate else {}
    rows = []
    for index, ((observation, arrival), reading) in enumerate(zip(arrivals, finding.readings, strict=True)):
        fit = fits.get(index)
        rows.append(
            {
                "terminal": observation.terminal.node,
                "wave": observation.wave.name,
                "time_ns": _round(reading.time_s / NS),
                "u_ns": _round(reading.u_s / NS),
                "polarity": arrival.polarity,
                "snr_db": _round(arrival.snr_db),
                "outlier_probability": _round(arrival.outlier),
                "path": fit.path if fit else None,
                "residual_ns": _round(fit.residual_s / NS) if fit else None,
            }
        )
    return rows


def _budget(finding: Finding) -> list[dict[str, Any]]:
    rows = finding.estimate.budget if finding.estimate else ()
    return [
        {
            "input": row.input,
            "u": _round(row.u),
            "unit": row.unit,
            "sensitivity": _round(row.sensitivity),
            "contribution_m": _round(row.metres),
        }
        for row in rows
    ]


def _repairs(finding: Finding) -> list[dict[str, str]]:
    return [
        {
            "file": observation.record.path.name,
            "what": repair.what,
            "where": repair.where,
            "assumed": repair.assumed,
            "confidence": repair.confidence,
        }
        for observation in finding.observations
        for repair in observation.record.repairs
    ]
