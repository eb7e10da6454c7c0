#!/usr/bin/env python3
"""Prints how many times faster nnls.Batch is than SciPy's nnls called per sample.

    python3 testdata/nnls/ratio.py            (from the root of the repository)

Both solve the same surveys, those of BenchmarkBatch, in one run and by turns;
the shortest of all turns counts for each. Batch includes its factorisation. For
SciPy the rows present are picked out before the clock starts. The answers are
compared too, and so is the rate of a large matrix product.
"""
import platform
import re
import subprocess
import sys
import tempfile
import time

import numpy as np
import scipy
from scipy.optimize import nnls

SURVEYS = [  # samples, rows, columns, gaps, ratio aimed at
    (1000, 4756, 6, False, 25),
    (1000, 4756, 6, True, 15),
    (100000, 500, 8, False, None),
    (100000, 500, 8, True, None),
]
TURNS = 3


def go_bench(binary, pattern, times):
    out = subprocess.run([binary, "-test.run=^$", "-test.bench=%s$" % pattern, "-test.benchtime=%dx" % times],
                         cwd="nnls", check=True, capture_output=True, text=True).stdout
    return float(re.search(r"([\d.]+) ns/op", out).group(1)) / 1e9


def scipy_turn(problems):
    start = time.perf_counter()
    x = [nnls(a, b)[0] for a, b in problems]
    return time.perf_counter() - start, x


def problems_of(a, b):
    for row in b:
        here = ~np.isnan(row)
        yield (a, row) if here.all() else (a[here], row[here])


def compare(folder, binary, shape):
    samples, m, n, gaps, aim = shape
    name = "%dx%dx%d%s" % (samples, m, n, "gaps" if gaps else "")
    read = lambda suffix, width: np.fromfile("%s/%s.%s" % (folder, name, suffix)).reshape(-1, width)
    a, b, ours = read("a", n), read("b", m), read("x", n)
    ours_s, theirs_s, worst = np.inf, np.inf, 0.0
    for turn in range(TURNS):
        ours_s = min(ours_s, go_bench(binary, "Batch/" + name, 20 if samples < 10000 else 5))
        total, at = 0.0, 0
        while at < samples:  # a thousand at a time, to hold few copies
            part = list(problems_of(a, b[at:at + 1000]))
            seconds, x = scipy_turn(part)
            total += seconds
            worst = max(worst, np.abs(np.array(x) - ours[at:at + 1000]).max())
            at += 1000
        theirs_s = min(theirs_s, total)
    worst /= np.abs(ours).max()
    ratio = theirs_s / ours_s
    print("%-18s ours %8.2f ms  SciPy %9.1f ms  ratio %5.1f%s  %5.2f GF/s  largest difference %.1e of the largest value"
          % (name, ours_s * 1e3, theirs_s * 1e3, ratio, "" if aim is None else " (aim %d)" % aim,
             2 * samples * m * n / ours_s / 1e9, worst), flush=True)
    return (aim is None or ratio >= aim) and worst <= 1e-9


def main():
    print("SciPy %s, NumPy %s, Python %s" % (scipy.__version__, np.__version__, platform.python_version()))
    with tempfile.TemporaryDirectory() as folder:
        binary = folder + "/nnls.test"
        subprocess.run(["go", "test", "-c", "-o", binary, "./nnls"], check=True)
        subprocess.run([binary, "-test.run=TestWriteSurveys", "-survey=" + folder], cwd="nnls", check=True,
                       stdout=subprocess.DEVNULL)
        good = [compare(folder, binary, s) for s in SURVEYS]
        print("1000x1000x1000 matrix product in plain Go: %.2f GF/s" % (2 / go_bench(binary, "MatrixProduct", 3)))
    sys.exit(0 if all(good) else 1)


if __name__ == "__main__":
    main()
