"""The accuracy benchmark's numbers as Markdown: first what decides, then everything."""

import numpy as np

import references
import sets

ALONE, PILE = "one by one", "in the pile"
LEARNERS = ["prototype", "ridge", "gradient", "auto"]
# Auto may be this much worse than its best member, in points: less is noise.
MOST_BELOW_A_MEMBER = 0.5


def row(cells):
    return "| " + " | ".join(cells) + " |\n"


def head(cells):
    return row(cells) + row(["---"] * len(cells))


def signed(value, digits=1):
    # Adding 0.0 turns a rounded −0.0 into 0.0.
    return f"{round(value, digits) + 0.0:+.{digits}f}".replace("-", "−")


def difference(pair, digits=1):
    return f"{signed(pair[0], digits)} ± {pair[1]:.{digits}f}"


def percent(measured):
    return f"{measured['accuracy']:.1f} ± {measured['accuracy_half_interval']:.1f}"


def title(one):
    return f"{one['set']}, {one['way']}-way {one['shot']}-shot"


def rival(best):
    return f"{best['accuracy']:.1f} ({best['name']})"


def compact(conditions):
    text = head(["", "episodes", "Auto in the pile", "Auto one by one", "best of scikit-learn one by one", "best of it pile-centred", "pile − best one by one", "pile − best of any", "one by one − best one by one"])
    for one in conditions:
        mine, minus = one["kenspeckle"], one["auto_minus"]
        text += row(
            [
                title(one),
                str(one["episodes"]),
                percent(mine[PILE]["auto"]),
                percent(mine[ALONE]["auto"]),
                rival(one["best"]["one by one"]),
                rival(one["best"]["pile-centred"]),
                *(difference(minus[key]) for key in (f"{PILE}, best one by one", f"{PILE}, best of any", f"{ALONE}, best one by one")),
            ]
        )
    return text


def best_member(one, mode):
    """Auto minus the member that is best in this condition."""
    return min(one["auto_minus_member"][mode].values(), key=lambda pair: pair[0])


def overview(conditions):
    """One line a question: (what, unit digits, [(condition, pair)])."""
    modes = list(dict.fromkeys(mode for one in conditions for mode in one["kenspeckle"]))
    lines = [
        ("Auto in the pile − best of scikit-learn one by one", 1, [(one, one["auto_minus"][f"{PILE}, best one by one"]) for one in conditions]),
        ("Auto in the pile − best of any, pile-centred too", 1, [(one, one["auto_minus"][f"{PILE}, best of any"]) for one in conditions]),
        ("Auto one by one − best of scikit-learn one by one", 1, [(one, one["auto_minus"][f"{ALONE}, best one by one"]) for one in conditions]),
    ]
    for mode in modes:
        having = [one for one in conditions if mode in one["kenspeckle"]]
        lines.append((f"Auto − its best member, {mode}", 1, [(one, best_member(one, mode)) for one in having]))
        for member in LEARNERS[:-1]:
            lines.append((f"Auto − {member}, {mode}", 1, [(one, one["auto_minus_member"][mode][member]) for one in having]))
    started = [one for one in conditions if one["starter_minus_none"]]
    for mode in (PILE, ALONE) if started else ():
        for learner in ("auto", "gradient"):
            lines.append((f"starter − none, {learner}, {mode}", 1, [(one, one["starter_minus_none"][mode][learner]) for one in started]))
    return lines


def summary(conditions):
    text = head(["points", "conditions", "mean", "worst", "where", "below 0", "below 0 by more than its interval"])

    def line(what, digits, pairs, worst):
        values = [pair[0] for _, pair in pairs]
        place = worst(range(len(values)), key=lambda i: values[i])
        bad = [pair for _, pair in pairs if (pair[0] < 0 if worst is min else pair[0] > 0)]
        sure = [pair for pair in bad if abs(pair[0]) > pair[1]]
        return row([what, str(len(values)), signed(float(np.mean(values)), digits), difference(pairs[place][1], digits), title(pairs[place][0]), str(len(bad)), str(len(sure))])

    for what, digits, pairs in overview(conditions):
        text += line(what, digits, pairs, min)
    text += "\n" + head(["log loss, nats: lower is better", "conditions", "mean", "worst", "where", "above 0", "above 0 by more than its interval"])
    for key in conditions[0]["log_loss_minus"]:
        text += line(f"Auto {key}".replace(", ", " − ", 1), 3, [(one, one["log_loss_minus"][key]) for one in conditions], max)
    below = [(one, mode, best_member(one, mode)) for one in conditions for mode in one["kenspeckle"] if best_member(one, mode)[0] < -MOST_BELOW_A_MEMBER]
    text += f"\nAuto is more than {MOST_BELOW_A_MEMBER} points below its best member in {len(below)} places"
    return text + (": " + "; ".join(f"{title(one)} {mode} {difference(pair)}" for one, mode, pair in below) if below else "") + ".\n"


def losses(conditions):
    text = head(["", "Auto in the pile", "Auto one by one", "best logistic regression one by one", "best of any", "pile − one by one", "pile − any", "one by one − one by one"])
    for one in conditions:
        text += row(
            [
                title(one),
                *(f"{one['kenspeckle'][mode]['auto']['log_loss']:.3f}" for mode in (PILE, ALONE)),
                *(f"{one['logistic'][which]['log_loss']:.3f} ({one['logistic'][which]['name']})" for which in ("one by one", "any")),
                *(difference(pair, 3) for pair in one["log_loss_minus"].values()),
            ]
        )
    return text


def members(conditions):
    """Auto minus each member, per condition."""
    text = ""
    for mode in dict.fromkeys(mode for one in conditions for mode in one["kenspeckle"]):
        having = [one for one in conditions if mode in one["kenspeckle"]]
        text += f"\n### {mode[0].upper()}{mode[1:]}\n\n" + head(["", "prototype", "ridge", "gradient", "Auto − prototype", "Auto − ridge", "Auto − gradient"])
        for one in having:
            mine = one["kenspeckle"][mode]
            text += row([title(one), *(f"{mine[m]['accuracy']:.1f}" for m in LEARNERS[:-1]), *(difference(pair) for pair in one["auto_minus_member"][mode].values())])
    return text


def starters(conditions):
    text = head(["", *(f"{learner}, {mode}" for mode in (PILE, ALONE) for learner in LEARNERS)])
    for one in conditions:
        added = one["starter_minus_none"]
        text += row([title(one), *(difference(added[mode][learner]) for mode in (PILE, ALONE) for learner in LEARNERS)])
    return text


def details(name, conditions):
    """Everything measured on one set: accuracy, log loss and time of each method."""
    columns = [f"{one['way']}-way {one['shot']}-shot" for one in conditions]
    modes, spaces = list(conditions[0]["kenspeckle"]), list(conditions[0]["scikit-learn"])

    def rows(cell):
        text = head(["", *columns])
        for mode in modes:
            for learner in LEARNERS:
                text += row([f"**Kenspeckle {learner}**, {mode}", *(cell(one["kenspeckle"][mode][learner]) for one in conditions)])
        for space in spaces:
            for method in references.METHODS:
                cells = [cell(one["scikit-learn"][space].get(method)) for one in conditions]
                if any(c != "–" for c in cells):
                    text += row([f"{method}; {space}", *cells])
        return text

    text = f"\n## {name}: {sets.ALL[name].what}\n\nPercent right:\n\n" + rows(lambda m: percent(m) if m else "–")
    text += "\nLog loss:\n\n" + rows(lambda m: f"{m['log_loss']:.3f} ± {m['log_loss_half_interval']:.3f}" if m and "log_loss" in m else "–")
    return text + "\nMedian milliseconds to learn one episode and sort its queries:\n\n" + rows(lambda m: f"{m['milliseconds']:.2f}" if m and "milliseconds" in m else "–")


def table(numbers):
    conditions = numbers["conditions"]
    first = references.FIRST_EPISODES[references.CV]
    text = "## Accuracy\n\nPercent right, ± half the 95 % interval of the mean over episodes. Both sides sort the same episodes "
    text += f"({references.CV} and {references.LDA}, which take long, the first {first}; {references.LDA} beyond {references.MOST_DIMENSIONS_OF_LDA} dimensions in an orthonormal basis of the examples' span). "
    text += "In the pile: the sorter as it is used; its pile is the episode's items, as many of each category. One by one: no item knows of the others. "
    text += "Pile-centred: scikit-learn given items seen from the mean of that pile. With a starter: after `kenspeckle learn` on drawn icons of other names; "
    text += "one by one, items are then seen from the middle of those. The best of scikit-learn is chosen for each condition in hindsight, among "
    text += f"{', '.join(references.METHODS)} (from {references.LEAST_SHOT[references.CV]} and {references.LEAST_SHOT[references.LDA]} examples on for the two). "
    text += "Differences are paired, with their 95 % interval. A set with fewer categories than asked takes part with all it has.\n\n"
    text += compact(conditions)
    text += "\n## In one line each\n\n" + summary(conditions)
    text += "\n## Log loss of the probabilities (nats, lower is better)\n\n" + losses(conditions)
    started = [one for one in conditions if one["starter_minus_none"]]
    if started:
        text += "\n## What a starter from other drawn icons adds (points)\n\n" + starters(started)
        learned = numbers["starter"]
        text += f"\nThe starter has {learned['bytes']:,} bytes and took {learned['seconds']:.1f} s to learn from the vectors of {learned['set']}.\n"
    text += "\n## Auto and its members (percent right, points)\n" + members(conditions)
    for name in dict.fromkeys(one["set"] for one in conditions):
        text += details(name, [one for one in conditions if one["set"] == name])
    return text + f"\nReference: {numbers['libraries']}.\n"
