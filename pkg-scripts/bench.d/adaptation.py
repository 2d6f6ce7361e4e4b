"""Times learning: a few examples in WebAssembly under Node, and a starter from many past categories with the native program."""

import json
import resource
import subprocess
import tempfile
import time
from pathlib import Path

import numpy as np

import embed
import sets

WASM = sets.ROOT / "www" / "kit" / "wasm"
DIMENSION = 1280
JOB = {
    "dimension": DIMENSION,
    "categories": 10,
    "examples": 5,
    "learners": ["prototype", "ridge", "gradient", "auto"],
    "rounds": 200,
    "warmUp": 20,
    "seed": 1,
}
# At most so many milliseconds were asked for; nothing for the mix of all.
MOST_MILLISECONDS = {"prototype": 3, "ridge": 3, "gradient": 10}
PAST_CATEGORIES, PAST_EXAMPLES = 580, 8
MOST_SECONDS_OF_STARTER = 15
STARTERS = 3


def adapt():
    """Milliseconds of each round, by learner."""
    if not (WASM / "kenspeckle_bg.wasm").exists():
        raise sets.Unmeasured("the WebAssembly module is not built: run pkg-scripts/build first")
    command = ["node", Path(__file__).with_suffix(".mjs"), WASM]
    done = subprocess.run(command, input=json.dumps(JOB), capture_output=True, text=True, check=False)
    if done.returncode:
        raise sets.Unmeasured(f"adaptation.mjs failed: {done.stderr.strip()}")
    return json.loads(done.stdout)


def processor_seconds():
    """What the programs started here have used so far; unlike the clock it hardly minds a busy machine."""
    usage = resource.getrusage(resource.RUSAGE_CHILDREN)
    return usage.ru_utime + usage.ru_stime


def learn_starters(say):
    """Seconds that `kenspeckle learn` takes on vectors of past categories, each time: (by the clock, of the processor)."""
    embed.build(say)
    random = np.random.Generator(np.random.PCG64(1))
    shape = (PAST_CATEGORIES, PAST_EXAMPLES, DIMENSION)
    vectors = random.random((PAST_CATEGORIES, 1, DIMENSION)) ** 4 + random.random(shape) ** 4
    seconds = []
    with tempfile.TemporaryDirectory(prefix="kenspeckle-starter-") as folder:
        np.save(f"{folder}/past.npy", vectors.reshape(-1, DIMENSION).astype(np.float32))
        Path(folder, "labels.csv").write_text("".join(f"{category}\n" * PAST_EXAMPLES for category in range(PAST_CATEGORIES)))
        for _ in range(STARTERS):
            start, used = time.perf_counter(), processor_seconds()
            command = [embed.PROGRAM, "learn", "past.npy", "--labels", "labels.csv", "--out", "new.starter"]
            done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
            if done.returncode:
                raise sets.Unmeasured(f"`kenspeckle learn` failed: {done.stderr.strip()}")
            seconds.append((time.perf_counter() - start, processor_seconds() - used))
            Path(folder, "new.starter").unlink()
    return seconds


def run(say):
    """Measures both: (numbers, Markdown)."""
    say("learning in WebAssembly")
    times = adapt()
    say("learning a starter")
    seconds = learn_starters(say)
    version = subprocess.run(["node", "--version"], capture_output=True, text=True, check=True).stdout.strip()
    numbers = {
        "node": version,
        "job": JOB,
        "milliseconds": {n: {"least": min(t), "median": float(np.median(t)), "95th percentile": float(np.percentile(t, 95))} for n, t in times.items()},
        "asked_milliseconds": MOST_MILLISECONDS,
        "starter": {"categories": PAST_CATEGORIES, "examples": PAST_EXAMPLES, "dimension": DIMENSION, "seconds": seconds},
        "asked_starter_seconds": MOST_SECONDS_OF_STARTER,
    }
    return numbers, table(numbers)


def table(numbers):
    """The numbers as Markdown."""
    job, starter = numbers["job"], numbers["starter"]
    size = f"{job['categories']} categories × {job['examples']} examples, {job['dimension']} dimensions"
    text = f"## From an answer to the sorted examples, in WebAssembly under Node {numbers['node']}, one thread\n\n"
    text += f"{size}; {job['rounds']} answers, drawn vectors. Milliseconds to learn anew with leave-one-out and sort all items.\n\n"
    text += "| | least | median | 95th percentile | asked for, median |\n| --- | --- | --- | --- | --- |\n"
    for name, t in numbers["milliseconds"].items():
        asked = numbers["asked_milliseconds"].get(name)
        text += f"| {name} | {t['least']:.2f} | {t['median']:.2f} | {t['95th percentile']:.2f} | {f'≤ {asked}' if asked else '–'} |\n"
    text += "\n## Learning a starter, native program, one thread\n\n"
    text += f"{starter['categories']} categories × {starter['examples']} items, {starter['dimension']} dimensions, {len(starter['seconds'])} times, reading and writing included: "
    text += f"{', '.join(f'{clock:.1f}' for clock, _ in starter['seconds'])} s by the clock, "
    text += f"{', '.join(f'{used:.1f}' for _, used in starter['seconds'])} s of processor time; at most {numbers['asked_starter_seconds']} s was asked for.\n"
    text += "\nA busy machine moves all but the least times and the processor time: measure on a quiet one.\n"
    return text
