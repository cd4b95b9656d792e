#!/usr/bin/python3
"""Reference values for 1 < p < 2: writes reference.json beside itself.

Small random graphs; the minimiser of sum (w |f_i - f_j|)^p by reweighted least squares in 60-digit arithmetic
(mpmath), whose error falls by about 2 - p a step, run until the steps are below 1e-30 and the net flux at every
free vertex is below 1e-25 of the flux through it. Run once: python3 reference.py
"""
import json
import os
import random
import sys

import mpmath as mp

mp.mp.dps = 60


def graph(rng):
    n = rng.randint(5, 11)
    pairs = {(rng.randrange(v), v) for v in range(1, n)}
    for _ in range(2 * n):
        a, b = rng.randrange(n), rng.randrange(n)
        if a != b:
            pairs.add((min(a, b), max(a, b)))
    edges = [(a, b, round(rng.uniform(0, 3), 3)) for a, b in sorted(pairs)]
    fixed = sorted(rng.sample(range(n), rng.randint(2, 3)))
    return n, edges, fixed, [round(rng.random(), 3) for _ in fixed]


def minimise(n, edges, fixed, values, p):
    p = mp.mpf(p)
    held = dict(zip(fixed, values))
    free = [v for v in range(n) if v not in held]
    place = {v: k for k, v in enumerate(free)}
    w = [mp.exp(p * mp.mpf(repr(a))) for _, _, a in edges]
    f = [mp.mpf(repr(held[v])) if v in held else mp.mpf(0) for v in range(n)]
    weight = [mp.mpf(1)] * len(edges)
    for step in range(4000):
        A = mp.zeros(len(free), len(free))
        b = mp.zeros(len(free), 1)
        for (i, j, _), we, c in zip(edges, w, weight):
            c = c * we
            for u, v in ((i, j), (j, i)):
                if u in place:
                    A[place[u], place[u]] += c
                    if v in place:
                        A[place[u], place[v]] -= c
                    else:
                        b[place[u]] += c * f[v]
        x = mp.lu_solve(A, b)
        moved = max(abs(x[place[v]] - f[v]) for v in free)
        for v in free:
            f[v] = x[place[v]]
        if step > 5 and moved < mp.mpf(10) ** -30:
            break
        weight = [max(abs(f[i] - f[j]), mp.mpf(10) ** -50) ** (p - 2) for i, j, _ in edges]
    worst = mp.mpf(0)
    for v in free:
        net, total = mp.mpf(0), mp.mpf(0)
        for (i, j, _), we in zip(edges, w):
            if v in (i, j):
                d = f[v] - f[j if v == i else i]
                phi = we * abs(d) ** (p - 1)
                net += mp.sign(d) * phi
                total += phi
        if total > mp.mpf(10) ** -20:
            worst = max(worst, abs(net) / total)
    return f, step, worst


def main():
    rng = random.Random(20261201)
    out = {"python": sys.version.split()[0], "mpmath": mp.__version__, "digits": mp.mp.dps, "problems": []}
    for p in ("1.1", "1.25", "1.5", "1.75", "1.9"):
        for _ in range(8 if p != "1.1" else 4):
            n, edges, fixed, values = graph(rng)
            f, step, worst = minimise(n, edges, fixed, values, p)
            print(p, n, step, mp.nstr(worst, 3), file=sys.stderr)
            if worst > mp.mpf(10) ** -25:
                continue
            out["problems"].append({"p": float(p), "n": n, "edges": edges, "fixed": fixed, "values": values,
                                    "f": [mp.nstr(t, 20) for t in f]})
    here = os.path.dirname(os.path.abspath(__file__))
    with open(os.path.join(here, "reference.json"), "w") as fh:
        json.dump(out, fh, indent=1)
        fh.write("\n")


main()
