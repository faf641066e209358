"""Times kneewise's states of large networks against one scipy.sparse.linalg.splu factorization of the linear system
that their solution satisfies, in one run: `python time_factorization.py [grid ladder random]`."""

import json
import pathlib
import subprocess
import sys
import tempfile
import time

import numpy as np
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu

HOME = pathlib.Path(__file__).parents[2]
# the default, and the better one for patterns that are nearly symmetric
ORDERINGS = {"COLAMD": {}, "MMD_AT_PLUS_A, symmetric mode": {"permc_spec": "MMD_AT_PLUS_A", "diag_pivot_thresh": 0.0,
                                                            "options": {"SymmetricMode": True}}}


def factorization(matrix, options):
    """Median seconds of five, or None where it fails or takes no end."""
    times = []
    for _ in range(5):
        start = time.perf_counter()
        try:
            splu(matrix, **options)
        except RuntimeError as problem:
            print(f"  splu: {problem}")
            return None
        times.append(time.perf_counter() - start)
        if times[-1] > 30:
            break
    return float(np.median(times))


def main(kinds):
    subprocess.run(["cargo", "build", "--quiet", "--release", "--example", "timing"], cwd=HOME, check=True)
    for kind in kinds or ["grid", "ladder"]:
        with tempfile.NamedTemporaryFile(suffix=".txt") as file:
            command = ["cargo", "run", "--quiet", "--release", "--example", "timing", "--", kind, file.name]
            ours = json.loads(subprocess.run(command, cwd=HOME, check=True, stdout=subprocess.PIPE).stdout)
            triplets = np.loadtxt(file.name)
        rows, columns = triplets[:, 0].astype(int), triplets[:, 1].astype(int)
        matrix = csc_matrix((triplets[:, 2], (rows, columns)), shape=(ours["size"], ours["size"]))
        print(f"{kind}: {ours['verdict']}, {ours['solves']} factorizations, residual {ours['residual']:.1e}, "
              f"states {ours['solve_s']:.3f} s, whole command {ours['whole_s']:.3f} s; "
              f"matrix {ours['size']} by {ours['size']} with {matrix.nnz} entries")
        for name, options in ORDERINGS.items():
            seconds = factorization(matrix, options)
            if seconds:
                print(f"  splu {name}: {seconds:.3f} s, states are {ours['solve_s'] / seconds:.2f} times that")


if __name__ == "__main__":
    main(sys.argv[1:])
