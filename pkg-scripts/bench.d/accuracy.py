"""How well each learner sorts, beside scikit-learn on the same episodes."""

import csv
import hashlib
import json
import subprocess
import time
from collections import Counter

import numpy as np

import accuracy_table
import embed
import episodes
import references
import sets

SETS = ["icons-test", "stamps", "summaries", "quotations", "mail", "digits", "wine", "iris", "breast-cancer"]
SHOTS = [1, 2, 5, 10]
# A set with fewer categories takes part with all it has.
WAYS = [5, 20]
# Conditions of so many categories take long and get fewer episodes.
MANY, EPISODES_OF_MANY = 20, 100
LEARNERS = accuracy_table.LEARNERS
MEMBERS = LEARNERS[:-1]
ALONE, PILE = accuracy_table.ALONE, accuracy_table.PILE
STARTED = {mode: f"{mode}, with a starter" for mode in (ALONE, PILE)}
# What the starter learns from: names that no benchmark sorts.
PAST = "icons-learn"


def interval(values):
    """Mean and half the width of its 95 % interval over episodes."""
    values = np.asarray(values)
    return float(values.mean()), float(1.96 * values.std(ddof=1) / len(values) ** 0.5)


def paired(one, other, key, factor=1):
    """Mean and half interval of the difference; a method may have had only the first episodes."""
    count = min(len(one[key]), len(other[key]))
    return interval(factor * (np.array(one[key][:count]) - np.array(other[key][:count])))


def conditions(names, ways, shots):
    """(set, way, shot) of every condition that the sets have items for; conditions of few categories first."""
    found = []
    for way in sorted(set(ways)):
        for name in names:
            sizes = Counter(sets.read_categories(name)).values()
            for shot in shots:
                condition = (name, min(way, len(sizes)), shot)
                if sum(size > shot for size in sizes) >= condition[1] and condition not in found:
                    found.append(condition)
    return found


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


def ours(program, name, path, file):
    """What benches/episodes.rs says of a file of episodes; kept in data/bench/ours while neither it nor the data change."""
    vectors = sets.VECTORS / f"{name}.npy"
    flags = ["--non-negative"] if sets.ALL[name].non_negative else []
    flags += [f"--starter={file}"] if file else []
    key = hashlib.sha256(" ".join(flags).encode())
    for part in [program, vectors, path, *([file] if file else [])]:
        key.update(hashlib.sha256(part.read_bytes()).digest())
    kept = sets.DATA / "bench" / "ours" / f"{key.hexdigest()[:24]}.json"
    if not kept.exists():
        done = subprocess.run([program, vectors, path, *flags], capture_output=True, text=True, check=False)
        if done.returncode:
            raise sets.Unmeasured(f"benches/episodes.rs failed on {name}: {done.stderr.strip()}")
        kept.parent.mkdir(parents=True, exist_ok=True)
        kept.write_text(done.stdout)
    return json.loads(kept.read_text())


def measure(program, name, way, shot, count, seed, file, say):
    """One condition: both sides on the same episodes, and what Auto is compared with."""
    path, header, _ = episodes.write(name, way, shot, count, seed)
    start = time.monotonic()
    mine = ours(program, name, path, file)
    say(f"{name} {way}-way {shot}-shot: {count} episodes: Kenspeckle: {time.monotonic() - start:.0f} s")
    theirs = references.run(path, say=say)
    auto = {mode: learners["auto"] for mode, learners in mine.items()}
    rivals = {
        ALONE: {f"{method}; {space}": measured for space in references.one_by_one(name) for method, measured in theirs[space].items()},
        PILE: {f"{method}; pile-centred": measured for method, measured in theirs[references.pile_centred(name)].items()},
    }
    everyone = rivals[ALONE] | rivals[PILE]

    def best(mode, among):
        """The rival that Auto gains least on: chosen in hindsight, which favours scikit-learn."""
        return min(among, key=lambda rival: paired(auto[mode], among[rival], "accuracy")[0])

    def least_loss(among):
        logistic = {rival: m for rival, m in among.items() if rival.split("; ")[0] in references.LOGISTIC}
        return min(logistic, key=lambda rival: np.mean(logistic[rival]["log_loss"]))

    chosen = {"one by one": best(ALONE, rivals[ALONE]), "pile-centred": best(PILE, rivals[PILE]), "any": best(PILE, everyone)}
    logistic = {"one by one": least_loss(rivals[ALONE]), "any": least_loss(everyone)}
    points = lambda mode, rival: paired(auto[mode], everyone[rival], "accuracy", 100)
    losses = lambda mode, rival: paired(auto[mode], everyone[rival], "log_loss")
    summary = {
        **header,
        "kenspeckle": {mode: {n: summarise(m) for n, m in learners.items()} for mode, learners in mine.items()},
        "scikit-learn": {space: {method: summarise(m) for method, m in methods.items()} for space, methods in theirs.items()},
        "best": {which: {"name": rival, **summarise(everyone[rival])} for which, rival in chosen.items()},
        "logistic": {which: {"name": rival, **summarise(everyone[rival])} for which, rival in logistic.items()},
        "auto_minus": {
            f"{PILE}, best one by one": points(PILE, chosen["one by one"]),
            f"{PILE}, best of any": points(PILE, chosen["any"]),
            f"{ALONE}, best one by one": points(ALONE, chosen["one by one"]),
        },
        "log_loss_minus": {
            f"{PILE}, logistic regression one by one": losses(PILE, logistic["one by one"]),
            f"{PILE}, logistic regression of any": losses(PILE, logistic["any"]),
            f"{ALONE}, logistic regression one by one": losses(ALONE, logistic["one by one"]),
        },
        "auto_minus_member": {
            mode: {member: paired(auto[mode], learners[member], "accuracy", 100) for member in MEMBERS} for mode, learners in mine.items()
        },
        "starter_minus_none": {
            mode: {learner: paired(mine[started][learner], mine[mode][learner], "accuracy", 100) for learner in LEARNERS}
            for mode, started in STARTED.items()
            if started in mine
        },
    }
    return summary


def summarise(measured):
    accuracy, half = interval(100 * np.array(measured["accuracy"]))
    result = {"episodes": len(measured["accuracy"]), "accuracy": accuracy, "accuracy_half_interval": half}
    if measured["log_loss"]:
        result["log_loss"], result["log_loss_half_interval"] = interval(measured["log_loss"])
    if "milliseconds" in measured:
        result["milliseconds"] = measured["milliseconds"]
    return result


def run(names, ways, shots, count, seed, say):
    """Measures the conditions: (numbers, Markdown)."""
    for name in names:
        embed.vectors_of(name, say)
    photos = [name for name in names if sets.ALL[name].kind == "pictures"]
    file, seconds = starter(say) if photos else (None, None)
    program = embed.bench_program("episodes")
    summaries = []
    for name, way, shot in conditions(names, ways, shots):
        asked = min(count, EPISODES_OF_MANY) if way >= MANY else count
        summaries.append(measure(program, name, way, shot, asked, seed, file if name in photos else None, say))
    if not summaries:
        raise sets.Unmeasured("no set has items enough for these ways and shots")
    numbers = {"libraries": f"scikit-learn {references.sklearn.__version__}, numpy {np.__version__}", "conditions": summaries}
    if file:
        numbers["starter"] = {"set": PAST, "bytes": file.stat().st_size, "seconds": seconds}
    return numbers, accuracy_table.table(numbers)
