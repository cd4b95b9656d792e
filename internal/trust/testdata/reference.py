"""Writes reference.json: values of a general-purpose library for the tests of this package.

Run with Debian's python3-sklearn 1.2.1 (numpy 1.24.2, scipy 1.10.1): /usr/bin/python3 reference.py > reference.json
"""
import json
import sys

import numpy as np
import scipy.stats
import sklearn
from sklearn.calibration import calibration_curve
from sklearn.metrics import (accuracy_score, brier_score_loss, cohen_kappa_score, log_loss,
                             mean_absolute_error, mean_squared_error, r2_score)

r = np.random.default_rng(20260)
n, c = 120, 4
logits = r.normal(size=(n, c)) * 1.5
prob = np.round(np.exp(logits) / np.exp(logits).sum(1, keepdims=True), 6)
prob[:, -1] = 1 - prob[:, :-1].sum(1)
right = np.array([r.choice(c, p=np.maximum(p, 0) / np.maximum(p, 0).sum()) for p in prob])
lead, hit = prob.max(1), (prob.argmax(1) == right).astype(int)
true, mean = calibration_curve(hit, lead, n_bins=10, strategy="uniform")
counts = np.histogram(lead, np.linspace(0, 1, 11))[0]
counts = counts[counts > 0]
answer, value = r.normal(size=50), r.normal(size=50)
t = [0.1, 1.0, 2.5, 4.0, 12.0]
json.dump({
    "versions": {"sklearn": sklearn.__version__, "numpy": np.__version__, "scipy": scipy.__version__, "python": sys.version.split()[0]},
    "prob": prob.tolist(), "right": right.tolist(),
    "accuracy": accuracy_score(right, prob.argmax(1)),
    "brier": sum(brier_score_loss(right == k, prob[:, k]) for k in range(c)),
    "log_loss": log_loss(right, prob, labels=range(c)),
    "ece": float((counts / n * np.abs(true - mean)).sum()),
    "kappa": cohen_kappa_score(right, prob.argmax(1)),
    "answer": answer.tolist(), "value": value.tolist(),
    "rmse": mean_squared_error(value, answer, squared=False), "mae": mean_absolute_error(value, answer), "r2": r2_score(value, answer),
}, sys.stdout, indent=0)
