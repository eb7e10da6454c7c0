#!/usr/bin/env python3
"""Plain NumPy alternating least squares, to check unmix/parafac against.

Independent of the Go code in everything but the rule that makes the surveys:
20 small surveys with scatter bands and single gaps come from a 64-bit linear
congruential generator that the Go test repeats. Each non-negative row problem is
solved exactly (SciPy's nnls on the cells present); of several random starts
the smallest sum of squares is kept. No compression, no ridge, no extrapolation.

    python3 als.py > als.json        # numpy 1.24.2, scipy 1.10.1
"""
import json
import numpy as np
from scipy.optimize import nnls

MASK = (1 << 64) - 1


class Lcg:
    """Knuth's MMIX generator; uniform in [0, 1) from the upper 53 bits."""

    def __init__(self, seed):
        self.state = seed

    def uniform(self):
        self.state = (self.state * 6364136223846793005 + 1442695040888963407) & MASK
        return (self.state >> 11) / float(1 << 53)


def survey(seed):
    """Samples × ex × em with NaN, and the number of components."""
    g = Lcg(seed)
    i, j, k, f = 10 + seed % 5, 8, 14, 2 + seed % 2
    b = np.zeros((j, f))
    c = np.zeros((k, f))
    a = np.zeros((i, f))
    for r in range(f):
        pb = 1 + 5 * (r + 0.5 * g.uniform()) / f
        pc = 2 + 10 * ((r + 1) % f + 0.5 * g.uniform()) / f
        for x in range(j):
            b[x, r] = 1 / (1 + ((x - pb) / 2.0) ** 2)
        for x in range(k):
            c[x, r] = 1 / (1 + ((x - pc) / 2.5) ** 2)
        for x in range(i):
            a[x, r] = 0.2 + g.uniform()
    x = np.einsum("if,jf,kf->ijk", a, b, c)
    for s in range(i):
        for y in range(j):
            for z in range(k):
                n = sum(g.uniform() for _ in range(4)) - 2
                x[s, y, z] += 0.02 * n
                if abs(z - y) <= 1 or g.uniform() < 0.03:
                    x[s, y, z] = np.nan
    return x, f


def khatri_rao(p, q):
    return np.einsum("if,jf->ijf", p, q).reshape(-1, p.shape[1])


def rows(unfolded, k):
    out = np.zeros((len(unfolded), k.shape[1]))
    for n, y in enumerate(unfolded):
        ok = ~np.isnan(y)
        out[n] = nnls(k[ok], y[ok])[0]
    return out


def fit(x, f, seed):
    rnd = np.random.default_rng(seed)
    i, j, k = x.shape
    b, c = rnd.random((j, f)), rnd.random((k, f))
    xa = x.reshape(i, -1)
    xb = x.transpose(1, 0, 2).reshape(j, -1)
    xc = x.transpose(2, 0, 1).reshape(k, -1)
    last = np.inf
    for _ in range(4000):
        a = rows(xa, khatri_rao(b, c))
        b = rows(xb, khatri_rao(a, c))
        b /= np.maximum(np.linalg.norm(b, axis=0), 1e-300)
        c = rows(xc, khatri_rao(a, b))
        e = x - np.einsum("if,jf,kf->ijk", a, b, c)
        sse = np.nansum(e * e)
        if last - sse <= 1e-11 * sse:
            break
        last = sse
    return sse


def main():
    out = []
    for seed in range(1, 21):
        x, f = survey(seed)
        sse = min(fit(x, f, s) for s in range(3))
        out.append({"seed": seed, "components": f, "sst": float(np.nansum(x * x)), "cells": int((~np.isnan(x)).sum()), "sse": float(sse)})
    print(json.dumps(out, indent=1))


main()
