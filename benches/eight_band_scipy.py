"""Times scipy's sparse shift-invert on the matrix that `cargo bench --bench eight_band` has written.

    python benches/eight_band_scipy.py [MATRIX]          default: target/eight_band_matrix.txt

Prints the median time for the states nearest the shift with vectors, factorisation included, and the levels.
"""

import statistics
import sys
import time
from pathlib import Path

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.linalg import eigsh

path = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent.parent / "target" / "eight_band_matrix.txt"
head = path.read_text(encoding="utf-8").splitlines()[0]
rows = int(head.split()[1])
shift = float(head.split("shift")[1].split()[0])
states = int(head.split(",")[1].split()[0])
r, c, v = np.loadtxt(path, unpack=True)
matrix = coo_matrix((v, (r.astype(int), c.astype(int))), shape=(rows, rows)).tocsc()
times = []
for _ in range(30):
    start = time.perf_counter()
    values, _ = eigsh(matrix, k=states, sigma=shift, which="LM")
    times.append(time.perf_counter() - start)
print(f"{rows} rows, {matrix.nnz} entries: {1e3 * statistics.median(times):.2f} ms (best {1e3 * min(times):.2f} ms)")
print(np.sort(values))
