"""README.md keeps its word: .ci/run executes the commands that stand in it."""

import importlib.util
from pathlib import Path
from types import ModuleType

import pytest


@pytest.fixture(scope="module")
def reader(repo: Path) -> ModuleType:
    """The script with which .ci/run takes commands out of the README."""
    path = repo / ".ci" / "readme_command.py"
    spec = importlib.util.spec_from_file_location("readme_command", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.mark.parametrize("name", ["demo", "test"])
def test_each_command_is_one_line_that_makes_its_own_environment(repo: Path, reader: ModuleType, name: str) -> None:
    """Where the system's Python refuses pip, the line still works, because it begins with a venv."""
    command = reader.readme_command(name, (repo / "README.md").read_text(encoding="utf-8"))
    assert "\n" not in command
    assert command.startswith("python3 -m venv .venv && .venv/bin/pip install ")


@pytest.mark.parametrize("name", ["demo", "test"])
def test_ci_runs_the_command_of_the_readme(repo: Path, name: str) -> None:
    assert f"readme_command.py {name})" in (repo / ".ci" / "run").read_text(encoding="utf-8")


def test_a_missing_or_doubled_command_is_refused(reader: ModuleType) -> None:
    block = "<!-- command: demo -->\n```sh\ntrue\n```\n"
    assert reader.readme_command("demo", block) == "true"
    for readme in ("", block + block, block.replace("demo", "test")):
        with pytest.raises(SystemExit):
            reader.readme_command("demo", readme)
