"""How few answers sort a pile: questions in the sorter's order beside random order with scikit-learn's logistic regression."""

import csv
import hashlib
import json
import subprocess
import warnings

import numpy as np
import sklearn
from sklearn.linear_model import LogisticRegression

import embed
import sets

# (set, categories, items), each even and uneven. Sets with few items a category give smaller piles.
CONDITIONS = [("stamps", 8, 160), ("digits", 8, 400), ("summaries", 8, 400), ("quotations", 8, 400), ("summaries", 20, 1000), ("quotations", 20, 1000)]
SHOTS = "1,5"
TARGET = 0.9
# The strength that needs the fewest answers of 1, 10 and 100 on unit vectors.
INVERSE_STRENGTH = 10
RESAMPLES = 400


def labels_file(name):
    path = sets.DATA / "bench" / f"{name}.labels.csv"
    path.parent.mkdir(parents=True, exist_ok=True)
    with open(path, "w", newline="", encoding="utf-8") as out:
        csv.writer(out).writerows([category] for category in sets.read_categories(name))
    return path


def rehearse(name, arguments, say):
    """Runs `kenspeckle rehearse` on a set; what it printed is kept until the program changes."""
    command = [str(embed.PROGRAM), "rehearse", str(sets.VECTORS / f"{name}.npy"), "--labels", str(labels_file(name)), "--json", *arguments]
    if not sets.ALL[name].non_negative:
        command.append("--signed")
    key = hashlib.sha256(embed.PROGRAM.read_bytes() + json.dumps(command).encode()).hexdigest()[:24]
    kept = sets.DATA / "bench" / "asking" / f"{name}-{key}.json"
    if not kept.exists():
        say(f"{name}: rehearse {' '.join(arguments)}")
        done = subprocess.run(command, capture_output=True, text=True, check=False)
        if done.returncode:
            raise sets.Unmeasured(f"`kenspeckle rehearse` failed: {done.stderr.strip()}")
        kept.parent.mkdir(parents=True, exist_ok=True)
        kept.write_text(done.stdout)
    return json.loads(kept.read_text())


def unit_vectors(name):
    """As the sorter places items: roots where numbers are never negative, then unit length."""
    vectors = sets.read_vectors(name).astype(np.float64)
    if sets.ALL[name].non_negative:
        vectors = np.sqrt(vectors)
    return vectors / np.linalg.norm(vectors, axis=1, keepdims=True)


def logistic(name, piles, categories, say):
    """scikit-learn in random order: (numbers of answers, share of the rest sorted right by pile and number)."""
    key = hashlib.sha256(json.dumps([name, piles, INVERSE_STRENGTH, sklearn.__version__]).encode()).hexdigest()[:24]
    kept = sets.DATA / "bench" / "asking" / f"logistic-{name}-{key}.json"
    if not kept.exists():
        say(f"{name}: scikit-learn in random order on {len(piles)} piles")
        vectors = unit_vectors(name)
        size = min(len(pile["items"]) for pile in piles)
        times = [0.5, 1, 1.5, 2, 3, 4, 5, 6, 8, 10, 12.5, 15, 20, 25]
        numbers = sorted({int(t * categories) for t in times if t * categories <= size / 2} | {size // 2})
        shares = []
        for pile in piles:
            items, order = vectors[pile["items"]], np.array(pile["shuffled"])
            truth = np.array([-1 if label is None else label for label in pile["truth"]])
            row = []
            for number in numbers:
                asked, rest = order[:number], order[number:]
                asked, rest = asked[truth[asked] >= 0], rest[truth[rest] >= 0]
                if len(set(truth[asked])) < 2:
                    row.append(float((truth[rest] == truth[asked][0]).mean()) if len(asked) else 0.0)
                    continue
                with warnings.catch_warnings():
                    warnings.simplefilter("ignore")
                    model = LogisticRegression(C=INVERSE_STRENGTH, max_iter=300).fit(items[asked], truth[asked])
                row.append(float((model.predict(items[rest]) == truth[rest]).mean()))
            shares.append(row)
        kept.parent.mkdir(parents=True, exist_ok=True)
        kept.write_text(json.dumps({"numbers": numbers, "shares": shares}))
    found = json.loads(kept.read_text())
    return np.array(found["numbers"]), np.array(found["shares"])


def needed(numbers, shares, target):
    """Answers until the mean over piles reaches the target, by a straight line between two numbers; None if it doesn't."""
    mean = shares.mean(axis=0)
    reached = np.flatnonzero(mean >= target)
    if not len(reached):
        return None
    at = reached[0]
    if at == 0:
        return float(numbers[0])
    before, after = mean[at - 1], mean[at]
    return float(numbers[at - 1] + (numbers[at] - numbers[at - 1]) * (target - before) / (after - before))


def bar(numbers, shares, categories):
    """(target, answers that random order needs for it): 90 %, or else what it reaches at six answers a category."""
    answers = needed(numbers, shares, TARGET)
    if answers is not None:
        return TARGET, answers
    at = min(6 * categories, numbers[-1])
    return float(np.interp(at, numbers, shares.mean(axis=0))), float(at)


def columns(player, what):
    least = min(len(pile[what]) for pile in player["piles"])
    return np.array([pile[what][:least] for pile in player["piles"]], dtype=float)


def all_met_at_random(pile):
    """Answers in random order until every category was met."""
    truth = np.array([-1 if label is None else label for label in pile["truth"]])[pile["shuffled"]]
    return max(int(np.flatnonzero(truth == label)[0]) for label in set(truth[truth >= 0])) + 1


def measure(name, categories, size, uneven, repeats, seed, say):
    answers = 6 * categories
    arguments = ["--answers", str(answers), "--categories", str(categories), "--size", str(size), "--repeats", str(repeats), "--seed", str(seed), "--threads", "1"]
    if uneven:
        arguments.append("--uneven")
    report = rehearse(name, arguments, say)
    numbers, shares = logistic(name, report["piles"], categories, say)
    target, base = bar(numbers, shares, categories)
    random = np.random.default_rng(seed)
    result = {"set": name, "categories": categories, "items": float(np.mean([len(p["items"]) for p in report["piles"]])), "uneven": uneven, "target": target, "base": base, "ratio": {}, "interval": {}}
    for player in report["players"]:
        asked, own = columns(player, "answers")[0], columns(player, "rest")
        found = needed(asked, own, target)
        result["ratio"][player["name"]] = found / base if found else None
        again = []
        for _ in range(RESAMPLES):
            drawn = random.integers(len(own), size=len(own))
            its_target, its_base = bar(numbers, shares[drawn], categories)
            again.append((needed(asked, own[drawn], its_target) or answers * 1.25) / its_base)
        result["interval"][player["name"]] = [float(x) for x in np.percentile(again, [2.5, 97.5])]
    met = [pile["all_met"] for pile in report["players"][0]["piles"]]
    at_random = [all_met_at_random(pile) for pile in report["piles"]]
    # A category that was not met by the end counts as met with the next answer, which flatters; it is marked.
    result["met"] = {"asked": float(np.mean([m or answers + 1 for m in met])), "random": float(np.mean(at_random)), "not_met": sum(m is None for m in met)}
    result["claims"] = claims(report["players"][0], categories)
    return result


def claims(player, categories):
    """How often the interval of what is sorted right held, by stage."""
    held, claimed, after = [], [], []
    for pile in player["piles"]:
        for at, (answers, rest, expected) in enumerate(zip(pile["answers"], pile["rest"], pile["expected"])):
            if expected is None or answers < categories:
                continue
            low, middle, high = expected["now"]
            held.append(low <= rest <= high)
            claimed.append((middle - rest, high - low))
            if answers + 10 in pile["answers"]:
                later = pile["rest"][pile["answers"].index(answers + 10)]
                low, _, high = expected["after_more"]
                after.append(low <= later <= high)
    error, width = np.mean(claimed, axis=0) if claimed else (float("nan"), float("nan"))
    return {"held": float(np.mean(held)), "bias": float(error), "width": float(width), "after_held": float(np.mean(after)) if after else None}


def pile_aware(name, uneven, episodes, seed, say):
    """Points by which the pile's own structure helps at 1 and 5 examples a category, with half the 95 % interval."""
    arguments = ["--ways", "8", "--shots", SHOTS, "--queries", "45", "--episodes", str(episodes), "--seed", str(seed), "--learner", "auto", "--one-by-one", "--threads", "1"]
    if uneven:
        arguments.append("--uneven")
    report = rehearse(name, arguments, say)
    return {str(one["shot"]): [-100 * one["mean"], 50 * (one["interval"][1] - one["interval"][0])] for one in report["difference"]}


def row(cells):
    return "| " + " | ".join(cells) + " |\n"


def table(summaries, aware, repeats):
    text = f"## Answers needed, over those in random order with logistic regression ({repeats} piles each)\n\n"
    text += f"Random order: scikit-learn's logistic regression (C = {INVERSE_STRENGTH}) on the same piles. The target is 90 %, or, where it does not reach that with\n"
    text += "half the pile answered, what it reaches at six answers a category, of the items without an answer. 95 % intervals by resampling piles.\n\n"
    players = list(summaries[0]["ratio"])
    text += row(["pile", "items", "target", "random order, logistic", *(f"{p}, ratio" for p in players), "all categories met: asked", "in random order", "ratio"])
    text += row(["---"] * (7 + len(players)))
    for one in summaries:
        name = f"{one['set']}, {one['categories']} {'uneven' if one['uneven'] else 'even'}"
        cells = []
        for player in players:
            ratio, (low, high) = one["ratio"][player], one["interval"][player]
            cells.append(f"{ratio:.2f} ({low:.2f}–{high:.2f})" if ratio else f"not reached ({low:.2f}–{high:.2f})")
        met = one["met"]
        mark = f" ({met['not_met']} not)" if met["not_met"] else ""
        text += row([name, f"{one['items']:.0f}", f"{100 * one['target']:.1f} %", f"{one['base']:.0f}", *cells, f"{met['asked']:.0f}{mark}", f"{met['random']:.0f}", f"{met['asked'] / met['random']:.2f}"])
    ratios = [one["ratio"]["asked"] or 1.25 for one in summaries]
    uneven = [one["met"]["asked"] / one["met"]["random"] for one in summaries if one["uneven"]]
    text += f"\nAsked, mean ratio {np.mean(ratios):.2f}, largest {max(ratios):.2f}. All categories met, uneven piles: mean ratio {np.mean(uneven):.2f}, largest {max(uneven):.2f}.\n"
    text += "\n## Pile-aware minus one by one\n\nPoints, ± half the 95 % interval, 8 categories, auto, on the same items.\n\n"
    text += row(["set", "1 example, even", "1 example, uneven", "5 examples, even", "5 examples, uneven"]) + row(["---"] * 5)
    for name, found in aware.items():
        cells = [f"{found[spread][shot][0]:+.1f} ± {found[spread][shot][1]:.1f}".replace("-", "−") for shot in ("1", "5") for spread in ("even", "uneven")]
        text += row([name, *cells])
    means = [np.mean([found[spread][shot][0] for found in aware.values()]) for shot in ("1", "5") for spread in ("even", "uneven")]
    text += row(["**mean**", *(f"{mean:+.1f}".replace("-", "−") for mean in means)])
    text += "\n## What the sorter expects of itself\n\nFrom one answer a category on: how often the 95 % interval held, the mean of expected minus true share, the interval's mean width (points), and how often what ten more answers would bring held.\n\n"
    text += row(["pile", "held", "bias", "width", "ten more held"]) + row(["---"] * 5)
    for one in summaries:
        c = one["claims"]
        after = f"{100 * c['after_held']:.0f} %" if c["after_held"] is not None else "–"
        text += row([f"{one['set']}, {one['categories']} {'uneven' if one['uneven'] else 'even'}", f"{100 * c['held']:.0f} %", f"{100 * c['bias']:+.1f}".replace("-", "−"), f"{100 * c['width']:.0f}", after])
    return text


def run(repeats, seed, say, conditions=CONDITIONS):
    """Measures every condition: (numbers, Markdown)."""
    for name in dict.fromkeys(name for name, *_ in conditions):
        embed.vectors_of(name, say)
    embed.build(say)
    summaries = [measure(*condition, uneven, repeats, seed, say) for condition in conditions for uneven in (False, True)]
    aware = {
        name: {spread: pile_aware(name, spread == "uneven", 5 * repeats, seed, say) for spread in ("even", "uneven")}
        for name in dict.fromkeys(name for name, *_ in conditions)
    }
    versions = f"scikit-learn {sklearn.__version__}, numpy {np.__version__}"
    return {"libraries": versions, "piles": summaries, "pile_aware": aware}, table(summaries, aware, repeats) + f"\nReference: {versions}.\n"
