#!/usr/bin/python3
"""Reference values from SciPy: writes scipy.json beside itself. Run once: /usr/bin/python3 scipy.py

Random graphs with slope weights w = exp(a) and a few held vertices. p = 2: scipy.sparse.linalg.spsolve on the
grounded Laplacian with conductances w^2. p = inf: the least steepest slope, min s with w |f_i - f_j| <= s on every edge
that has a free end, by scipy.optimize.linprog (HiGHS).
"""
import hashlib
import json
import os
import platform
import random
import sys

sys.path.pop(0)  # this file is called scipy.py; do not import it

import numpy as np
import scipy
import scipy.optimize
import scipy.sparse as sp
import scipy.sparse.linalg


def graph(rng):
    n = rng.randint(20, 120)
    pairs = {(rng.randrange(v), v) for v in range(1, n)}
    for _ in range(rng.randint(0, 3 * n)):
        a, b = rng.randrange(n), rng.randrange(n)
        if a != b:
            pairs.add((min(a, b), max(a, b)))
    edges = [(a, b, round(rng.uniform(0, 3), 3)) for a, b in sorted(pairs)]
    fixed = sorted(rng.sample(range(n), rng.randint(2, 8)))
    return n, edges, fixed, [round(rng.random(), 3) for _ in fixed]


def harmonic(n, edges, fixed, values):
    free = [v for v in range(n) if v not in fixed]
    i, j, a = (np.array(x) for x in zip(*edges))
    c = np.exp(2 * a)
    W = sp.coo_matrix((np.r_[c, c], (np.r_[i, j], np.r_[j, i])), (n, n)).tocsr()
    L = (sp.diags(np.asarray(W.sum(1)).ravel()) - W).tocsr()
    f = np.zeros(n)
    f[fixed] = values
    f[free] = scipy.sparse.linalg.spsolve(L[free][:, free].tocsc(), -L[free][:, fixed] @ np.array(values))
    return f.tolist()


def minimax(n, edges, fixed, values):
    rows = []
    for i, j, a in edges:
        if i in fixed and j in fixed:
            continue
        for s in (1, -1):
            row = np.zeros(n + 1)
            row[i], row[j], row[n] = s, -s, -np.exp(-a)
            rows.append(row)
    bounds = [(None, None)] * n + [(0, None)]
    for v, y in zip(fixed, values):
        bounds[v] = (y, y)
    cost = np.zeros(n + 1)
    cost[n] = 1
    r = scipy.optimize.linprog(cost, A_ub=sp.csr_matrix(np.array(rows)), b_ub=np.zeros(len(rows)), bounds=bounds,
                               method="highs")
    assert r.status == 0, r.message
    return r.fun


here = os.path.dirname(os.path.abspath(__file__))
rng = random.Random(20261201)
problems = []
for _ in range(24):
    g = graph(rng)
    problems.append({"n": g[0], "edges": g[1], "fixed": g[2], "values": g[3],
                     "harmonic": harmonic(*g), "minimax": minimax(*g)})
with open(__file__, "rb") as script:
    digest = hashlib.sha256(script.read()).hexdigest()
head = {"python": platform.python_version(), "numpy": np.__version__, "scipy": scipy.__version__, "script_sha256": digest}
with open(os.path.join(here, "scipy.json"), "w") as out:
    out.write(json.dumps(head)[:-1] + ', "problems": [\n' + ",\n".join(json.dumps(p) for p in problems) + "\n]}\n")
