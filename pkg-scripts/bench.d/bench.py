"""Runs the benchmarks. A whole run replaces their tables in benches/results; a part of one goes to data/bench/results."""

import argparse
import json
import platform
import sys
from datetime import date

import accuracy
import adaptation
import asking
import page
import question
import sets
import trust

RESULTS = sets.ROOT / "benches" / "results"
PARTIAL = sets.DATA / "bench" / "results"
EPISODES, SEED = 300, 1


def say(text):
    print(text, file=sys.stderr, flush=True)


BENCHMARKS = {
    "accuracy": lambda asked: accuracy.run(asked.sets, asked.ways, asked.shots, asked.episodes, asked.seed, say),
    "adaptation": lambda asked: adaptation.run(say),
    "asking": lambda asked: asking.run(asked.repeats, asked.seed, say),
    "question": lambda asked: question.run(say),
    "trust": lambda asked: trust.run(asked.episodes, asked.seed, say),
    "page": lambda asked: page.run(say),
}


def listed(kind, allowed=None):
    """A comma-separated list as argparse reads it."""

    def read(text):
        values = [kind(part) for part in text.split(",")]
        for value in values:
            if allowed and value not in allowed:
                raise argparse.ArgumentTypeError(f"`{value}` is not one of {', '.join(allowed)}")
            if kind is int and value < 1:
                raise argparse.ArgumentTypeError("whole numbers from 1 on are needed")
        return values

    return read


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
    parser.add_argument("--sets", type=listed(str, accuracy.SETS), default=accuracy.SETS, help="accuracy: only these sets, as in icons-test,stamps")
    parser.add_argument("--ways", type=listed(int), default=accuracy.WAYS, help="accuracy: so many categories a task (default 5,20); a set with fewer takes all it has")
    parser.add_argument("--shots", type=listed(int), default=accuracy.SHOTS, help="accuracy: so many examples a category (default 1,2,5,10)")
    parser.add_argument("--episodes", type=int, default=EPISODES, help=f"accuracy: episodes a condition (default {EPISODES}; {accuracy.MANY} categories at once get at most {accuracy.EPISODES_OF_MANY})")
    parser.add_argument("--repeats", type=int, default=20, help="asking: so many piles a condition (default 20)")
    parser.add_argument("--seed", type=int, default=SEED)
    arguments = parser.parse_args()
    unknown = [what for what in arguments.what if what not in BENCHMARKS]
    if unknown:
        parser.error(f"there is no benchmark `{unknown[0]}`: choose from {', '.join(BENCHMARKS)}")
    if arguments.episodes < 2:
        parser.error("an interval needs at least 2 episodes, and 100 to mean anything")
    asked = [arguments.sets, arguments.ways, arguments.shots, arguments.seed]
    whole = asked == [accuracy.SETS, accuracy.WAYS, accuracy.SHOTS, SEED] and arguments.episodes >= EPISODES
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
        folder = RESULTS if whole or what != "accuracy" else PARTIAL
        folder.mkdir(parents=True, exist_ok=True)
        (folder / f"{what}.json").write_text(json.dumps(numbers, indent=1) + "\n")
        (folder / f"{what}.md").write_text(heading + table)
        print(table)
    sys.exit(failed)


if __name__ == "__main__":
    main()
