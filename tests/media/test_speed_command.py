"""``twlocate speed`` from the command line: published answers, pasted into a case file, and its refusals."""

import re
import tomllib

import pytest
from click.testing import CliRunner

from twlocate.__main__ import main
from twlocate.quantity import parse_quantity

WATER = ["--density", "1000 kg/m^3", "--bulk-modulus", "2.03 GPa"]
PIPE = ["pipe", "--bore", "300 mm", "--wall", "7 mm", "--young", "160 GPa", "--poisson", "0", "--anchorage", "joints"]
LINE = [
    "line",
    *("--phase", "-7.5 m, 24 m", "--phase", "0 m, 24 m", "--phase", "7.5 m, 24 m", "--ground-wire", "0 m, 31 m"),
    *("--radius", "14.3 mm ± 0.2 mm", "--resistance", "0.055 ohm/km", "--sag", "9 m ± 1 m"),
]
CABLE = [
    "cable",
    *("--core", "10 mm", "--insulation-in", "11 mm", "--insulation-out", "18 mm", "--sheath", "19 mm"),
    *("--permittivity", "2.3 ± 0.1", "--resistance", "0.047 ohm/km"),
]


def run(*arguments):
    return CliRunner().invoke(main, ["speed", *arguments])


def speeds(output):
    return [parse_quantity(text, "m/s") for text in re.findall(r'^speed = "(.*)"', output, re.M)]


def test_pipe_of_the_design_standard():
    # MAFF Japan, "Pipeline" standard, ch. 8: 1146.7 m/s by the thin wall; the thick-wall factor is 2·7/300 higher
    # and 300/307 of the rest: 1.0239, which lowers the speed to 1142.0 m/s (recomputed)
    result = run(*PIPE, *WATER)
    assert result.exit_code == 0
    assert speeds(result.output)[0].value == pytest.approx(1142.0, abs=0.6)
    assert "no input was given with an uncertainty" in result.output


def test_output_can_be_pasted_into_a_case_file():
    for arguments in ([*PIPE, *WATER], CABLE):
        table = tomllib.loads("[[section]]\n" + run(*arguments).output)["section"][0]
        assert set(table) == {"speed", "impedance"}


def test_line_gives_an_aerial_and_a_ground_mode():
    aerial, ground = speeds(run(*LINE).output)
    assert 0.985 < aerial.value / 299_792_458 < 1
    assert ground.value < aerial.value
    assert ground.u > aerial.u > 0


def test_permittivity_is_named_with_its_share():
    # v ∝ ε^(−1/2), so 0.1/2.3 in ε is half of that in v
    result = run(*CABLE)
    speed = speeds(result.output)[0]
    assert speed.u / speed.value == pytest.approx(0.5 * 0.1 / 2.3, rel=0.03)
    assert re.search(r"permittivity .*\(100%\)", result.output)


def test_gas_and_water_by_name():
    pytest.importorskip("CoolProp", reason="CoolProp is not installed (pip install twlocate[fluids])")
    gas = run("gas", "--bore", "0.6 m", "--mixture", "Methane", "--temperature", "300 K", "--pressure", "5 MPa")
    # U. Setzmann and W. Wagner, J. Phys. Chem. Ref. Data 20, 1991, through CoolProp: 439.2547 m/s
    assert speeds(gas.output)[0].value == pytest.approx(439.255, abs=2e-3)
    steam = run(*PIPE, "--temperature", "200 degC")
    assert steam.exit_code == 2
    assert "Water is a gas at 473.15 K" in steam.stderr
    water = run(*PIPE[:-2], "--temperature", "20 degC ± 2 K")
    assert re.search(r"temperature .*100%", water.output)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ([*PIPE, "--density", "1000 kg/m^3"], "go together"),
        ([*PIPE, *WATER, "--wall", "7"], "has no unit"),
        ([*PIPE, *WATER, "--wall", "-7 mm"], "wall -0.007 .* is not positive"),
        ([*PIPE, *WATER, "--gas-fraction", "0.7"], "gas fraction 0.7 is not in 0 to 0.5"),
        ([*LINE, "--phase", "0 m, 24 m"], "two conductors are in one place"),
        ([*LINE, "--phase", "3 m"], "is not a place"),
        ([*LINE, "--resistance", "0 ohm/km"], "resistance of a conductor is not above 0"),
        ([*LINE, "--wire-radius", "0 m"], "radius of a conductor is not above 0"),
        ([*LINE, "--sag", "40 m"], "must be above the ground"),
        ([*LINE, "--frequency", "0 Hz"], "is not positive"),
        ([*CABLE, "--permittivity", "0.9"], "below 1, that of a vacuum"),
        ([*CABLE, "--sheath", "12 mm"], "do not grow outwards"),
    ],
)
def test_refusals_are_one_line_and_status_2(arguments, message):
    result = run(*arguments)
    assert result.exit_code == 2
    assert re.search(message, result.stderr)
    assert "Traceback" not in result.stderr
