"""``twlocate inspect`` as a user meets it."""

import json

import pytest
from click.testing import CliRunner

from twlocate.commands.inspect import inspect

TABLE = "# rate: 500 Hz\n# start: 2026-03-02T04:11:07.25Z\npressure [kPa]\n" + "1\n2\n" * 20


@pytest.fixture
def run(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "a.csv").write_text(TABLE)
    return lambda *arguments: CliRunner().invoke(inspect, arguments)


def test_table_shows_what_a_practitioner_looks_for(run):
    result = run("a.csv")
    assert result.exit_code == 0
    for text in ("a.csv", "pressure", "kPa", "500 Hz", "2026-03-02T04:11:07.25"):
        assert text in result.stdout


def test_json_is_complete(run):
    facts = json.loads(run("a.csv", "--json").stdout)
    record = facts["records"][0]
    assert record["start_ns"] == 1772424667_250000000
    assert record["channels"][0]["greatest"] == 2.0
    assert facts["errors"] == []
    assert facts["cautions"]


def test_one_bad_file_does_not_hide_the_good_one(run, tmp_path):
    (tmp_path / "bad.csv").write_text("hello\n")
    result = run("bad.csv", "a.csv", "absent.cfg")
    assert result.exit_code == 2
    assert "pressure" in result.stdout
    assert "error: bad.csv: no line of numbers" in result.stderr
    assert "error: absent.cfg: there is no such file" in result.stderr
