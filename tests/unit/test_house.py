"""What holds for the repository as a whole."""

import subprocess
from pathlib import Path

import pytest

TOP = Path(__file__).parents[2]
AGREED = {
    "README.md", "DEVELOPERS.md", "pyproject.toml", "planner", "tests", "configs", "sample_targets",
}  # fmt: skip


@pytest.fixture(scope="module")
def files():
    listed = subprocess.run(
        ["git", "ls-files", "--cached", "--others", "--exclude-standard"],
        cwd=TOP, capture_output=True, text=True, check=True,
    )  # fmt: skip
    return [line for line in listed.stdout.splitlines() if (TOP / line).exists()]


def test_the_top_level_holds_exactly_what_was_agreed(files):
    top = {line.split("/")[0] for line in files}
    assert {name for name in top if not name.startswith(".")} == AGREED


def test_no_file_outgrows_its_room(files):
    long = {f: len((TOP / f).read_text().splitlines()) for f in files if f.endswith(".py")}
    assert {f: n for f, n in long.items() if n > 400} == {}


def test_every_room_says_what_it_is_for():
    rooms = [p for p in (TOP / "planner").iterdir() if p.is_dir() and p.name != "__pycache__"]
    assert len(rooms) == 17
    for room in rooms:
        text = (room / "__init__.py").read_text()
        assert text.startswith('"""'), room.name


def test_the_readme_gives_two_commands_that_exist():
    commands = [
        line[2:] for line in (TOP / "README.md").read_text().splitlines() if line.startswith("$ ")
    ]
    assert len(commands) == 2
    assert "planner plan configs/corran_pilot.yaml" in commands[0]
    assert (TOP / "configs" / "corran_pilot.yaml").is_file()
    assert commands[1].endswith("&& pytest")
