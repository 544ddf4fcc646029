"""Write what was simulated: recordings, the truth, and a case file that is ready to be located."""

import json
from pathlib import Path
from typing import Any

from twlocate.records import Channel, Clock, Record, Stretch, write_comtrade
from twlocate.simulation.running import Simulated, Trace
from twlocate.simulation.scenario import RecorderForm, Scenario, SimulatedTerminal

START_NS = 1_767_225_600_000_000_000
"""2026-01-01T00:00:00Z, for every scenario."""
START_TEXT = "2026-01-01T00:00:00.000000000Z"

UNITS = {"v": "V", "i": "A", "p": "Pa", "q": "m**3/s"}
_SCENARIO_ONLY = ("event", "recorder", "end")
_SECTION_ONLY = ("loss_rate", "ground_speed", "ground_impedance")


def write_simulated(scenario: Scenario, tables: dict[str, Any], simulated: Simulated, folder: Path) -> Path:
    """Write everything into an existing folder and return the case file's path; `tables` is the scenario as read."""
    for terminal, traces in zip(scenario.terminal, simulated.traces, strict=True):
        write = _write_comtrade if terminal.recording.endswith(".cfg") else _write_table
        write(folder / terminal.recording, terminal, traces, scenario.recorder)
    text = json.dumps(simulated.truth, indent=2, ensure_ascii=False) + "\n"
    (folder / "truth.json").write_text(text, encoding="utf-8")
    case = folder / "case.toml"
    case.write_text(case_text(tables), encoding="utf-8")
    return case


def case_text(tables: dict[str, Any]) -> str:
    """Return the part of a scenario that a case file may hold, as TOML."""
    lines = []
    for key, value in tables.items():
        if key in _SCENARIO_ONLY:
            continue
        if not isinstance(value, list):
            lines.append(f"{key} = {_toml(value)}")
            continue
        for row in value:
            kept = {name: entry for name, entry in row.items() if name not in _SECTION_ONLY}
            lines += ["", f"[[{key}]]", *(f"{name} = {_toml(entry)}" for name, entry in kept.items())]
    return "\n".join(lines) + "\n"


def _toml(value: Any) -> str:
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{key} = {_toml(entry)}" for key, entry in value.items()) + " }"
    return json.dumps(value, ensure_ascii=False)  # a JSON string is a TOML basic string


def _write_comtrade(path: Path, terminal: SimulatedTerminal, traces: tuple[Trace, ...], recorder: RecorderForm) -> None:
    record = Record(
        path=path,
        format="",
        channels=tuple(_channel(terminal, trace, recorder) for trace in traces),
        stretches=(Stretch(0, traces[0].samples.size, 0.0, recorder.rate.value),),
        station=terminal.node,
        device="simulated recorder",
        start_ns=START_NS,
        resolution_ns=1,
        line_frequency_hz=50.0,
        clock=Clock(u_s=terminal.clock.u),
    )
    write_comtrade(record, path, "BINARY32")


def _channel(terminal: SimulatedTerminal, trace: Trace, recorder: RecorderForm) -> Channel:
    step = recorder.across_step if trace.role[0] in "vp" else recorder.through_step
    return Channel(
        terminal.channels[trace.role], UNITS[trace.role[0]], trace.samples, step=step or None, side="primary"
    )


def _write_table(path: Path, terminal: SimulatedTerminal, traces: tuple[Trace, ...], recorder: RecorderForm) -> None:
    head = [f"# rate: {recorder.rate.value:.12g} Hz", f"# start: {START_TEXT}"]
    names = ",".join(f"{terminal.channels[trace.role]} [{UNITS[trace.role[0]]}]" for trace in traces)
    rows = (",".join(f"{value:.9g}" for value in row) for row in zip(*(t.samples for t in traces), strict=True))
    path.write_text("\n".join([*head, names, *rows]) + "\n", encoding="utf-8")
