"""``twlocate simulate`` from the scenario file to recordings that can be read and located."""

import json
import re
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from twlocate.__main__ import main
from twlocate.case import load_case
from twlocate.errors import CaseError
from twlocate.records import read
from twlocate.simulation.scenario import load_scenario

ROLES = '{ va = "U L1", vb = "U L2", vc = "U L3", ia = "I L1", ib = "I L2", ic = "I L3" }'

LINE = f"""
title = "Alder Bank – Thorn Cross (invented)"
kind = "line"

[[section]]
from = "Alder Bank"
to = "Thorn Cross"
length = "96.3 km ± 50 m"
speed = "294.9 m/us ± 0.5 m/us"
impedance = "385 ohm"
ground_speed = "272 m/us"
ground_impedance = "640 ohm"

[[terminal]]
node = "Alder Bank"
recording = "alder-bank.cfg"
channels = {ROLES}
clock = "± 0.1 us"
delay = "0.8 us ± 0.05 us"

[[terminal]]
node = "Thorn Cross"
recording = "thorn-cross.cfg"
channels = {ROLES}
clock = "± 0.1 us"
delay = "0.8 us ± 0.05 us"

[[end]]
node = "Alder Bank"
impedance = "120 ohm"

[[end]]
node = "Thorn Cross"
impedance = "190 ohm"

[event]
kind = "fault"
section = "Alder Bank-Thorn Cross"
distance = "31.4 km"
onset = "4 ms"
type = "bg"
resistance = "10 ohm"
voltage = "180 kV"
angle = "-20 degree"

[recorder]
rate = "1.25 MHz"
duration = "8 ms"
across_noise = 40.0
through_noise = 0.5
across_step = 12.2
through_step = 0.3
"""

MAIN = """
title = "Lark Hill main (invented)"
kind = "pipe"

[[section]]
from = "Works"
to = "Tank"
length = "4.2 km ± 4 m"
speed = "1150 m/s ± 8 m/s"
impedance = "4.1e6 Pa*s/m^3"
loss_rate = "0.01 1/s"

[[terminal]]
node = "Works"
recording = "works.csv"
channels = { p = "pressure", q = "flow" }
clock = "± 1 ms"

[[terminal]]
node = "Tank"
recording = "tank.csv"
channels = { p = "pressure" }
clock = "± 1 ms"

[[end]]
node = "Tank"
impedance = "8e6 Pa*s/m^3"

[event]
kind = "burst"
section = "Works–Tank"
distance = "1.6 km"
onset = "10 s"
outflow = "0.02 m^3/s"
opening = "30 ms"
pressure = "600 kPa"

[recorder]
rate = "250 Hz"
duration = "30 s"
across_noise = 100.0
"""


def simulated(tmp_path, text, *, seed=0, name="out"):
    scenario = tmp_path / "scenario.toml"
    scenario.write_text(text, encoding="utf-8")
    arguments = ["simulate", str(scenario), "--out", str(tmp_path / name), "--seed", str(seed)]
    return CliRunner().invoke(main, arguments), tmp_path / name


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize(("text", "limit_m"), [(LINE, 200.0), (MAIN, 40.0)], ids=["fault", "burst"])
def test_located_where_it_happened(tmp_path, text, limit_m, seed):
    result, folder = simulated(tmp_path, text, seed=seed)
    assert result.exit_code == 0
    found = json.loads(CliRunner().invoke(main, ["locate", str(folder / "case.toml"), "--json"]).stdout)
    truth = json.loads((folder / "truth.json").read_text(encoding="utf-8"))
    assert abs(found["position"]["distance_m"] - truth["distance_m"]) < limit_m


def test_burst_of_the_height_joukowsky_gives(tmp_path):
    # half of the outflow is fed from either side: Δp = Z·Q/2 on an endless pipe, doubled at the closed end
    _, folder = simulated(tmp_path, MAIN)
    record = read(folder / "works.csv")
    pressure = record.channels[0].samples
    assert pressure[:2000].mean() == pytest.approx(600e3, abs=20)  # 1e-4 of the 160 kPa it ends up lower
    after = pressure[int(11.7 * 250) : int(12.3 * 250)]  # past the front at 11.4 s, ahead of its echo by the break
    assert 600e3 - after.mean() == pytest.approx(4.1e6 * 0.02, rel=0.02)  # and a little friction


def test_line_recordings_hold_the_steady_state_and_the_step(tmp_path):
    _, folder = simulated(tmp_path, LINE)
    record = read(folder / "alder-bank.cfg")
    assert [c.name for c in record.channels] == ["U L1", "U L2", "U L3", "I L1", "I L2", "I L3"]
    before = np.abs(np.array([c.samples[:4500] for c in record.channels[:3]])).max()
    assert before == pytest.approx(180e3, rel=0.02)
    assert record.stretches[0].rate_hz == 1.25e6
    counts = record.channels[0].samples / 12.2
    assert np.allclose(counts, np.rint(counts), atol=1e-6)


def test_seed_decides_everything(tmp_path):
    folders = [simulated(tmp_path, MAIN, seed=seed, name=name)[1] for seed, name in ((1, "a"), (1, "b"), (2, "c"))]
    texts = [(folder / "works.csv").read_text(encoding="utf-8") for folder in folders]
    assert texts[0] == texts[1] != texts[2]


def test_case_file_keeps_what_a_case_may_hold(tmp_path):
    _, folder = simulated(tmp_path, LINE)
    case = load_case(folder / "case.toml")
    assert case.title == "Alder Bank – Thorn Cross (invented)"
    assert case.route.sections[0].length.u == pytest.approx(50.0)
    assert case.terminals[1].channels["ic"] == "I L3"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('distance = "31.4 km"', 'distance = "131.4 km"', "not inside the section of 96300 m"),
        ('impedance = "385 ohm"', 'impedance = "385 m"', "section 1, impedance: '385 m' cannot be read"),
        ('impedance = "120 ohm"', 'impedance = "-1 ohm"', "end 1, impedance: '-1 ohm' must be above 0 or 0"),
        ('resistance = "10 ohm"', 'resistance = "0 ohm"', "event, resistance: must be above 0"),
        ('rate = "1.25 MHz"', 'rate = "1.25 kHz"', "is 10 samples; it must be 64 to"),
        ('"thorn-cross.cfg"', '"alder-bank.cfg"', "'alder-bank.cfg' is named twice"),
        ('type = "bg"', 'type = "xg"', "'xg' is unknown; choose one of ag"),
        ('section = "Alder Bank-Thorn Cross"', 'section = "A-B"', "no section 'A-B'"),
        ('onset = "4 ms"', 'onset = "9 ms"', "not inside the recording"),
        ('impedance = "385 ohm"', 'impedance = "385 ohm"\nloss_rate = "-1 1/s"', "loss_rate -1 1/s is negative"),
        ('ground_speed = "272 m/us"', "", "three phases need ground_speed"),
        ('resistance = "10 ohm"', "resistance = 10", "write a number with its unit in quotes"),
        ('node = "Thorn Cross"\nimp', 'node = "Nowhere"\nimp', "'Nowhere' is not a node"),
        ('va = "U L1"', 'p = "U L1"', "'p' is not a role on a line"),
        ('kind = "line"', 'kind = "pipe"', "a fault cannot happen on a pipe"),
        ('duration = "8 ms"', 'duration = "8 ms"\ncolour = "blue"', "colour"),
        ('clock = "± 0.1 us"', 'clock = "± 1 s"', "before the record starts|leave no route|early"),
        ("[recorder]", "[recorder", "not a TOML text file"),
    ],
)
def test_wrong_scenarios_leave_nothing_behind(tmp_path, old, new, message):
    assert old in LINE
    result, folder = simulated(tmp_path, LINE.replace(old, new), seed=1)
    assert result.exit_code == 2
    assert re.search(message, result.stderr)
    assert "Traceback" not in result.stderr
    assert sorted(p.name for p in folder.parent.iterdir()) == ["scenario.toml"]


def test_existing_folder_and_missing_scenario_are_refused(tmp_path):
    simulated(tmp_path, MAIN)
    again, _ = simulated(tmp_path, MAIN)
    assert again.exit_code == 2
    assert "exists already; name a new folder" in again.stderr
    with pytest.raises(CaseError, match="give the path of a scenario file"):
        load_scenario(tmp_path / "none.toml")


TEE = (
    """
title = "Three legs (invented)"
kind = "pipe"

[[section]]
from = "North"
to = "Tee"
length = "2.1 km ± 2 m"
speed = "1150 m/s ± 3 m/s"
impedance = "4.1e6 Pa*s/m^3"

[[section]]
from = "Tee"
to = "East"
length = "1.7 km ± 2 m"
speed = "1150 m/s ± 3 m/s"
impedance = "4.1e6 Pa*s/m^3"

[[section]]
from = "Tee"
to = "South"
length = "2.6 km ± 2 m"
speed = "1020 m/s ± 3 m/s"
impedance = "9e6 Pa*s/m^3"
"""
    + "".join(
        f'[[terminal]]\nnode = "{node}"\nrecording = "{node}.csv"\nchannels = {{ p = "p" }}\nclock = "± 1 ms"\n'
        for node in ("North", "East", "South")
    )
    + """
[event]
kind = "burst"
section = "Tee-South"
distance = "900 m"
onset = "10 s"
outflow = "0.02 m^3/s"
opening = "30 ms"

[recorder]
rate = "250 Hz"
duration = "20 s"
across_noise = 80.0
"""
)


def test_burst_on_a_leg_of_a_tee_is_found_on_that_leg(tmp_path):
    result, folder = simulated(tmp_path, TEE)
    assert result.exit_code == 0
    found = json.loads(CliRunner().invoke(main, ["locate", str(folder / "case.toml"), "--json"]).stdout)
    assert found["position"]["section"] == "Tee–South"
    assert found["position"]["distance_m"] == pytest.approx(900.0, abs=25.0)


def test_recorder_adds_the_noise_that_was_asked_for(tmp_path):
    _, folder = simulated(tmp_path, MAIN)
    quiet = read(folder / "tank.csv").channels[0].samples[:2000]
    assert np.std(quiet) == pytest.approx(100.0, rel=0.05)


def test_delay_of_a_terminal_makes_its_record_late(tmp_path):
    exact = MAIN.replace("± 4 m", "± 0 m").replace("± 8 m/s", "± 0 m/s").replace("across_noise = 100.0", "")
    exact = exact.replace('clock = "± 1 ms"', "")
    delayed = exact.replace('node = "Tank"\nrecording', 'node = "Tank"\ndelay = "400 ms"\nrecording')
    records = [
        read(simulated(tmp_path, text, name=name)[1] / "tank.csv").channels[0].samples
        for name, text in (("on-time", exact), ("late", delayed))
    ]
    assert np.allclose(records[1][100:], records[0][:-100], atol=30.0)  # Pa, of a step of 60 kPa
    assert np.abs(records[1] - records[0]).max() > 1e4


def test_closed_end_has_no_flow(tmp_path):
    # the works are a closed end: pressure moves there, flow does not
    _, folder = simulated(tmp_path, MAIN.replace("across_noise = 100.0", ""))
    pressure, flow = (channel.samples for channel in read(folder / "works.csv").channels)
    assert np.abs(flow).max() < 1e-3 * 0.02
    assert pressure[-1] < pressure[0]


@pytest.mark.parametrize("name", ["line-fault", "main-burst"])
def test_the_scenarios_beside_the_recordings_are_found_again(tmp_path, name):
    scenario = Path(__file__).parents[2] / "recordings" / "scenarios" / f"{name}.toml"
    folder = tmp_path / "event"
    assert CliRunner().invoke(main, ["simulate", str(scenario), "--out", str(folder)]).exit_code == 0
    found = json.loads(CliRunner().invoke(main, ["locate", str(folder / "case.toml"), "--json"]).stdout)
    truth = json.loads((folder / "truth.json").read_text(encoding="utf-8"))
    assert found["status"] == "located"
    assert any(
        p["section"] == truth["section"] and p["from_m"] <= truth["distance_m"] <= p["to_m"] for p in found["band"]
    )
