#!/usr/bin/env python3
"""Writes scipy_objectives.csv: what scipy.optimize.nnls reaches on 2,000 problems.

    python3 testdata/nnls/scipy_objectives.py > testdata/nnls/scipy_objectives.csv

The problems are not stored. They are drawn here and in nnls/scipy_test.go from
the same generator, with operations that both languages round alike. The
objective ||a x - b|| of SciPy's answer is evaluated in extended precision, so
that only the answer is judged. "failed" means that SciPy gave up.
"""
import platform
import sys

import numpy as np
import scipy
from scipy.optimize import nnls

PROBLEMS = 2000


class Draw:
    """Knuth's 64-bit linear congruential generator (MMIX)."""

    def __init__(self, seed):
        self.s = (seed * 2654435761 + 12345) % 2**64
        for _ in range(4):
            self.unit()

    def unit(self):
        """Uniform in [0, 1), a multiple of 2**-53."""
        self.s = (self.s * 6364136223846793005 + 1442695040888963407) % 2**64
        return (self.s >> 11) / 2**53

    def sym(self):
        """Uniform in [-1, 1)."""
        return 2 * self.unit() - 1

    def integer(self, lo, hi):
        return lo + int(self.unit() * (hi - lo + 1))


def power(k):
    return float("1e%d" % k)


def problem(i):
    """Returns a (a list of rows) and b of problem i."""
    d = Draw(i)
    kind, variant = i % 10, i // 10
    n = d.integer(2, 12)
    m = d.integer(n + 1, 60)
    if kind == 1 or (kind in (4, 5) and variant % 2 == 1):  # wide
        m = d.integer(2, 12)
        n = d.integer(m + 1, 40)
    a = [[d.sym() for _ in range(n)] for _ in range(m)]
    b = [d.sym() for _ in range(m)]
    if kind == 2:  # nearly collinear: condition number about 10 to 10**7
        delta = power(-(variant % 7 + 1))
        for row in a:
            for j in range(1, n):
                row[j] = row[0] + delta * row[j]
    elif kind == 3:  # rank deficient, exactly
        for row in a:
            for j in range(n):
                row[j] = int(row[j] * 1024) / 1024
            for j in range((n + 1) // 2, n):
                row[j] = 2 * row[0] if j % 2 == 1 else row[0] + row[1]
    elif kind == 4:  # zero columns
        for j in range(n):
            if d.unit() < 1 / 3:
                for row in a:
                    row[j] = 0.0
    elif kind == 5:  # zero right-hand side
        b = [0.0] * m
    elif kind == 6:  # every column and the right-hand side on a scale of its own
        for j in range(n):
            f = power(d.integer(-12, 12))
            for row in a:
                row[j] = row[j] * f
        f = power(d.integer(-12, 12))
        b = [v * f for v in b]
    elif kind in (7, 8, 9):  # mixtures; 8 without noise; 9 on a scale of its own
        for row in a:
            for j in range(n):
                row[j] = abs(row[j])
        x = [max(0.0, d.sym()) for _ in range(n)]
        noise = 0.0 if kind == 8 else 0.01
        for k, row in enumerate(a):
            v = noise * b[k]
            for j in range(n):
                v = v + row[j] * x[j]
            b[k] = v
        if kind == 9:
            f, g = power(d.integer(-12, 12)), power(d.integer(-12, 12))
            a = [[v * f for v in row] for row in a]
            b = [v * g for v in b]
    return a, b


def objective(a, b, x):
    r = np.array(b, dtype=np.longdouble)
    for j in range(len(x)):
        r = r - np.array([row[j] for row in a], dtype=np.longdouble) * np.longdouble(x[j])
    return float(np.sqrt(np.sum(r * r)))


def main():
    print("# scipy.optimize.nnls of SciPy %s, NumPy %s, Python %s (Debian package python3-scipy)"
          % (scipy.__version__, np.__version__, platform.python_version()))
    print("# written by testdata/nnls/scipy_objectives.py")
    print("problem,objective")
    for i in range(PROBLEMS):
        a, b = problem(i)
        try:
            x, _ = nnls(np.array(a), np.array(b))
            print("%d,%r" % (i, objective(a, b, x)))
        except RuntimeError as err:
            print("%d,failed" % i)
            print("problem %d: %s" % (i, err), file=sys.stderr)


if __name__ == "__main__":
    main()
