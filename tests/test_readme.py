"""README and examples: every command and every line of Python in them runs, every key is listed."""

from __future__ import annotations

import re
import shlex
import shutil

import pytest
from conftest import PROJECT

from rfstage.cli import COMMANDS
from rfstage.jobfields import JOB_FIELDS

README = (PROJECT / "README.md").read_text(encoding="utf-8")
SHELL = [line for block in re.findall(r"```sh\n(.*?)```", README, re.S) for line in block.splitlines()]
COMMAND_LINES = [line for line in SHELL if line.startswith("rfstage ")]
PYTHON = re.findall(r"```python\n(.*?)```", README, re.S)


def test_there_are_commands_to_run():
    assert len(COMMAND_LINES) >= 6
    assert {line.split()[1] for line in COMMAND_LINES} >= set(COMMANDS)


@pytest.mark.parametrize("line", COMMAND_LINES)
def test_every_command_of_the_readme_runs(run, tmp_path, line):
    shutil.copytree(PROJECT / "examples", tmp_path / "examples")
    shutil.copy(PROJECT / "examples" / "gallery-antenna.s1p", tmp_path / "antenna.s1p")
    done = run(*shlex.split(line)[1:])
    assert done.stderr == ""
    assert done.returncode in (0, 1)
    assert done.stdout


@pytest.mark.parametrize("script", PYTHON)
def test_the_python_of_the_readme_runs(script, monkeypatch, capsys):
    monkeypatch.chdir(PROJECT)
    exec(compile(script, "README", "exec"), {})
    assert "ohm, second harmonic" in capsys.readouterr().out


def test_the_first_command_of_the_readme_succeeds(run):
    first = SHELL[0].split("&&")[-1]
    words = shlex.split(first.replace("examples/", f"{PROJECT}/examples/"))
    assert words[0] == ".venv/bin/rfstage"
    assert run(*words[1:]).returncode == 0


def test_every_job_key_is_in_the_readme_with_its_help():
    for field in JOB_FIELDS:
        assert f"| `{field.path}` |" in README
        assert field.help in README


@pytest.mark.parametrize("path", sorted((PROJECT / "examples").glob("*")), ids=lambda path: path.name)
def test_every_example_says_that_its_values_are_invented(path):
    assert "invented" in path.read_text(encoding="utf-8").lower()


def test_no_path_of_a_machine_and_no_registry_is_in_the_tree():
    bad = re.compile("/(?:home|root|work" + "|tmp)/|pypi" + r"\.org|files\.python" + "hosted")
    for path in PROJECT.rglob("*"):
        inside = path.relative_to(PROJECT).parts
        if (
            path.is_file()
            and not any(part.startswith(".") or part == "__pycache__" for part in inside)
            and path.suffix in (".py", ".md", ".toml", ".s1p", ".txt")
        ):
            assert not bad.search(path.read_text(encoding="utf-8")), path
