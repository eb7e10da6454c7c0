#!/usr/bin/env python3
"""Writes distributions.csv: quantiles of the distributions that limits and intervals use, by SciPy."""
import csv
import pathlib

from scipy import stats

rows = []
for p in (0.005, 0.025, 0.05, 0.5, 0.95, 0.975, 0.99, 0.995):
    rows.append(("normal", "", "", p, stats.norm.ppf(p)))
    for nu in (1, 2, 3, 4.7, 9, 16.6464, 30, 120, 1e4):
        rows.append(("t", nu, "", p, stats.t.ppf(p, nu)))
    for k in (1, 2, 3, 7.5, 12, 100, 1500):
        rows.append(("chi2", k, "", p, stats.chi2.ppf(p, k)))
    for a, b in ((1, 3), (3, 3), (3, 9), (2, 18), (12, 1), (7, 7.5), (30, 60)):
        rows.append(("F", a, b, p, stats.f.ppf(p, a, b)))
        rows.append(("beta", a, b, p, stats.beta.ppf(p, a, b)))
for nu, delta in ((2, 1), (4, 4.067), (9, 3.6), (15, 0.5), (30, 3.37), (200, 3.3)):
    for t in (-0.5, 0.8, 1.833, 2.5, 5):
        rows.append(("nct", nu, delta, stats.nct.cdf(t, nu, delta), t))
with open(pathlib.Path(__file__).with_name("distributions.csv"), "w", newline="") as f:
    w = csv.writer(f, lineterminator="\n")
    w.writerow(("distribution", "first", "second", "p", "quantile"))
    for d, a, b, p, q in rows:
        w.writerow((d, a, b, repr(float(p)), repr(float(q))))
