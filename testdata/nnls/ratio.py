#!/usr/bin/env python3
"""Prints how many times faster nnls.Batch is than SciPy's nnls called per sample.

    python3 testdata/nnls/ratio.py [SAMPLES]     (from the root of the repository)

SAMPLES leaves out the surveys of another number of samples.

Both solve the same surveys, those of BenchmarkBatch, in one run and by turns;
the shortest of all turns counts for each. Batch includes its factorisation and
uses all cores, SciPy one. For SciPy the rows present are picked out before the
clock starts. Where other programs run beside, the clock says little; the ratio of
processor time, all cores added up, is printed for that. The answers are compared
too, and the rate of a large matrix product is given.
"""
import os
import platform
import re
import resource
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
    """Runs a benchmark and returns seconds an operation by the clock, and in all of processor time."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    out = subprocess.run([binary, "-test.run=^$", "-test.bench=%s$" % pattern, "-test.benchtime=%dx" % times],
                         cwd="nnls", check=True, capture_output=True, text=True).stdout
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return float(re.search(r"([\d.]+) ns/op", out).group(1)) / 1e9, cpu


def ours_turn(binary, pattern, times):
    few, few_cpu = go_bench(binary, pattern, times)
    many, many_cpu = go_bench(binary, pattern, 4 * times)  # the difference leaves out the drawing of the survey
    return min(few, many), (many_cpu - few_cpu) / (3 * times)


def scipy_turn(problems):
    start, cpu = time.perf_counter(), time.process_time()
    x = [nnls(a, b)[0] for a, b in problems]
    return time.perf_counter() - start, time.process_time() - cpu, x


def problems_of(a, b):
    for row in b:
        here = ~np.isnan(row)
        yield (a, row) if here.all() else (a[here], row[here])


def compare(folder, binary, shape, product):
    samples, m, n, gaps, aim = shape
    name = "%dx%dx%d%s" % (samples, m, n, "gaps" if gaps else "")
    read = lambda suffix, width: np.fromfile("%s/%s.%s" % (folder, name, suffix)).reshape(-1, width)
    a, b, ours = read("a", n), read("b", m), read("x", n)
    ours_s = theirs_s = ours_cpu = theirs_cpu = np.inf
    worst = 0.0
    for turn in range(TURNS):
        seconds, cpu = ours_turn(binary, "Batch/" + name, 10 if samples < 10000 else 2)
        ours_s, ours_cpu = min(ours_s, seconds), min(ours_cpu, cpu)
        total, total_cpu = 0.0, 0.0
        for at in range(0, samples, 1000):  # a thousand at a time, to hold few copies
            part = list(problems_of(a, b[at:at + 1000]))
            seconds, cpu, x = scipy_turn(part)
            total, total_cpu = total + seconds, total_cpu + cpu
            worst = max(worst, np.abs(np.array(x) - ours[at:at + 1000]).max())
        theirs_s, theirs_cpu = min(theirs_s, total), min(theirs_cpu, total_cpu)
    worst /= np.abs(ours).max()
    ratio = theirs_s / ours_s
    flops = 2 * samples * m * n
    print("%-18s ours %7.2f ms  SciPy %7.1f ms  ratio %5.1f%s  processor time %7.2f, %7.1f ms: %4.1f  %5.2f GF/s, %2.0f %% of the product's  difference %.1e of the largest value"
          % (name, ours_s * 1e3, theirs_s * 1e3, ratio, "" if aim is None else " (aim %d)" % aim,
             ours_cpu * 1e3, theirs_cpu * 1e3, theirs_cpu / ours_cpu,
             flops / ours_s / 1e9, 100 * flops / ours_s / 1e9 / product, worst), flush=True)
    return (aim is None or ratio >= aim) and worst <= 1e-9


def numpy_product():
    x = np.random.default_rng(1).random((1000, 1000))
    best = np.inf
    for _ in range(6):
        start = time.perf_counter()
        x @ x
        best = min(best, time.perf_counter() - start)
    return 2 / best


def main():
    print("SciPy %s, NumPy %s, Python %s, %d cores" % (scipy.__version__, np.__version__, platform.python_version(), os.cpu_count()))
    with tempfile.TemporaryDirectory() as folder:
        binary = folder + "/nnls.test"
        subprocess.run(["go", "test", "-c", "-o", binary, "./nnls"], check=True)
        subprocess.run([binary, "-test.run=TestWriteSurveys", "-survey=" + folder], cwd="nnls", check=True,
                       stdout=subprocess.DEVNULL)
        product = 2 / go_bench(binary, "MatrixProduct/1000x1000x1000", 5)[0]
        print("1000x1000x1000 matrix product: %.1f GF/s in plain Go, %.1f GF/s in NumPy's BLAS" % (product, numpy_product()))
        good = [compare(folder, binary, s, product) for s in SURVEYS if sys.argv[1:] in ([], [str(s[0])])]
    sys.exit(0 if all(good) else 1)


if __name__ == "__main__":
    main()
