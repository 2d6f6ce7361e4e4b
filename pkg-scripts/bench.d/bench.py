"""Runs the benchmarks and writes their tables to benches/results."""

import argparse
import json
import platform
import sys
from datetime import date

import accuracy
import page
import sets

RESULTS = sets.ROOT / "benches" / "results"


def say(text):
    print(text, file=sys.stderr, flush=True)


BENCHMARKS = {
    "accuracy": lambda arguments: accuracy.run(arguments.episodes, arguments.seed, say),
    "page": lambda arguments: page.run(say),
}


def machine():
    """What the numbers were measured on."""
    model = platform.machine()
    try:
        with open("/proc/cpuinfo", encoding="utf-8") as file:
            model = next((line.split(":", 1)[1].strip() for line in file if line.startswith("model name")), model)
    except OSError:
        pass
    return f"{model}, {platform.system()}"


def main():
    parser = argparse.ArgumentParser(prog="pkg-scripts/bench", description=__doc__)
    parser.add_argument("what", nargs="*", metavar="WHAT", help=f"what to measure: {', '.join(BENCHMARKS)}; all of them when left out")
    parser.add_argument("--episodes", type=int, default=300, help="episodes a set and shot, at least 100 to mean anything (default 300)")
    parser.add_argument("--seed", type=int, default=1)
    arguments = parser.parse_args()
    unknown = [what for what in arguments.what if what not in BENCHMARKS]
    if unknown:
        parser.error(f"there is no benchmark `{unknown[0]}`: choose from {', '.join(BENCHMARKS)}")
    if arguments.episodes < 2:
        parser.error("an interval needs at least 2 episodes, and 100 to mean anything")
    failed = False
    for what in arguments.what or BENCHMARKS:
        try:
            numbers, table = BENCHMARKS[what](arguments)
        except sets.Unmeasured as reason:
            print(f"{what}: not measured: {reason}", file=sys.stderr)
            failed = True
            continue
        numbers = {"measured": date.today().isoformat(), "machine": machine(), **numbers}
        heading = f"<!-- made by pkg-scripts/bench {what} -->\n\nMeasured on {numbers['machine']}, {numbers['measured']}.\n\n"
        RESULTS.mkdir(parents=True, exist_ok=True)
        (RESULTS / f"{what}.json").write_text(json.dumps(numbers, indent=1) + "\n")
        (RESULTS / f"{what}.md").write_text(heading + table)
        print(table)
    sys.exit(failed)


if __name__ == "__main__":
    main()
