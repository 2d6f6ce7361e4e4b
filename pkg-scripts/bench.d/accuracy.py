"""How well each learner sorts, beside scikit-learn on the same episodes."""

import csv
import json
import subprocess
import time

import numpy as np

import embed
import episodes
import references
import sets

CONDITIONS = [("icons-test", 1), ("icons-test", 5), ("stamps", 1), ("stamps", 5)]
TITLES = {"icons-test": "drawn icons", "stamps": "stamps"}
WAY = 5
LEARNERS = ["prototype", "ridge", "gradient", "auto"]
STARTED = "in the pile, with a starter"
MODES = ["one by one", "in the pile", STARTED]
# What the starter learns from: names that no benchmark sorts.
PAST = "icons-learn"
# What Auto is compared with: (how Auto sorts, the spaces that scikit-learn is given).
COMPARISONS = {
    "both one by one": ("one by one", references.ONE_BY_ONE),
    "both in the pile": ("in the pile", references.SPACES),
    "Auto in the pile, scikit-learn one by one": ("in the pile", references.ONE_BY_ONE),
}


def interval(values):
    """Mean and half the width of its 95 % interval over episodes."""
    values = np.asarray(values)
    return float(values.mean()), float(1.96 * values.std(ddof=1) / len(values) ** 0.5)


def starter(say):
    """The starter from the drawn icons that are not held out."""
    embed.vectors_of(PAST, say)
    say(f"learning a starter from {PAST}")
    vectors, labels = sets.VECTORS / f"{PAST}.npy", sets.DATA / "bench" / f"{PAST}.labels.csv"
    file = labels.with_name(f"{PAST}.starter")
    labels.parent.mkdir(parents=True, exist_ok=True)
    with open(labels, "w", newline="", encoding="utf-8") as out:
        csv.writer(out).writerows([category] for category in sets.read_categories(PAST))
    embed.build(say)
    start = time.perf_counter()
    subprocess.run([embed.PROGRAM, "learn", vectors, "--labels", labels, "--out", file], check=True, capture_output=True)
    return file, time.perf_counter() - start


def measure(name, shot, count, seed, file, say):
    path, header, _ = episodes.write(name, WAY, shot, count, seed)
    say(f"{name} {WAY}-way {shot}-shot: {count} episodes")
    flags = ["--non-negative"] if sets.ALL[name].non_negative else []
    flags.append(f"--starter={file}")
    vectors = sets.VECTORS / f"{name}.npy"
    ours = json.loads(embed.cargo(["bench", "--features", "cli", "--bench", "episodes", "--", str(vectors), str(path), *flags]))
    theirs = references.run(path, list(references.SPACES), say=say)
    summary = {**header, "kenspeckle": {}, "scikit-learn": {}, "auto_minus": {}, "best": {}}
    for space, methods in theirs.items():
        summary["scikit-learn"][space] = {method: summarise(measured) for method, measured in methods.items()}
    for mode in MODES:
        summary["kenspeckle"][mode] = {name: summarise(measured) | {"milliseconds": measured["milliseconds"]} for name, measured in ours[mode].items()}
        auto = np.array(ours[mode]["auto"]["accuracy"])
        others = {f"Kenspeckle {name}": measured for name, measured in ours[mode].items() if name != "auto"}
        others |= {f"{method}; {space}": measured for space, methods in theirs.items() for method, measured in methods.items()}
        # A method may have had only the first episodes.
        summary["auto_minus"][mode] = {name: interval(100 * (auto[: len(one["accuracy"])] - one["accuracy"])) for name, one in others.items()}
    summary["starter_minus_none"] = {
        name: interval(100 * (np.array(ours[STARTED][name]["accuracy"]) - ours["in the pile"][name]["accuracy"])) for name in LEARNERS
    }
    for comparison, (mode, spaces) in COMPARISONS.items():
        rivals = [f"{method}; {space}" for space in spaces for method in theirs[space]]
        # Chosen in hindsight, which favours scikit-learn.
        summary["best"][comparison] = min(rivals, key=lambda name: summary["auto_minus"][mode][name][0])
    return summary


def summarise(measured):
    accuracy, half = interval(100 * np.array(measured["accuracy"]))
    result = {"accuracy": accuracy, "accuracy_half_interval": half}
    if measured["log_loss"]:
        result["log_loss"], result["log_loss_half_interval"] = interval(measured["log_loss"])
    return result


def row(cells):
    return "| " + " | ".join(cells) + " |\n"


def table(summaries):
    """The numbers as Markdown."""
    columns = [f"{TITLES[s['set']]}, {s['shot']}-shot" for s in summaries]
    head = row(["", *columns]) + row(["---"] * (len(columns) + 1))

    def rows(cell):
        """A row for each of our learners in each mode and each reference in each space, where any cell has a number."""
        text = head
        for mode in MODES:
            for name in LEARNERS:
                text += row([f"**Kenspeckle {name}**, {mode}", *(cell(s["kenspeckle"][mode][name]) for s in summaries)])
        for space in references.SPACES:
            for name in references.METHODS:
                cells = [cell(s["scikit-learn"][space].get(name)) for s in summaries]
                if any(c != "–" for c in cells):
                    text += row([f"{name}; {space}", *cells])
        return text

    text = f"## Accuracy, {WAY}-way, {summaries[0]['episodes']} episodes\n\n"
    text += "Percent right, ± half the 95 % interval of the mean over episodes. Both sides sort the same episodes "
    text += f"(shrunk LDA, which takes long, the first {references.FIRST_EPISODES['shrunk LDA']}).\n"
    text += "One by one: no item knows of the others. In the pile: the sorter as it is used; its pile is the episode's items,\n"
    text += "as many of each category. With a starter: the same, after `kenspeckle learn` on drawn icons of other names. Pile-centred: scikit-learn given items seen from the mean of that pile.\n\n"
    text += rows(lambda n: f"{n['accuracy']:.1f} ± {n['accuracy_half_interval']:.1f}" if n else "–")
    text += "\n## Auto minus the others, on the same episodes\n\n"
    text += "Points, ± half the 95 % interval of the paired difference. The best of scikit-learn is chosen for each column in hindsight.\n\n" + head
    # Adding 0.0 turns a rounded −0.0 into 0.0.
    difference = lambda pair: f"{round(pair[0], 1) + 0.0:+.1f} ± {pair[1]:.1f}".replace("-", "−")
    for mode in MODES:
        for name in LEARNERS[:-1]:
            text += row([f"Kenspeckle {name}, {mode}", *(difference(s["auto_minus"][mode][f"Kenspeckle {name}"]) for s in summaries)])
    for comparison, (mode, _) in COMPARISONS.items():
        best = [(s["auto_minus"][mode][s["best"][comparison]], s["best"][comparison]) for s in summaries]
        text += row([f"**best of scikit-learn**, {comparison}", *(f"**{difference(pair)}** ({name})" for pair, name in best)])
    text += "\n## What a starter from other drawn icons adds, in the pile\n\n"
    text += "Points, ± half the 95 % interval of the paired difference.\n\n" + head
    for name in LEARNERS:
        text += row([f"Kenspeckle {name}", *(difference(s["starter_minus_none"][name]) for s in summaries)])
    text += "\n## Log loss of the probabilities (nats, lower is better)\n\n"
    text += rows(lambda n: f"{n['log_loss']:.3f} ± {n['log_loss_half_interval']:.3f}" if n and "log_loss" in n else "–")
    text += "\n## Time to learn one episode and sort its queries (median, ms)\n\n"
    return text + rows(lambda n: f"{n['milliseconds']:.2f}" if n and "milliseconds" in n else "–")


def run(count, seed, say):
    """Measures every condition: (numbers, Markdown)."""
    for name in dict.fromkeys(name for name, _ in CONDITIONS):
        embed.vectors_of(name, say)
    file, seconds = starter(say)
    summaries = [measure(name, shot, count, seed, file, say) for name, shot in CONDITIONS]
    versions = f"scikit-learn {references.sklearn.__version__}, numpy {np.__version__}"
    learned = {"set": PAST, "bytes": file.stat().st_size, "seconds": seconds}
    text = table(summaries) + f"\nThe starter has {learned['bytes']:,} bytes and took {seconds:.1f} s to learn from the vectors of {PAST}.\n"
    return {"libraries": versions, "starter": learned, "conditions": summaries}, text + f"\nReference: {versions}.\n"
