"""Whether the sorter keeps its word: plausible sets, probabilities, what is set aside, doubts; beside reference libraries on the same draws."""

import hashlib
import json
import subprocess
import sys
import warnings
from collections import defaultdict

import numpy as np
from cleanlab import __version__ as cleanlab_version
from cleanlab.rank import get_label_quality_scores
from mapie import __version__ as mapie_version
from mapie.classification import CrossConformalClassifier
from sklearn import __version__ as sklearn_version
from sklearn.linear_model import LogisticRegression
from sklearn.metrics import roc_auc_score
from sklearn.model_selection import StratifiedKFold, cross_val_predict

import accuracy
import embed
import sets

SETS = ["icons-test", "stamps", "summaries", "quotations"]
WAY = 8
SHOTS = [1, 3, 5, 10]
NOVELTY_SHOT, DOUBT_SHOT = 4, 8
MOST_QUERIES = 15
PLANTED, LOOKED_AT = 0.10, 0.15
CONFIDENCE, ASIDE = 0.9, 0.05
PICTURES = {"icons-test", "stamps"}


def draws(name, shot, count, seed, unknown=False, planted=0.0, least=1):
    """`count` tasks of eight categories; with `unknown`, as many categories more that are never shown; with `planted`, that share
    of the answers is wrong. Categories have `least` items beside their examples."""
    rows = defaultdict(list)
    for row, category in enumerate(sets.read_categories(name)):
        rows[category].append(row)
    usable = sorted(category for category, members in rows.items() if len(members) >= shot + least)
    way = WAY
    if len(usable) < way * (2 if unknown else 1):
        return None
    random = np.random.Generator(np.random.PCG64(seed))
    drawn = []
    for _ in range(count):
        chosen = random.permutation(len(usable))
        draw = {"way": way, "support": [], "support_labels": [], "query": [], "query_labels": [], "other": []}
        for label, choice in enumerate(chosen[: way * (2 if unknown else 1)]):
            members = random.permutation(rows[usable[choice]])[: shot + MOST_QUERIES].tolist()
            if label >= way:
                draw["other"] += members[: len(members) - shot]
                continue
            draw["support"] += members[:shot]
            draw["support_labels"] += [label] * shot
            draw["query"] += members[shot:]
            draw["query_labels"] += [label] * (len(members) - shot)
        wrong = random.choice(way * shot, round(planted * way * shot), replace=False).tolist()
        draw["planted"] = wrong
        for position in wrong:
            draw["support_labels"][position] = int((draw["support_labels"][position] + random.integers(1, way)) % way)
        drawn.append(draw)
    return drawn


def ours(name, drawn, starter=None):
    """What the sorter says of each draw."""
    text = "".join(json.dumps(draw) + "\n" for draw in drawn)
    path = sets.DATA / "bench" / f"trust-{hashlib.sha256((name + text).encode()).hexdigest()[:16]}.jsonl"
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text)
    flags = ["--non-negative"] if sets.ALL[name].non_negative else []
    if starter:
        flags.append(f"--starter={starter}")
    out = embed.cargo(["bench", "--features", "cli", "--bench", "trust", "--", str(sets.VECTORS / f"{name}.npy"), str(path), *flags])
    path.unlink()
    return [json.loads(line) for line in out.splitlines()]


def unit(values):
    return values / np.linalg.norm(values, axis=1, keepdims=True)


def reduced(vectors, draw):
    """Support, queries and others in the support's own span, which is all that a linear method with an L2 penalty sees of them."""
    values = unit(vectors.astype(np.float64))
    basis = np.linalg.qr(values[draw["support"]].T)[0]
    return [values[draw[part]] @ basis if draw[part] else None for part in ("support", "query", "other")]


def calibration_error(probabilities, labels, bins=10):
    """Expected calibration error over ten equal bins of the first choice's probability."""
    top, right = probabilities.max(1), probabilities.argmax(1) == labels
    which = np.minimum((top * bins).astype(int), bins - 1)
    return float(sum(abs(top[which == b].sum() - right[which == b].sum()) for b in range(bins)) / len(top))


def folds(labels):
    return StratifiedKFold(int(min(5, np.bincount(labels).min())), shuffle=True, random_state=1)


def conformal(vectors, draw):
    """Logistic regression's probabilities and the sets of MAPIE's cross-conformal classifier: (covered, size, probabilities)."""
    support, query, _ = reduced(vectors, draw)
    labels, right = np.array(draw["support_labels"]), np.array(draw["query_labels"])
    probabilities = LogisticRegression(C=10).fit(support, labels).predict_proba(query)
    if np.bincount(labels).min() < 2:
        return None, None, probabilities  # nothing to judge by
    classifier = CrossConformalClassifier(LogisticRegression(C=10), confidence_level=CONFIDENCE, conformity_score="lac", cv=folds(labels), random_state=1)
    classifier.fit_conformalize(support, labels)
    _, members = classifier.predict_set(query)
    members = members[:, :, 0]
    return members[np.arange(len(right)), right], members.sum(1), probabilities


def mean(values):
    """Mean and half the width of its 95 % interval."""
    values = np.asarray(values, dtype=float)
    return float(values.mean()), float(1.96 * values.std(ddof=1) / len(values) ** 0.5)


def plausible(name, shot, count, seed, say):
    drawn = draws(name, shot, count, seed)
    if drawn is None:
        return None
    vectors = sets.read_vectors(name)
    said = ours(name, drawn)
    covered, sizes, theirs_covered, theirs_sizes = [], [], [], []
    probabilities, their_probabilities, labels, errors = [], [], [], []
    for draw, one in zip(drawn, said):
        right = np.array(draw["query_labels"])
        covered.append(np.mean([label in plausible for label, plausible in zip(right, one["plausible"])]))
        sizes.append(np.mean([len(plausible) for plausible in one["plausible"]]))
        probabilities.append(np.array(one["probabilities"]))
        labels.append(right)
        theirs = conformal(vectors, draw)
        if theirs[0] is not None:
            theirs_covered.append(theirs[0].mean())
            theirs_sizes.append(theirs[1].mean())
        their_probabilities.append(theirs[2])
        errors.append((probabilities[-1].argmax(1) == right).mean() - one["left_out_right"] / max(1, one["left_out_judged"]))
    everything, all_labels = np.concatenate(probabilities), np.concatenate(labels)
    say(f"{name}, {shot} shots: covered {np.mean(covered):.3f}, size {np.mean(sizes):.2f}")
    one_hot = np.eye(everything.shape[1])[all_labels]
    return {
        "covered": mean(covered),
        "size": mean(sizes),
        "mapie_covered": mean(theirs_covered) if theirs_covered else None,
        "mapie_size": mean(theirs_sizes) if theirs_sizes else None,
        "accuracy": float((everything.argmax(1) == all_labels).mean()),
        "calibration_error": calibration_error(everything, all_labels),
        "brier": float(((everything - one_hot) ** 2).sum(1).mean()),
        "sklearn_calibration_error": calibration_error(np.concatenate(their_probabilities), all_labels),
        "sklearn_brier": float(((np.concatenate(their_probabilities) - one_hot) ** 2).sum(1).mean()),
        "better_than_left_out": mean(errors),
        "assessment_milliseconds": float(np.median([one["milliseconds"] for one in said])),
    }


def novelty(name, count, seed, say, starter=None):
    drawn = draws(name, NOVELTY_SHOT, count, seed, unknown=True)
    if drawn is None:
        return None
    vectors = sets.read_vectors(name)
    area, aside, unknown_aside, references = [], [], [], defaultdict(list)
    for draw, one in zip(drawn, ours(name, drawn, starter)):
        unknown = np.r_[np.zeros(len(draw["query"])), np.ones(len(draw["other"]))]
        area.append(roc_auc_score(unknown, -np.r_[one["likeness"], one["other_likeness"]]))
        aside.append(np.mean(one["set_aside"]))
        unknown_aside.append(np.mean(one["other_set_aside"]))
        if starter:
            continue
        support, query, other = reduced(vectors, draw)
        labels = np.array(draw["support_labels"])
        model = LogisticRegression().fit(support, labels)
        references["logistic regression, greatest probability"].append(roc_auc_score(unknown, -model.predict_proba(np.r_[query, other]).max(1)))
        full = unit(vectors.astype(np.float64))
        means = np.stack([full[draw["support"]][labels == label].mean(0) for label in range(draw["way"])])
        items = full[draw["query"] + draw["other"]]
        references["distance to the nearest mean"].append(roc_auc_score(unknown, ((items[:, None] - means) ** 2).sum(2).min(1)))
        references["cosine with the nearest example"].append(roc_auc_score(unknown, -(items @ full[draw["support"]].T).max(1)))
    say(f"{name}{' with a starter' if starter else ''}: AUROC {np.mean(area):.3f}, known set aside {np.mean(aside):.3f}, unknown {np.mean(unknown_aside):.3f}")
    return {"auroc": mean(area), "known_set_aside": mean(aside), "unknown_set_aside": mean(unknown_aside), "references": {key: mean(values) for key, values in references.items()}}


def doubts(name, count, seed, say):
    shot = DOUBT_SHOT
    drawn = draws(name, shot, count, seed, planted=PLANTED, least=0)
    if drawn is None:
        return None
    # Folds need two examples of each category; planting hardly ever leaves fewer.
    drawn = [draw for draw in drawn if min(np.bincount(draw["support_labels"], minlength=draw["way"])) >= 2]
    vectors = sets.read_vectors(name)
    found, theirs = [], []
    for draw, one in zip(drawn, ours(name, drawn)):
        look = int(np.ceil(LOOKED_AT * len(draw["support"])))
        planted = set(draw["planted"])
        found.append(len(planted & set(one["doubts"][:look])) / len(planted))
        support, _, _ = reduced(vectors, draw)
        labels = np.array(draw["support_labels"])
        probabilities = cross_val_predict(LogisticRegression(C=10), support, labels, cv=folds(labels), method="predict_proba")
        order = np.argsort(get_label_quality_scores(labels, probabilities, method="normalized_margin"))
        theirs.append(len(planted & set(order[:look].tolist())) / len(planted))
    say(f"{name}: planted found {np.mean(found):.3f}, cleanlab {np.mean(theirs):.3f}")
    return {"shot": shot, "draws": len(drawn), "found": mean(found), "cleanlab_found": mean(theirs)}


def percent(pair, digits=1):
    return f"{100 * pair[0]:.{digits}f} ± {100 * pair[1]:.{digits}f}"


def table(numbers):
    row = accuracy.row
    text = f"## Plausible sets at {CONFIDENCE:.0%}, {WAY} categories, {numbers['draws']} draws\n\n"
    text += "Covered: how often, in %, the right tray is in the set of a fresh item; size: trays in a set. ± half the 95 % interval over draws.\n"
    text += f"Beside it MAPIE {mapie_version}: cross-conformal LAC sets of scikit-learn's logistic regression (C = 10) on the same draws.\n\n"
    head = ["set", "shots", "right, %", "covered", "size", "MAPIE covered", "MAPIE size", "calibration error, %", "logistic regression's", "Brier", "logistic regression's"]
    text += row(head) + row(["---"] * len(head))
    for name, by_shot in numbers["plausible"].items():
        for shot, n in by_shot.items():
            if n is None:
                text += row([name, shot, *["too few items"] + ["–"] * (len(head) - 3)])
                continue
            theirs = [percent(n["mapie_covered"]), f"{n['mapie_size'][0]:.2f} ± {n['mapie_size'][1]:.2f}"] if n["mapie_size"] else ["–", "–"]
            text += row([name, str(shot), f"{100 * n['accuracy']:.1f}", percent(n["covered"]), f"{n['size'][0]:.2f} ± {n['size'][1]:.2f}", *theirs, f"{100 * n['calibration_error']:.1f}", f"{100 * n['sklearn_calibration_error']:.1f}", f"{n['brier']:.3f}", f"{n['sklearn_brier']:.3f}"])
    text += f"\n## Known or never shown: {WAY} categories with {NOVELTY_SHOT} examples each against {WAY} others\n\n"
    text += f"AUROC × 100; set aside, in %, where {ASIDE:.0%} of the known was asked for.\n\n"
    references = list(next(iter(numbers["novelty"].values()))["references"])
    head = ["set", "AUROC", *references, "known set aside", "never shown set aside"]
    text += row(head) + row(["---"] * len(head))
    for name, n in numbers["novelty"].items():
        text += row([name, percent(n["auroc"]), *(percent(n["references"][key]) if n["references"] else "–" for key in references), percent(n["known_set_aside"]), percent(n["unknown_set_aside"])])
    text += f"\n## Doubts: {PLANTED:.0%} wrong answers planted, {WAY} categories\n\n"
    text += f"Found, in %, among the first {LOOKED_AT:.0%} of the answers by doubt. Beside it cleanlab {cleanlab_version}: normalized margin of 5-fold logistic regression.\n\n"
    head = ["set", "shots", "found", "cleanlab"]
    text += row(head) + row(["---"] * len(head))
    for name, n in numbers["doubts"].items():
        text += row([name, str(n["shot"]), percent(n["found"]), percent(n["cleanlab_found"])]) if n else row([name, "–", "too few items", "–"])
    return text + f"\nReferences: scikit-learn {sklearn_version}, MAPIE {mapie_version}, cleanlab {cleanlab_version}.\n"


def run(count, seed, say):
    warnings.simplefilter("ignore")
    for name in SETS:
        embed.vectors_of(name, say)
    starter, _ = accuracy.starter(say)
    numbers = {"draws": count, "plausible": {}, "novelty": {}, "doubts": {}}
    for name in SETS:
        numbers["plausible"][name] = {shot: plausible(name, shot, count, seed, say) for shot in SHOTS}
        numbers["novelty"][name] = novelty(name, count, seed, say)
        if name in PICTURES:
            numbers["novelty"][f"{name}, with a starter from other icons"] = novelty(name, count, seed, say, starter)
        numbers["doubts"][name] = doubts(name, count, seed, say)
    return numbers, table(numbers)
