"""Reference values for the learners, computed by scikit-learn and numpy on tables that scikit-learn carries.

Writes tests/data/learners.json, which tests/learner_values.rs compares with. `--check` compares the file that is there
instead and exits with 1 where it differs.
"""

import json
import sys
from pathlib import Path

import numpy as np
import sklearn
from sklearn.datasets import load_digits, load_iris, load_wine
from sklearn.discriminant_analysis import LinearDiscriminantAnalysis
from sklearn.linear_model import Ridge
from sklearn.metrics import log_loss
from sklearn.neighbors import NearestCentroid
from sklearn.preprocessing import StandardScaler

OUT = Path(__file__).resolve().parents[2] / "tests" / "data" / "learners.json"
STEPS, STEP_SIZE, BIAS_STEP_SIZE, TEMPERATURE = 10, 20.0, 2.0, 6.0


def unit(x):
    return x / np.linalg.norm(x, axis=1, keepdims=True)


def task(table, counts, seed):
    """Unit vectors of a table: `counts[c]` examples of category c and up to 8 queries of each."""
    x, y = table.data, table.target
    x = unit(StandardScaler().fit_transform(x)).astype(np.float32)
    random = np.random.Generator(np.random.PCG64(seed))
    support, query = [], []
    for category, count in enumerate(counts):
        members = random.permutation(np.flatnonzero(y == category))
        support += members[:count].tolist()
        query += members[count : count + 8].tolist()
    return x[support], y[support], x[query]


def ridge(x, y, query, penalty):
    """Category means of squared errors plus penalty · ‖W‖²: scikit-learn's Ridge with weights 1/n_c; then fairness to few."""
    categories = y.max() + 1
    targets = np.eye(categories)[y] - 1 / categories
    fit = Ridge(alpha=penalty).fit(x.astype(np.float64), targets, sample_weight=1 / np.bincount(y)[y])
    return (fit.predict(query.astype(np.float64)) + 1 / categories) * fairness(x.astype(np.float64), y, penalty) - 1 / categories


def fairness(x, y, penalty):
    """What a category's scores are multiplied by: the geometric mean of r/(r + (1 − r)/n_c + penalty) over its own, r the share in
    common."""
    counts = np.bincount(y)
    if len(y) == len(counts):
        return np.ones(len(counts))
    means = np.stack([x[y == c].mean(0) for c in range(len(counts))])
    variance = ((x - means[y]) ** 2).sum() / (len(y) - len(counts))
    square = (x**2).sum(1).mean()
    common = np.clip(1 - variance / square, 0.05, 1)
    scores = common / (common + (1 - common) / counts + penalty / square)
    return np.exp(np.log(scores).mean()) / scores


def ridge_left_out(x, y, penalty):
    """Refits without each example; None where its category would be empty."""
    counts = np.bincount(y)
    rows = []
    for i in range(len(y)):
        keep = np.arange(len(y)) != i
        rows.append(ridge(x[keep], y[keep], x[i : i + 1], penalty)[0].tolist() if counts[y[i]] > 1 else None)
    return rows


def prototype(x, y):
    """Weights and bias of −‖z − mean_c‖² + s²/n_c, but for ‖z‖²; s² the pooled variance within categories."""
    counts = np.bincount(y)
    means = np.stack([x[y == c].mean(0) for c in range(len(counts))])
    variance = ((x - means[y]) ** 2).sum() / max(len(y) - len(counts), 1)
    return 2 * means, variance / counts - (means**2).sum(1)


def discriminant(x, y, query, regularisation):
    """Linear discriminants with ν = ρ tr(T)/d, as scikit-learn has them: the shrinkage γ with γ/(1 − γ) = ρ. In units of Q."""
    d, n = x.shape[1], len(y)
    gamma = regularisation / (1 + regularisation)
    means = np.stack([x[y == c].mean(0) for c in range(y.max() + 1)])
    penalty = regularisation * ((x - means[y]) ** 2).sum() / d
    model = LinearDiscriminantAnalysis(solver="lsqr", shrinkage=gamma).fit(x, y)
    # Its covariance is (1 − γ)/n (T + ν I), and its scores are half of ours over that.
    return {"penalty": penalty, "logits": (model.decision_function(query) * 2 * (1 - gamma) / n * penalty).tolist()}


def descent(dimension, seed):
    """Directions in two groups beside the rest, a start scale for each, and steps of different sizes."""
    random = np.random.Generator(np.random.PCG64(seed))
    rank = min(3, dimension - 1)
    directions = np.linalg.qr(random.standard_normal((dimension, rank)))[0].T.astype(np.float32)
    sizes = random.uniform(0, 30, (STEPS, 4)).round(3)
    return {"directions": directions.tolist(), "ends": [1, rank], "start": [0.4, 1.7, 0.9], "steps": sizes.tolist()}


def groups_of(descent):
    """The map onto each group: U_gᵀ U_g, and what is left for the rest."""
    directions, ends = np.array(descent["directions"]), descent["ends"]
    parts = [directions[start:end] for start, end in zip([0, *ends], ends)]
    maps = [part.T @ part for part in parts]
    return [*maps, np.eye(directions.shape[1]) - sum(maps)]


def gradient(x, y, query, maps, start, sizes):
    """Full-batch steps down the category-balanced log loss in weight space, from the prototypes under Σ a_g M_g.

    Steps see examples from the mean of the categories' means.
    """
    counts = np.bincount(y)
    categories = len(counts)
    metric = sum(a * m for a, m in zip(start, maps))
    means = np.stack([x[y == c].mean(0) for c in range(categories)])
    apart = x - means[y]
    variance = (apart @ metric * apart).sum() / max(len(y) - categories, 1)
    weights = 2 * TEMPERATURE * means @ metric
    bias = TEMPERATURE * (variance / counts - (means @ metric * means).sum(1))
    share = 1 / (counts[y] * categories)
    middle = means.mean(0)
    for *by_group, by_bias in sizes:
        logits = x @ weights.T + bias
        p = np.exp(logits - logits.max(1, keepdims=True))
        p /= p.sum(1, keepdims=True)
        error = (p - np.eye(categories)[y]) * share[:, None]
        step = error.T @ (x - middle) @ sum(size * m for size, m in zip(by_group, maps))
        weights = weights - step
        bias = bias + step @ middle - by_bias * error.sum(0)
    logits = x @ weights.T + bias
    loss = log_loss(y, np.exp(logits) / np.exp(logits).sum(1, keepdims=True), sample_weight=share)
    return (query @ weights.T + bias).tolist(), loss


def values():
    tasks = []
    for name, table, counts in [
        ("iris", load_iris(), [4, 4, 4]),
        ("iris, uneven", load_iris(), [9, 3, 1]),
        ("wine", load_wine(), [5, 2, 7]),
        ("digits", load_digits(), [3] * 10),
    ]:
        x, y, query = task(table, counts, seed=len(tasks) + 1)
        wide, wide_query = x.astype(np.float64), query.astype(np.float64)
        even_steps = [[STEP_SIZE, BIAS_STEP_SIZE]] * STEPS
        gradient_logits, gradient_loss = gradient(wide, y, wide_query, [np.eye(wide.shape[1])], [1], even_steps)
        grouped = descent(wide.shape[1], seed=len(tasks) + 1)
        grouped["logits"], grouped["loss"] = gradient(wide, y, wide_query, groups_of(grouped), grouped["start"], grouped["steps"])
        weights, bias = prototype(wide, y)
        even = len(set(counts)) == 1
        tasks.append(
            {
                "name": name,
                "labels": y.tolist(),
                "examples": x.tolist(),
                "queries": query.tolist(),
                # scikit-learn takes nothing off for uneven counts.
                "nearest_centroid": NearestCentroid().fit(x, y).predict(query).tolist() if even else None,
                "prototype": (wide_query @ weights.T + bias).tolist(),
                # With two categories scikit-learn gives one score; with uneven counts it takes them for shares.
                "discriminant": [discriminant(wide, y, wide_query, rho) for rho in (0.1, 1, 10)] if even else [],
                "ridge": [
                    {"penalty": p, "logits": ridge(x, y, query, p).tolist(), "left_out": ridge_left_out(x, y, p)} for p in (0.02, 0.3)
                ],
                "gradient": gradient_logits,
                "gradient_loss": gradient_loss,
                "descent": grouped,
            }
        )
    return {
        "source": "UCI tables iris, wine and digits as scikit-learn carries them, standardised, unit length",
        "scikit-learn": sklearn.__version__,
        "numpy": np.__version__,
        "steps": STEPS,
        "step_size": STEP_SIZE,
        "bias_step_size": BIAS_STEP_SIZE,
        "temperature": TEMPERATURE,
        "tasks": tasks,
    }


def close(a, b):
    if isinstance(a, dict):
        return a.keys() == b.keys() and all(close(a[k], b[k]) for k in a)
    if isinstance(a, list):
        return isinstance(b, list) and len(a) == len(b) and all(map(close, a, b))
    return abs(a - b) < 1e-5 if isinstance(a, float) and isinstance(b, float) else a == b


def rounded(value):
    if isinstance(value, dict):
        return {k: rounded(v) for k, v in value.items()}
    if isinstance(value, list):
        return [rounded(v) for v in value]
    return round(value, 7) if isinstance(value, float) else value


if __name__ == "__main__":
    new = rounded(values())
    if sys.argv[1:] == ["--check"]:
        same = close(json.loads(OUT.read_text()), new)
        print("learner values:", "as committed" if same else "differ from tests/data/learners.json")
        print(f"{int(same)} passed, {int(not same)} failed")
        sys.exit(not same)
    OUT.write_text(json.dumps(new, separators=(",", ":")) + "\n")
