"""Seconds that SciPy's cKDTree takes to build and to find all k nearest, two workers.

usage: ckdtree.py N D K: reads N * D little-endian float64 from standard input and prints "build query" in seconds.
"""
import sys
import time

import numpy as np
from scipy.spatial import cKDTree

n, d, k = map(int, sys.argv[1:])
x = np.frombuffer(sys.stdin.buffer.read(), dtype="<f8").reshape(n, d)
t0 = time.perf_counter()
tree = cKDTree(x)
t1 = time.perf_counter()
tree.query(x, k=k + 1, workers=2)
print(t1 - t0, time.perf_counter() - t1)
