"""Writes the 10 nearest neighbours that SciPy's cKDTree finds on an open table, for reference_test.go.

usage: reference.py TABLE.csv > NAME.txt
Columns id and truth are left out; constant columns too; nothing is scaled; equal rows are taken once. Each line holds the
distances of one distinct row, in lexicographic order of the rows, and after a bar its neighbours' numbers in that order. Where
neighbours tie, SciPy's order is its own.
"""
import csv
import hashlib
import sys

import numpy as np
import scipy
from scipy.spatial import cKDTree

path = sys.argv[1]
with open(path, newline="") as f:
    table = list(csv.reader(f))
keep = [j for j, name in enumerate(table[0]) if name not in ("id", "truth")]
x = np.array([[float(row[j]) for j in keep] for row in table[1:]])
x = x[:, np.ptp(x, axis=0) > 0]
x = np.unique(x, axis=0)  # sorted lexicographically
dist, index = cKDTree(x).query(x, k=11)
sha = hashlib.sha256(open(path, "rb").read()).hexdigest()
print(f"# 10 nearest by scipy.spatial.cKDTree, SciPy {scipy.__version__}, NumPy {np.__version__}, Python {sys.version.split()[0]}")
print(f"# table {path.split('/')[-1]} sha256 {sha}, {len(x)} distinct rows in {x.shape[1]} columns, unscaled Euclidean")
for i in range(len(x)):
    own = [(d, j) for d, j in zip(dist[i], index[i]) if j != i][:10]
    print(" ".join(repr(float(d)) for d, _ in own), "|", " ".join(str(j) for _, j in own))
