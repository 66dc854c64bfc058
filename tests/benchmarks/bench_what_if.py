"""How long an answer takes: ``python bench_what_if.py [FILE]``; median and worst of each question.

Questions are asked of every target of the demo, after one to warm up.
"""

import sys
import time
from pathlib import Path
from statistics import median

from planner.what_if import WhatIf

DEMO = Path(__file__).parents[2] / "configs" / "corran_pilot.yaml"
QUESTIONS = {
    "seasons a month later": {"shift_d": 30.0},
    "spectra every 3 nights": {"cadence_line_nights": 3.0},
    "twice the exposure": {"exposure_line": 2.0},
    "the largest layout": {"cadence_line_nights": 2.0, "season_length_d": 180.0, "seasons": 2},
}

if __name__ == "__main__":
    start = time.perf_counter()
    ask = WhatIf(sys.argv[1] if len(sys.argv) > 1 else DEMO)
    print(f"reading, sky and lags: {time.perf_counter() - start:.1f} s")
    for target in ask.targets:
        ask.ask(target)
    for words, changes in QUESTIONS.items():
        took = []
        for target in ask.targets:
            start = time.perf_counter()
            ask.ask(target, **changes)
            took.append(1e3 * (time.perf_counter() - start))
        print(f"{words:24s} median {median(took):5.0f} ms, worst {max(took):5.0f} ms")
