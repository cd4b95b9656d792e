"""The hand-written route that the whole-program benchmark compares with: pandas, SciPy's k-d tree on two workers,
a locally scaled 10-nearest graph, conjugate gradients with the diagonal as preconditioner to 1e-8, and pandas again.

usage: yardstick.py TABLE LABEL OUT     (needs pandas and SciPy; Debian: python3-pandas, python3-scipy)
Prints one line: seconds a stage, and conjugate-gradient iterations.
"""
import sys
import time

import numpy as np
import pandas as pd
import scipy.sparse as sp
import scipy.sparse.linalg as sla
from scipy.spatial import cKDTree

table, label, out = sys.argv[1:4]
t = [time.perf_counter()]
df = pd.read_csv(table)
y = df[label].to_numpy()
x = df.drop(columns=[label]).to_numpy(float)
x = (x - x.mean(0)) / x.std(0)
t.append(time.perf_counter())
dist, idx = cKDTree(x).query(x, k=11, workers=2)
t.append(time.perf_counter())
n = len(x)
s = dist[:, 7]
i = np.repeat(np.arange(n), 10)
j = idx[:, 1:].ravel()
d = dist[:, 1:].ravel()
w = np.exp(-d * d / (s[i] * s[j]))  # the square of exp(-d^2/(2 s_i s_j)): the conductance of the slope energy at p = 2
a = sp.coo_matrix((w, (i, j)), shape=(n, n)).tocsr()
a = a.maximum(a.T)
held = ~np.isnan(y)
free = ~held
deg = np.asarray(a.sum(1)).ravel()
lap = sp.diags(deg) - a
luu = lap[free][:, free].tocsr()
rhs = -(lap[free][:, held] @ y[held])
t.append(time.perf_counter())
dia = luu.diagonal()
its = 0


def count(_):
    global its
    its += 1


f, info = sla.cg(luu, rhs, tol=1e-8, maxiter=100000, M=sla.LinearOperator(luu.shape, lambda v: v / dia), callback=count)
if info != 0:
    raise SystemExit("conjugate gradients did not converge")
t.append(time.perf_counter())
y[free] = f
df["pinfill_label"] = y
df.to_csv(out, index=False)
t.append(time.perf_counter())
names = ["read", "neighbours", "graph", "solve", "write"]
print(" ".join(f"{k} {b - a:.2f}" for k, a, b in zip(names, t, t[1:])), f"total {t[-1] - t[0]:.2f} iterations {its}")
