"""Reference values for the spread of labels over a pile and for the greedy choice of questions.

Spread: scikit-learn's LabelSpreading (Zhou et al. 2004) on the same affinity, a mutual-or-one-way 10-nearest-neighbour graph of
pile-centred unit vectors with cubed cosines, α = 0.9. Choice: facility location on the two-step kernel of that graph, greedily
over the whole matrix in numpy.

    propagation_values.py            writes tests/data/propagation.json
    propagation_values.py --check    computes the values again and compares
"""

import json
import sys
import warnings
from pathlib import Path

import numpy as np
from scipy.sparse.csgraph import laplacian
from sklearn.semi_supervised import LabelSpreading

FILE = Path(__file__).resolve().parents[2] / "tests" / "data" / "propagation.json"
NEIGHBOURS, ALPHA, CAUTION = 10, 0.9, 2


def affinity(vectors):
    unit = vectors / np.linalg.norm(vectors, axis=1, keepdims=True)
    seen = unit - unit.sum(axis=0) / (len(unit) + CAUTION)
    seen /= np.linalg.norm(seen, axis=1, keepdims=True)
    cosines = seen @ seen.T
    np.fill_diagonal(cosines, -2)
    weights = np.zeros_like(cosines)
    for item, row in enumerate(cosines):
        nearest = np.argsort(-row, kind="stable")[:NEIGHBOURS]
        weights[item, nearest] = np.maximum(row[nearest], 0) ** 3
    return np.maximum(weights, weights.T)


def spread(weights, labels):
    model = LabelSpreading(kernel=lambda a, b: weights, alpha=ALPHA, max_iter=2000, tol=1e-12)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        model.fit(np.arange(len(weights), dtype=float)[:, None], labels)
    return model.label_distributions_


def choose(weights, count):
    s = -laplacian(weights, normed=True)
    np.fill_diagonal(s, 0)
    step = ALPHA * s
    kernel = np.eye(len(s)) + step + step @ step
    root = np.sqrt(np.diag(kernel))
    kernel /= root[:, None] * root
    chosen, cover = [], np.zeros(len(s))
    for _ in range(count):
        gain = np.maximum(kernel - cover[:, None], 0).sum(axis=0)
        gain[chosen] = -1
        chosen.append(int(gain.argmax()))
        cover = np.maximum(cover, kernel[:, chosen[-1]])
    return chosen


def values():
    random = np.random.default_rng(5)
    categories, items, dimension = 4, 60, 12
    truth = np.arange(items) % categories
    middles = random.normal(size=(categories, dimension))
    vectors = (1.1 * middles[truth] + random.normal(size=(items, dimension))).astype(np.float32)
    labels = np.full(items, -1)
    answered = [0, 1, 2, 3, 4, 9, 14, 20, 31]
    labels[answered] = truth[answered]
    weights = affinity(vectors.astype(np.float64))
    return {
        "vectors": vectors.astype(float).tolist(),
        "answers": [[item, int(truth[item])] for item in answered],
        "spread": spread(weights, labels).tolist(),
        "chosen": choose(weights, 12),
    }


def main():
    found = values()
    if sys.argv[1:] == ["--check"]:
        kept = json.loads(FILE.read_text())
        assert kept["chosen"] == found["chosen"], "other questions"
        np.testing.assert_allclose(kept["spread"], found["spread"], atol=1e-9)
        print(f"propagation: {len(kept['spread'])} items as scikit-learn spreads labels, {len(kept['chosen'])} questions as numpy chooses")
    else:
        FILE.write_text(json.dumps(found) + "\n")


if __name__ == "__main__":
    main()
