"""Reference values for the whitened space: scikit-learn's shrunk linear discriminant analysis on tables that it carries.

Whitening by the covariance within categories, drawn halfway to its mean variance, turns the nearest category mean into linear
discriminant analysis with shrinkage 0.5 and equal priors. Writes tests/data/whitening.json, which tests/whitening_values.rs compares
with. `--check` compares the file that is there instead and exits with 1 where it differs.
"""

import json
import sys
from pathlib import Path

import numpy as np
import sklearn
from sklearn.datasets import load_breast_cancer, load_iris, load_wine
from sklearn.discriminant_analysis import LinearDiscriminantAnalysis
from sklearn.preprocessing import StandardScaler

from learner_values import close, rounded, unit

OUT = Path(__file__).resolve().parents[2] / "tests" / "data" / "whitening.json"


def values():
    tables = []
    for name, table, each in [("iris", load_iris(), 30), ("wine", load_wine(), 30), ("breast cancer", load_breast_cancer(), 40)]:
        # Rounded first, so that the file holds what was computed with.
        x = unit(StandardScaler().fit_transform(table.data)).round(4).astype(np.float32)
        y = table.target
        random = np.random.Generator(np.random.PCG64(1))
        members = [random.permutation(np.flatnonzero(y == c)) for c in range(y.max() + 1)]
        # As many of each category: its empirical covariances then weigh the same in both.
        support = np.concatenate([own[:each] for own in members])
        query = np.concatenate([own[each : each + 10] for own in members])
        categories = len(members)
        analysis = LinearDiscriminantAnalysis(solver="lsqr", shrinkage=0.5, priors=np.full(categories, 1 / categories))
        wide = unit(x.astype(np.float64))
        analysis.fit(wide[support], y[support])
        # Discriminants of each category, whatever is the same for all taken off.
        scores = wide[query] @ analysis.coef_.T + analysis.intercept_
        if categories == 2:
            scores = np.stack([-scores[:, 0], scores[:, 0]], 1) / 2
        tables.append(
            {
                "name": name,
                "labels": y[support].tolist(),
                "examples": x[support].tolist(),
                "queries": x[query].tolist(),
                "scores": (scores - scores.mean(1, keepdims=True)).tolist(),
            }
        )
    return {"source": "UCI tables as scikit-learn carries them, standardised, unit length", "scikit-learn": sklearn.__version__, "tables": tables}


if __name__ == "__main__":
    new = rounded(values())
    if sys.argv[1:] == ["--check"]:
        same = close(json.loads(OUT.read_text()), new)
        print("whitening values:", "as committed" if same else "differ from tests/data/whitening.json")
        print(f"{int(same)} passed, {int(not same)} failed")
        sys.exit(not same)
    OUT.write_text(json.dumps(new, separators=(",", ":")) + "\n")
