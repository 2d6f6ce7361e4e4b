"""How well each learner sorts, item by item, beside scikit-learn on the same episodes."""

import json

import numpy as np

import embed
import episodes
import references
import sets

CONDITIONS = [("icons-test", 1), ("icons-test", 5), ("stamps", 1), ("stamps", 5)]
TITLES = {"icons-test": "drawn icons", "stamps": "stamps"}
WAY = 5
LEARNERS = ["prototype", "ridge", "gradient", "auto"]


def interval(values):
    """Mean and half the width of its 95 % interval over episodes."""
    values = np.asarray(values)
    return float(values.mean()), float(1.96 * values.std(ddof=1) / len(values) ** 0.5)


def measure(name, shot, count, seed, say):
    path, header, _ = episodes.write(name, WAY, shot, count, seed)
    say(f"{name} {WAY}-way {shot}-shot: {count} episodes")
    flags = ["--non-negative"] if sets.ALL[name].non_negative else []
    vectors = sets.VECTORS / f"{name}.npy"
    ours = json.loads(embed.cargo(["bench", "--features", "cli", "--bench", "episodes", "--", str(vectors), str(path), *flags]))
    theirs = references.run(path, list(references.SPACES), say=say)
    auto = np.array(ours["auto"]["accuracy"])
    # A method may have had only the first episodes.
    auto_minus = lambda measured: interval(100 * (auto[: len(measured["accuracy"])] - measured["accuracy"]))
    summary = {**header, "kenspeckle": {}, "scikit-learn": {}, "auto_minus": {}}
    for learner in LEARNERS:
        summary["kenspeckle"][learner] = summarise(ours[learner]) | {"milliseconds": ours[learner]["milliseconds"]}
        if learner != "auto":
            summary["auto_minus"][learner] = auto_minus(ours[learner])
    for space, methods in theirs.items():
        summary["scikit-learn"][space] = {method: summarise(measured) for method, measured in methods.items()}
        for method, measured in methods.items():
            summary["auto_minus"][f"{method}, {space}"] = auto_minus(measured)
    # The method that leaves Auto the least lead, chosen in hindsight, which favours scikit-learn.
    least_lead = lambda names: min(names, key=lambda name: summary["auto_minus"][name][0])
    of_space = {space: [f"{method}, {space}" for method in methods] for space, methods in theirs.items()}
    summary["best"] = {space: least_lead(names) for space, names in of_space.items()}
    summary["best"]["either"] = least_lead(sum(of_space.values(), []))
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
    first = summaries[0]
    text = f"## Accuracy, {WAY}-way, {first['episodes']} episodes, items one by one\n\n"
    text += "Percent right, ± half the 95 % interval of the mean over episodes. Both sides sort the same episodes "
    text += f"(shrunk LDA, which takes long, the first {references.FIRST_EPISODES['shrunk LDA']}).\n\n"
    text += row(["", *columns]) + row(["---"] * (len(columns) + 1))
    cell = lambda numbers: f"{numbers['accuracy']:.1f} ± {numbers['accuracy_half_interval']:.1f}" if numbers else "–"
    for learner in LEARNERS:
        mark = "**" if learner == "auto" else ""
        text += row([f"{mark}Kenspeckle {learner}{mark}", *(f"{mark}{cell(s['kenspeckle'][learner])}{mark}" for s in summaries)])
    for space in references.SPACES:
        for method in references.METHODS:
            text += row([f"{method}, {space}", *(cell(s["scikit-learn"][space].get(method)) for s in summaries)])
    text += "\n## Auto minus …, on the same episodes\n\n"
    text += "Points, ± half the 95 % interval of the paired difference. The best of scikit-learn is chosen per column in hindsight.\n\n"
    text += row(["", *columns]) + row(["---"] * (len(columns) + 1))
    # Adding 0.0 turns a rounded −0.0 into 0.0.
    difference = lambda pair: f"{round(pair[0], 1) + 0.0:+.1f} ± {pair[1]:.1f}".replace("-", "−")
    for learner in LEARNERS[:-1]:
        text += row([f"Kenspeckle {learner}", *(difference(s["auto_minus"][learner]) for s in summaries)])
    for space in [*references.SPACES, "either"]:
        label = "best of scikit-learn on either" if space == "either" else f"best of scikit-learn on {space}"
        text += row([label, *(f"{difference(s['auto_minus'][s['best'][space]])} ({s['best'][space].removesuffix(', ' + space)})" for s in summaries)])
    text += "\n## Log loss of the probabilities (nats, lower is better)\n\n"
    text += row(["", *columns]) + row(["---"] * (len(columns) + 1))
    loss = lambda numbers: f"{numbers['log_loss']:.3f} ± {numbers['log_loss_half_interval']:.3f}" if numbers and "log_loss" in numbers else "–"
    for learner in LEARNERS:
        text += row([f"Kenspeckle {learner}", *(loss(s["kenspeckle"][learner]) for s in summaries)])
    for space in references.SPACES:
        for method in references.METHODS:
            if method in references.WITH_PROBABILITIES:
                text += row([f"{method}, {space}", *(loss(s["scikit-learn"][space].get(method)) for s in summaries)])
    text += "\n## Time to learn one episode and sort its queries (median, ms)\n\n"
    text += row(["", *columns]) + row(["---"] * (len(columns) + 1))
    for learner in LEARNERS:
        text += row([f"Kenspeckle {learner}", *(f"{s['kenspeckle'][learner]['milliseconds']:.2f}" for s in summaries)])
    return text


def run(count, seed, say):
    """Measures every condition: (numbers, Markdown)."""
    for name in dict.fromkeys(name for name, _ in CONDITIONS):
        embed.vectors_of(name, say)
    summaries = [measure(name, shot, count, seed, say) for name, shot in CONDITIONS]
    versions = f"scikit-learn {references.sklearn.__version__}, numpy {np.__version__}"
    return {"libraries": versions, "conditions": summaries}, table(summaries) + f"\nReference: {versions}.\n"
