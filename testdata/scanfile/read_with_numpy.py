"""Reads a folder of scan files the plain way, with NumPy, and prints the seconds
of processor time for stacks and grids, the same of wall time, the sum of all
intensities, and the largest resident memory in MB.

usage: read_with_numpy.py FOLDER

FOLDER/stack/*.txt: three header lines, the second "# excitation_nm: 240", then
two columns set apart by a tab. FOLDER/grid/*.csv: first row excitations, first
column emissions. The time to start Python and to import NumPy is not counted.
"""

import glob
import re
import resource
import sys
import time

import numpy as np


def read_stack(path):
    with open(path) as f:
        head = [next(f) for _ in range(3)]
        ex = float(re.search(r"excitation_nm: ([0-9.]+)", head[1]).group(1))
        return ex, np.loadtxt(f, delimiter="\t")


def read_grid(path):
    with open(path) as f:
        ex = np.array([float(v) for v in next(f).split(",")[1:]])
        cells = np.loadtxt(f, delimiter=",")
    return ex, cells[:, 0], cells[:, 1:]


def main():
    clocks = [(time.process_time(), time.perf_counter())]
    total = 0.0
    for path in sorted(glob.glob(sys.argv[1] + "/stack/*.txt")):
        _, cells = read_stack(path)
        total += cells[:, 1].sum()
    clocks.append((time.process_time(), time.perf_counter()))
    for path in sorted(glob.glob(sys.argv[1] + "/grid/*.csv")):
        _, _, cells = read_grid(path)
        total += cells.sum()
    clocks.append((time.process_time(), time.perf_counter()))
    for kind in (0, 1):
        print(" ".join(f"{b[kind] - a[kind]:.4f}" for a, b in zip(clocks, clocks[1:])))
    print(f"{total:.6f}")
    print(f"{resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f}")


main()
