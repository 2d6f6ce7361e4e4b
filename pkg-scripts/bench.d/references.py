"""What scikit-learn makes of the same episodes, at its default settings unless the name says otherwise.

Each method is given unit-length embeddings: as the encoder gives them (the usual way), after the square root that Kenspeckle takes
of never-negative ones, and seen from the mean of the episode's examples and queries, which a method that sorts items one by one
can't know. So a table shows how much is the space and how much the learner.
"""

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
from sklearn.linear_model import LogisticRegression, RidgeClassifierCV
from sklearn.neighbors import KNeighborsClassifier, NearestCentroid
from sklearn.svm import LinearSVC

import episodes
import sets

METHODS = {
    "1-nearest neighbour": lambda: KNeighborsClassifier(1),
    "nearest centroid": NearestCentroid,
    "logistic regression": LogisticRegression,
    "logistic regression, C = 10": lambda: LogisticRegression(C=10),
    "RidgeClassifierCV": RidgeClassifierCV,
    "linear SVC": LinearSVC,
    "shrunk LDA": lambda: LinearDiscriminantAnalysis(solver="lsqr", shrinkage="auto"),
}
# Solving in 1280 dimensions takes a second a time: this method sorts the first episodes only.
FIRST_EPISODES = {"shrunk LDA": 100}
# Methods whose `predict_proba` goes with their `predict`: a single neighbour's is 0 or 1, and nearest centroid scales each feature
# there by its spread, which it does not do in `predict` and can't do with one example a category.
WITH_PROBABILITIES = {"logistic regression", "logistic regression, C = 10", "shrunk LDA"}
ONE_BY_ONE = ["unit length", "square root, unit length"]
CENTRED = "square root, pile-centred, unit length"
SPACES = [*ONE_BY_ONE, CENTRED]
# The bound keeps one certain mistake from being infinite; log loss is reported in nats.
LEAST_PROBABILITY = 1e-6


def unit(values):
    return values / np.linalg.norm(values, axis=1, keepdims=True)


def placed(vectors, space):
    values = vectors.astype(np.float64)
    return unit(np.sqrt(values) if space.startswith("square root") else values)


def log_loss(probabilities, labels):
    chosen = probabilities[np.arange(len(labels)), labels]
    return float(-np.log(np.maximum(chosen, LEAST_PROBABILITY)).mean())


def measure(method, space, values, drawn):
    """Accuracy and, where there are probabilities, log loss of one method in each episode that it gets."""
    accuracy, loss = [], []
    for episode in drawn[: FIRST_EPISODES.get(method)]:
        support, query = values[episode["support"]], values[episode["query"]]
        if space == CENTRED:
            centre = np.concatenate([support, query]).mean(axis=0)
            support, query = unit(support - centre), unit(query - centre)
        labels = np.array(episode["query_labels"])
        model = METHODS[method]().fit(support, episode["support_labels"])
        accuracy.append(float((model.predict(query) == labels).mean()))
        if method in WITH_PROBABILITIES:
            loss.append(log_loss(model.predict_proba(query), labels))
    return {"accuracy": accuracy, "log_loss": loss or None}


def run(path, spaces, methods=None, say=lambda text: None):
    """Runs the methods on a file of episodes: {space: {method: {accuracy, log_loss}}}, kept in data/bench for next time."""
    header, *drawn = [json.loads(line) for line in path.read_text().splitlines()]
    vectors = sets.read_vectors(header["set"])
    result = {}
    for space in spaces:
        values = placed(vectors, space)
        result[space] = {}
        for method in methods or METHODS:
            if method == "shrunk LDA" and header["shot"] == 1:
                continue  # one example a category has no spread to shrink: it guesses
            key = hashlib.sha256()
            for part in (vectors.tobytes(), path.read_bytes(), f"{space} {method} {sklearn.__version__} {LEAST_PROBABILITY}".encode()):
                key.update(part)
            kept = sets.DATA / "bench" / "references" / f"{key.hexdigest()[:24]}.json"
            if not kept.exists():
                start = time.monotonic()
                with warnings.catch_warnings():
                    warnings.simplefilter("ignore")
                    measured = measure(method, space, values, drawn)
                kept.parent.mkdir(parents=True, exist_ok=True)
                kept.write_text(json.dumps(measured))
                say(f"{header['set']} {header['way']}-way {header['shot']}-shot: scikit-learn {method}, {space}: {time.monotonic() - start:.0f} s")
            result[space][method] = json.loads(kept.read_text())
    return result


def main():
    name, path, header = episodes.write_as_asked(__doc__)
    spaces = SPACES if sets.ALL[name].non_negative else ["unit length"]
    for space, methods in run(path, spaces, say=lambda text: print(text, file=sys.stderr)).items():
        for method, measured in methods.items():
            accuracy = np.array(measured["accuracy"]) * 100
            half = 1.96 * accuracy.std(ddof=1) / len(accuracy) ** 0.5
            loss = f"{np.mean(measured['log_loss']):.3f}" if measured["log_loss"] else "–"
            print(f"{header['set']} {header['way']}/{header['shot']} {space:38} {method:28} {accuracy.mean():5.1f} ± {half:.1f}  log loss {loss}")


if __name__ == "__main__":
    main()
