"""What scikit-learn makes of the same episodes, at its default settings unless the name says otherwise.

Each method is given unit-length vectors: as they come (the usual way), after the square root that Kenspeckle takes of
never-negative ones, and seen from the mean of the episode's examples and queries, which a method that sorts items one by one
can't know. So a table shows how much is the space and how much the learner.

Every episode is first projected on an orthonormal basis of the span of its examples. Methods that see vectors only through inner
products or distances (all but shrunk LDA) predict the same there: what of a query lies outside that span adds nothing to an inner
product with an example, and the same to its squared distance from each. So 1280 dimensions cost what as many examples do.
`python references.py --check` holds the two against each other.
"""

import argparse
import hashlib
import json
import os
import sys
import time
import warnings

# Problems of a few dozen rows get slower with more threads.
os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import numpy as np
import sklearn
from sklearn.discriminant_analysis import LinearDiscriminantAnalysis
from sklearn.linear_model import LogisticRegression, LogisticRegressionCV, RidgeClassifierCV
from sklearn.model_selection import StratifiedKFold
from sklearn.neighbors import KNeighborsClassifier, NearestCentroid
from sklearn.svm import LinearSVC

import episodes
import sets

# Episodes are so small that checking inputs takes longer than some methods do.
sklearn.set_config(assume_finite=True, skip_parameter_validation=True)

CV = "logistic regression, C by cross-validation"
LDA = "shrunk LDA"
CHOICES_OF_C = [0.1, 1, 10, 100, 1000]
MOST_FOLDS = 5


def cross_validated(shot):
    folds = StratifiedKFold(min(MOST_FOLDS, shot), shuffle=False)
    return LogisticRegressionCV(Cs=CHOICES_OF_C, cv=folds, l1_ratios=(0,), use_legacy_attributes=False)


METHODS = {
    "1-nearest neighbour": lambda shot: KNeighborsClassifier(1),
    "nearest centroid": lambda shot: NearestCentroid(),
    "logistic regression": lambda shot: LogisticRegression(),
    "logistic regression, C = 10": lambda shot: LogisticRegression(C=10),
    CV: cross_validated,
    "RidgeClassifierCV": lambda shot: RidgeClassifierCV(),
    "linear SVC": lambda shot: LinearSVC(random_state=0),
    LDA: lambda shot: LinearDiscriminantAnalysis(solver="lsqr", shrinkage="auto"),
}
LOGISTIC = ["logistic regression", "logistic regression, C = 10", CV]
# These take long: they sort the first episodes only.
FIRST_EPISODES = {CV: 60, LDA: 100}
# And this one takes ten times as long as the next: the spaces that sort item by item are what it is compared in.
NOT_IN_THE_PILE = [CV]
# One example a category leaves nothing to validate on; from two, shrunk LDA estimates no spread to shrink and guesses.
LEAST_SHOT = {CV: 2, LDA: 3}
# Shrunk LDA scales every dimension by itself, so the basis matters to it. It gets the vectors as they are up to this dimension;
# beyond, where its solver takes a second and more an episode, the projected ones.
MOST_DIMENSIONS_OF_LDA = 512
# Methods whose `predict_proba` goes with their `predict`: a single neighbour's is 0 or 1, and nearest centroid scales each feature
# there by its spread, which it does not do in `predict` and can't do with one example a category.
WITH_PROBABILITIES = {*LOGISTIC, LDA}
# The bound keeps one certain mistake from being infinite; log loss is reported in nats.
LEAST_PROBABILITY = 1e-6
# How often, in seconds, what was measured is written down.
WRITE_EVERY = 20


def one_by_one(name):
    """The spaces in which an item is placed without knowing the others."""
    return ["unit length", "square root, unit length"] if sets.ALL[name].non_negative else ["unit length"]


def pile_centred(name):
    """The space that needs the whole pile."""
    return "square root, pile-centred, unit length" if sets.ALL[name].non_negative else "pile-centred, unit length"


def spaces(name):
    return [*one_by_one(name), pile_centred(name)]


def unit(values):
    return values / np.maximum(np.linalg.norm(values, axis=1, keepdims=True), 1e-12)


def placed(vectors, space):
    values = vectors.astype(np.float64)
    return unit(np.sqrt(values) if space.startswith("square root") else values)


def as_seen(values, episode, space):
    """Examples and queries of an episode in a space."""
    support, query = values[episode["support"]], values[episode["query"]]
    if "pile-centred" in space:
        centre = np.concatenate([support, query]).mean(axis=0)
        support, query = unit(support - centre), unit(query - centre)
    return support, query


def projected(support, query):
    """Both in an orthonormal basis of the examples' span."""
    if len(support) >= support.shape[1]:
        return support, query
    basis, _ = np.linalg.qr(support.T)
    return support @ basis, query @ basis


def log_loss(probabilities, labels):
    chosen = probabilities[np.arange(len(labels)), labels]
    return float(-np.log(np.maximum(chosen, LEAST_PROBABILITY)).mean())


def measure(method, shot, support, query, episode):
    """Accuracy and, where there are probabilities, log loss of one method in one episode."""
    labels = np.array(episode["query_labels"])
    model = METHODS[method](shot).fit(support, episode["support_labels"])
    accuracy = float((model.predict(query) == labels).mean())
    return accuracy, log_loss(model.predict_proba(query), labels) if method in WITH_PROBABILITIES else None


class Kept:
    """What was measured before, in data/bench/references: one file a set, space and method, one entry an episode."""

    def __init__(self, vectors, space, method):
        key = f"{hashlib.sha256(vectors.tobytes()).hexdigest()} {space} {method} {CHOICES_OF_C} {sklearn.__version__} {LEAST_PROBABILITY} projected"
        self.path = sets.DATA / "bench" / "references" / f"{hashlib.sha256(key.encode()).hexdigest()[:24]}.json"
        self.entries = json.loads(self.path.read_text()) if self.path.exists() else {}

    def write(self):
        self.path.parent.mkdir(parents=True, exist_ok=True)
        whole = self.path.with_suffix(f".{os.getpid()}.tmp")
        whole.write_text(json.dumps(self.entries))
        whole.replace(self.path)


def fingerprint(episode):
    return hashlib.sha256(json.dumps(episode).encode()).hexdigest()[:24]


def run(path, methods=None, say=lambda text: None):
    """Runs the methods on a file of episodes: {space: {method: {accuracy, log_loss}}}, a number an episode.

    What was measured once is kept for next time, so an interrupted run goes on where it stopped.
    """
    header, *drawn = [json.loads(line) for line in path.read_text().splitlines()]
    names = [fingerprint(episode) for episode in drawn]
    vectors = sets.read_vectors(header["set"])
    methods = [method for method in methods or METHODS if header["shot"] >= LEAST_SHOT.get(method, 1)]
    result = {}
    for space in spaces(header["set"]):
        values = placed(vectors, space)
        own = [method for method in methods if not (space == pile_centred(header["set"]) and method in NOT_IN_THE_PILE)]
        kept = {method: Kept(vectors, space, method) for method in own}
        start = written = time.monotonic()
        fresh = 0
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            for place, (name, episode) in enumerate(zip(names, drawn)):
                wanted = [m for m in own if place < FIRST_EPISODES.get(m, len(drawn)) and name not in kept[m].entries]
                if not wanted:
                    continue
                whole = as_seen(values, episode, space)
                small = projected(*whole)
                for method in wanted:
                    seen = whole if method == LDA and vectors.shape[1] <= MOST_DIMENSIONS_OF_LDA else small
                    kept[method].entries[name] = measure(method, header["shot"], *seen, episode)
                    fresh += 1
                if time.monotonic() - written > WRITE_EVERY:
                    for one in kept.values():
                        one.write()
                    written = time.monotonic()
        if fresh:
            for one in kept.values():
                one.write()
            say(f"{header['set']} {header['way']}-way {header['shot']}-shot: scikit-learn, {space}: {time.monotonic() - start:.0f} s")
        result[space] = {}
        for method in own:
            pairs = [kept[method].entries[name] for name in names[: FIRST_EPISODES.get(method)]]
            losses = [loss for _, loss in pairs] if method in WITH_PROBABILITIES else None
            result[space][method] = {"accuracy": [accuracy for accuracy, _ in pairs], "log_loss": losses}
    return result


# So many of 10 000 predictions may differ: solvers stop within a tolerance, which a few items lie in.
MOST_DIFFERING = 20


def check(name, way, shot, count=20, say=print):
    """Whether projecting changes predictions: counts the queries that each method sorts differently without it."""
    _, drawn = episodes.draw(sets.read_categories(name), way, shot, count, 1)
    vectors = sets.read_vectors(name)
    passed = True
    for space in spaces(name):
        values = placed(vectors, space)
        for method in METHODS:
            if method == LDA or shot < LEAST_SHOT.get(method, 1):
                continue
            differing = total = 0
            for episode in drawn:
                whole = as_seen(values, episode, space)
                small = projected(*whole)
                with warnings.catch_warnings():
                    warnings.simplefilter("ignore")
                    one, other = (METHODS[method](shot).fit(s, episode["support_labels"]).predict(q) for s, q in (whole, small))
                differing, total = differing + int((one != other).sum()), total + len(one)
            passed &= differing * 10_000 <= MOST_DIFFERING * total
            say(f"{name} {way}-way {shot}-shot, {space}, {method}: {differing} of {total} predictions differ")
    return passed


def main():
    if "--check" in sys.argv:
        parser = argparse.ArgumentParser(description="Does projecting on the examples' span change predictions?")
        parser.add_argument("--check", action="store_true")
        parser.add_argument("sets", nargs="*", default=["summaries"], metavar="SET")
        outcomes = [check(name, 5, shot) for name in parser.parse_args().sets for shot in (1, 5)]
        sys.exit(not all(outcomes))
    _, path, header = episodes.write_as_asked(__doc__)
    for space, methods in run(path, say=lambda text: print(text, file=sys.stderr)).items():
        for method, measured in methods.items():
            accuracy = np.array(measured["accuracy"]) * 100
            half = 1.96 * accuracy.std(ddof=1) / len(accuracy) ** 0.5
            loss = f"{np.mean(measured['log_loss']):.3f}" if measured["log_loss"] else "–"
            print(f"{header['set']} {header['way']}/{header['shot']} {space:38} {method:42} {accuracy.mean():5.1f} ± {half:.1f}  log loss {loss}")


if __name__ == "__main__":
    main()
