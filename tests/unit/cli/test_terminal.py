"""Progress on a real terminal (a pseudo-terminal of this test) and without one."""

import os
import pty
import re
import subprocess
import sys
import termios
import time

import pytest

from planner.cli import terminal
from planner.cli.terminal import ProgressLine

STAGES = """
import sys, time
from planner.cli.terminal import ProgressLine
with ProgressLine(quiet=False) as progress:
    progress("nothing", 0, 0)
    progress("kept", 5, 5)
    for done in range(31):
        progress("trials", done, 30, "best 0.83")
        time.sleep(0.02)
        if done == 15:
            progress.say("one [line] above")
        if done == 20 and sys.argv[1:] == ["interrupted"]:
            raise SystemExit(3)
"""


def on_terminal(*arguments, columns=100, **environment):
    """Run the stages on a terminal; return exit status and what a terminal was sent."""
    parent, child = pty.openpty()
    termios.tcsetwinsize(child, (24, columns))
    process = subprocess.Popen(
        [sys.executable, "-c", STAGES, *arguments], stderr=child, stdin=child, stdout=child,
        env=os.environ | {"TERM": "xterm"} | environment,
    )  # fmt: skip
    os.close(child)
    sent = b""
    try:
        while piece := os.read(parent, 65536):
            sent += piece
    except OSError:  # the other end was closed
        pass
    os.close(parent)
    return process.wait(), sent.decode()


def without_codes(sent):
    return re.sub(r"\x1b\[[0-9;?]*[a-zA-Z]", "", sent)


def test_a_terminal_gets_a_bar_and_keeps_one_line():
    status, sent = on_terminal()
    assert status == 0
    assert "\x1b[?25l" in sent  # the cursor hidden
    assert sent.rindex("\x1b[?25h") > sent.rindex("\x1b[?25l")
    plain = without_codes(sent)
    assert re.search(r"trials [━╸╺]+ +\d+/30 \d\d:\d\d best 0\.83", plain)
    assert "one [line] above\r\n" in plain
    assert re.search(r"trials: 30 in \d s\r\n$", plain)
    assert "nothing" not in plain
    assert "kept" not in plain


def test_an_interruption_gives_the_cursor_back():
    status, sent = on_terminal("interrupted")
    assert status == 3
    assert sent.rindex("\x1b[?25h") > sent.rindex("\x1b[?25l")
    assert "trials: 30" not in sent


@pytest.mark.parametrize("columns", [12, 45])
def test_a_narrow_terminal_is_not_overrun(columns):
    _, sent = on_terminal(columns=columns)
    drawn = [
        line for line in re.split(r"[\r\n]+", without_codes(sent)) if re.search(r"\d/30", line)
    ]
    assert drawn
    assert max(map(len, drawn)) <= columns


def test_no_colour_where_none_is_wanted():
    _, coloured = on_terminal()
    _, plain = on_terminal(NO_COLOR="1")
    colours = re.compile(r"\x1b\[(3|9)\d")
    assert colours.search(coloured)
    assert not colours.search(plain)


def test_a_terminal_that_can_do_nothing_gets_lines():
    _, sent = on_terminal(TERM="dumb")
    assert sent.split("\r\n")[:2] == ["trials: 0/30, best 0.83", "one [line] above"]
    assert "\x1b" not in sent


def test_without_a_terminal_each_stage_has_a_line_at_its_ends(capsys):
    progress = ProgressLine(quiet=False)
    for done in range(4):
        progress("unrelated lines", done, 3)
    progress("trials", 2, 4, "best 0.7")
    progress("trials", 3, 4)
    progress("trials", 4, 4)
    assert capsys.readouterr().err.splitlines() == [
        "unrelated lines: 0/3",
        "unrelated lines: 3 in 0 s",
        "trials: 2/4, best 0.7",
        "trials: 4 in 0 s",
    ]


def test_long_stages_speak_now_and_then(capsys, monkeypatch):
    clock = iter(range(0, 10000, 10))
    monkeypatch.setattr(time, "monotonic", lambda: next(clock))
    progress = ProgressLine(quiet=False)
    for done in range(21):
        progress("trials", done, 20)
    lines = capsys.readouterr().err.splitlines()
    assert lines == [f"trials: {done}/20" for done in range(0, 20, 3)] + ["trials: 20 in 3 min"]


def test_quiet_is_silent_but_for_what_must_be_said(capsys):
    with ProgressLine(quiet=True) as progress:
        progress("trials", 0, 2)
        progress("trials", 2, 2)
        progress.say("set aside")
    assert capsys.readouterr().err == "set aside\n"


def test_drawing_is_loaded_only_for_a_terminal():
    code = (
        "import sys; from planner.cli.terminal import ProgressLine; p = ProgressLine(quiet=False);"
        "p('a', 0, 1); p('a', 1, 1); sys.exit('rich' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


@pytest.mark.parametrize(
    ("seconds", "words"), [(0.4, "0 s"), (99, "99 s"), (200, "3 min"), (8000, "2 h 13 min")]
)
def test_a_span_is_said_in_words(seconds, words):
    assert terminal._span(seconds) == words
