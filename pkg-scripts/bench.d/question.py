"""Times the next question in WebAssembly under Node: from an answer to the sorted pile and the item to ask about."""

import json
import subprocess
from pathlib import Path

import numpy as np

import sets

WASM = sets.ROOT / "www" / "kit" / "wasm"
JOB = {"dimension": 1280, "categories": 10, "answers": 40, "seed": 1}
# Items, and at most so many milliseconds for the next question.
PILES = {2000: 100, 20000: 1000}


def run(say):
    """Measures both piles: (numbers, Markdown)."""
    if not (WASM / "kenspeckle_bg.wasm").exists():
        raise sets.Unmeasured("the WebAssembly module is not built: run pkg-scripts/build first")
    version = subprocess.run(["node", "--version"], capture_output=True, text=True, check=True).stdout.strip()
    piles = {}
    for items in PILES:
        say(f"the next question among {items} items")
        command = ["node", Path(__file__).with_suffix(".mjs"), WASM]
        done = subprocess.run(command, input=json.dumps({**JOB, "items": items}), capture_output=True, text=True, check=False)
        if done.returncode:
            raise sets.Unmeasured(f"question.mjs failed: {done.stderr.strip()}")
        piles[items] = json.loads(done.stdout)
    numbers = {"node": version, "job": JOB, "asked_milliseconds": PILES, "piles": piles}
    return numbers, table(numbers)


def table(numbers):
    """The numbers as Markdown."""
    job = numbers["job"]
    text = f"## From an answer to the next question, in WebAssembly under Node {numbers['node']}, one thread\n\n"
    text += f"{job['categories']} categories, {job['dimension']} dimensions, drawn vectors, {job['answers']} answers to the sorter's own questions. Milliseconds: the pile sorted\n"
    text += "anew and the next item chosen; all that the page shows besides (the best strip, the outlook). The first question finds who is like whom.\n\n"
    text += "| items | median | largest | processor time, median | asked for | strip and outlook, processor, median | the first question, processor | memory, MB |\n| --- | --- | --- | --- | --- | --- | --- | --- |\n"
    for items, pile in numbers["piles"].items():
        # Before two trays have an answer nothing is sorted.
        times = {kind: [one[kind] for one in pile["next"][job["categories"] :]] for kind in ("clock", "processor")}
        rest = np.median([one["rest"]["processor"] for one in pile["whole"]])
        text += f"| {items} | {np.median(times['clock']):.0f} | {max(times['clock']):.0f} | {np.median(times['processor']):.0f} | ≤ {numbers['asked_milliseconds'][items]} "
        text += f"| {rest:.0f} | {pile['first']['processor']:.0f} | {pile['memory'] / 1e6:.0f} |\n"
    text += "\nA busy machine moves all but the processor times.\n"
    return text
