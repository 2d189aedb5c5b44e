"""Measures the program and prints one table: what, asked, measured, met or missed.

Figures that are a matter of the machine are given as ratios to what the machine
allows, taken in the same run.
"""

import argparse
import json
import pathlib
import tempfile
import time

from benchmark import catalogue, figures, hidden_shift, limits, line, planning, state_vector
from benchmark.timing import Bench, Refused

PARTS = {
    "limits": limits.measure,
    "line": line.measure,
    "scaling": line.scaling,
    "hidden-shift": hidden_shift.measure,
    "state-vector": state_vector.measure,
    "circuits": catalogue.measure,
    "plan": planning.measure,
    "auto": planning.automatic,
}


def options():
    """The command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--program", required=True, help="the binary to measure")
    parser.add_argument("--seconds", type=float, default=5.0,
                        help="time to spend on each measurement (default 5)")
    parser.add_argument("--repeats", type=int, default=3,
                        help="times each is measured; the best counts (default 3)")
    parser.add_argument("--only", action="append", choices=PARTS, metavar="PART",
                        help=f"a part to measure, may be repeated: {', '.join(PARTS)}")
    parser.add_argument("--json", type=pathlib.Path, metavar="FILE",
                        help="also write the figures there")
    parser.add_argument("--profile", default="bench",
                        help="build profile of the Rust benchmarks (default bench)")
    return parser.parse_args()


def measured(part, bench):
    """The figures of a part; a refusal ends the part with a line that says so."""
    try:
        yield from PARTS[part](bench)
    except Refused as error:
        yield figures.refused(part, "the rest of this part", error, "to run")


def main():
    """Measures and prints, line by line."""
    chosen = options()
    found = []
    start = time.monotonic()
    print(figures.heading())
    with tempfile.TemporaryDirectory() as folder:
        bench = Bench(str(pathlib.Path(chosen.program).resolve()), pathlib.Path(folder),
                      chosen.seconds, chosen.repeats, chosen.profile)
        for part in chosen.only or PARTS:
            for figure in measured(part, bench):
                print(figure.line(), flush=True)
                found.append(figure.record())
                if chosen.json:
                    chosen.json.write_text(json.dumps(found, indent=1) + "\n")
    missed = sum(figure["met"] is False for figure in found)
    asked = sum(figure["met"] is not None for figure in found)
    print(f"\n{asked - missed} of {asked} asked figures met, "
          f"{time.monotonic() - start:.0f} s")


if __name__ == "__main__":
    main()
