"""Reference values for intervals, spot checks and calibration, computed by scipy, statsmodels and scikit-learn.

Writes tests/data/trust.json, which tests/trust_values.rs compares with. `--check` compares the file that is there instead and
exits with 1 where it differs.
"""

import json
import sys
from pathlib import Path

import numpy as np
import scipy
import sklearn
import statsmodels
from scipy.stats import beta, binomtest, hypergeom
from sklearn.calibration import calibration_curve
from sklearn.metrics import brier_score_loss, log_loss
from statsmodels.stats.proportion import proportion_confint

OUT = Path(__file__).resolve().parents[2] / "tests" / "data" / "trust.json"
COUNTS = [(0, 1), (1, 1), (0, 5), (3, 5), (5, 5), (8, 10), (9, 10), (17, 20), (47, 50), (0, 59), (12, 78), (155, 200), (9000, 10000)]
CONFIDENCES = [0.8, 0.9, 0.95, 0.99]
# Pile, looked at, wrong.
CHECKS = [(20, 5, 0), (20, 20, 0), (30, 12, 3), (100, 45, 0), (412, 78, 0), (412, 78, 3), (1000, 58, 0), (5000, 250, 12), (100_000, 59, 0), (100_000, 300, 1)]
# Pile, tolerance, errors allowed.
PLANS = [(50, 0.05, 0), (200, 0.05, 0), (200, 0.02, 1), (412, 0.05, 0), (1000, 0.01, 0), (1000, 0.05, 2), (10_000, 0.05, 0), (10_000, 0.01, 1)]


def interval(count, of, confidence):
    exact = binomtest(count, of).proportion_ci(confidence, method="exact")
    also = proportion_confint(count, of, 1 - confidence, method="beta")
    if max(abs(exact.low - also[0]), abs(exact.high - also[1])) > 1e-9:
        raise SystemExit(f"scipy and statsmodels differ at {count} of {of}")
    wilson = [float(end) for end in proportion_confint(count, of, 1 - confidence, method="wilson")]
    upper = 1.0 if count == of else float(beta.ppf(confidence, count + 1, of - count))
    return {"count": count, "of": of, "confidence": confidence, "wilson": wilson, "exact": [float(exact.low), float(exact.high)], "at_most": upper}


def most_wrong(items, looked_at, wrong, confidence):
    """The largest number of wrong items that would show so few more often than 1 − confidence."""
    low, high = wrong, items - (looked_at - wrong)
    while low < high:
        middle = (low + high + 1) // 2
        low, high = (middle, high) if hypergeom.cdf(wrong, items, middle, looked_at) > 1 - confidence + 1e-12 else (low, middle - 1)
    return low


def sample_size(items, tolerance, allowed, confidence):
    """The fewest items after which, with as many errors found as allowed and corrected, no more than tolerated are left."""
    total = int(tolerance * items + 1e-9) + allowed + 1
    low, high = allowed, items
    while low < high:
        middle = (low + high) // 2
        enough = total > items - (middle - allowed) or hypergeom.cdf(allowed, items, total, middle) <= 1 - confidence + 1e-12
        low, high = (low, middle) if enough else (middle + 1, high)
    return low


def calibration():
    """Probabilities of four categories, too sure of themselves, and what scikit-learn says of them."""
    random = np.random.Generator(np.random.PCG64(5))
    logits = random.normal(size=(60, 4))
    labels = [int(random.choice(4, p=row)) for row in np.exp(logits) / np.exp(logits).sum(1, keepdims=True)]
    probabilities = np.exp(2 * logits) / np.exp(2 * logits).sum(1, keepdims=True)
    probabilities = np.round(probabilities, 6)
    probabilities[:, -1] = 1 - probabilities[:, :-1].sum(1)
    right, top = probabilities.argmax(1) == labels, probabilities.max(1)
    true, mean = calibration_curve(right, top, n_bins=10, strategy="uniform")
    counts = np.histogram(top, np.linspace(0, 1, 11))[0]
    return {
        "labels": labels,
        "probabilities": probabilities.tolist(),
        "error": float((np.abs(true - mean) * counts[counts > 0]).sum() / len(top)),
        "brier": float(brier_score_loss(labels, probabilities, labels=range(4), scale_by_half=False)),
        "log_loss": float(log_loss(labels, probabilities, labels=range(4))),
        "bins": [[int(count), float(said), float(share)] for count, said, share in zip(counts[counts > 0], mean, true)],
    }


def values():
    return {
        "scikit-learn": sklearn.__version__,
        "calibration": calibration(),
        "scipy": scipy.__version__,
        "statsmodels": statsmodels.__version__,
        "intervals": [interval(*count, confidence) for count in COUNTS for confidence in CONFIDENCES],
        "checks": [
            {"items": items, "looked_at": looked_at, "wrong": wrong, "confidence": confidence, "most_wrong": most_wrong(items, looked_at, wrong, confidence)}
            for items, looked_at, wrong in CHECKS
            for confidence in (0.9, 0.95)
        ],
        "plans": [
            {"items": items, "tolerance": tolerance, "allowed": allowed, "confidence": confidence, "sample": sample_size(items, tolerance, allowed, confidence)}
            for items, tolerance, allowed in PLANS
            for confidence in (0.9, 0.95)
        ],
    }


def same(ours, theirs):
    if isinstance(ours, dict):
        return ours.keys() == theirs.keys() and all(same(ours[key], theirs[key]) for key in ours)
    if isinstance(ours, list):
        return len(ours) == len(theirs) and all(map(same, ours, theirs))
    return abs(ours - theirs) < 1e-9 if isinstance(ours, float) else ours == theirs


def main():
    computed = values()
    if "--check" not in sys.argv[1:]:
        OUT.write_text(json.dumps(computed, separators=(",", ":")) + "\n")
        return print(f"wrote {OUT.name}")
    if not same(computed, json.loads(OUT.read_text())):
        raise SystemExit(f"{OUT.name} differs from what scipy and statsmodels give; run this without --check and look at the change")
    print(f"{OUT.name}: the same")


if __name__ == "__main__":
    main()
