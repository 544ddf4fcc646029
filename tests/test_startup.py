"""Start-up is a feature: help loads no numeric library, and the main path loads none that it does not need."""

import json
import subprocess
import sys
from pathlib import Path

HEAVY = ["numpy", "scipy", "pywt", "matplotlib", "pydantic", "pint", "rich"]


def loaded_by(*arguments: str) -> set[str]:
    """Run the command line in a fresh interpreter; return the modules it loaded."""
    script = (
        "import sys, json\n"
        "from twlocate.__main__ import main\n"
        f"try: main({list(arguments)!r})\n"
        "except SystemExit: pass\n"
        "sys.stderr.write('\\n' + json.dumps(sorted(sys.modules)))"
    )
    run = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return set(json.loads(run.stderr.splitlines()[-1]))


def test_help_loads_no_numeric_library():
    assert not loaded_by("--help") & set(HEAVY)


def test_help_of_each_command_loads_no_numeric_library():
    for command in ("locate", "inspect", "simulate", "speed"):
        assert not loaded_by(command, "--help") & set(HEAVY)


def test_the_main_path_loads_only_what_it_needs():
    case = Path(__file__).parents[1] / "recordings" / "line-fault" / "case.toml"
    loaded = loaded_by("locate", str(case), "--json")
    assert {"numpy", "pywt", "pydantic", "pint"} <= loaded
    heavy = {"scipy.signal", "scipy.special", "scipy.linalg", "scipy.optimize", "matplotlib", "rich.table"}
    assert not loaded & heavy  # pint looks whether scipy is there, which loads none of its parts
