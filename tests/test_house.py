"""The order of the rooms (DEVELOPERS.md): a module imports only from rooms above its own in this list."""

import ast
from pathlib import Path

import twlocate

ROOMS = [
    "errors",
    "arrays",
    "folders",
    "quantity",
    "scales",
    "records",
    "waves",
    "media",
    "routes",
    "arrivals",
    "position",
    "forms",
    "simulation",
    "case",
    "observing",
    "locating",
    "calibrating",
    "validating",
    "reporting",
    "commands",
    "__main__",
]
FORBIDDEN = {
    "waves": {"records"},
    "media": {"records"},
    "routes": {"records"},
    "arrivals": {"routes", "records"},
    "position": {"records", "arrivals"},
    "simulation": {"position", "arrivals"},
    "reporting": {"simulation"},
}
"""Rooms further up that a room must know nothing of all the same."""

PACKAGE = Path(twlocate.__file__).parent


def room_of(module: str) -> str:
    return module.split(".")[1]


def imported_rooms(path: Path) -> set[str]:
    nodes = ast.walk(ast.parse(path.read_text(encoding="utf-8")))
    modules = [node.module for node in nodes if isinstance(node, ast.ImportFrom) and node.module]
    return {room_of(module) for module in modules if module.startswith("twlocate.")}


def test_rooms_import_only_from_rooms_above():
    wrong = []
    for path in sorted(PACKAGE.rglob("*.py")):
        room = path.relative_to(PACKAGE).parts[0].removesuffix(".py")
        if room == "__init__":
            continue
        allowed = set(ROOMS[: ROOMS.index(room) + 1]) - FORBIDDEN.get(room, set())
        wrong += [f"{path.relative_to(PACKAGE)} imports {other}" for other in imported_rooms(path) - allowed]
    assert not wrong
