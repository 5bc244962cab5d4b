"""Writes testdata/elementary.csv: exact values for the elementary functions.

Run from internal/dd:  python3 gen/elementary.py
"""
import math
import random
from mpmath import mp, mpf, log, exp, expm1, nstr

mp.prec = 700
random.seed(20)


def arg(h):
    h = float(h)
    return h, (random.random() - 0.5) * math.ulp(h) * 0.99


rows = []
for _ in range(120):
    for h in (random.uniform(-600, 600), random.uniform(-1, 1)):
        a = arg(h); rows.append(("exp",) + a + (exp(mpf(a[0]) + mpf(a[1])),))
    for h in (random.uniform(-2, 2), random.choice([-1, 1]) * 10 ** random.uniform(-12, 1)):
        a = arg(h); rows.append(("expm1",) + a + (exp(mpf(a[0]) + mpf(a[1])) - 1,))
    for h in (10 ** random.uniform(-250, 300), random.uniform(0.5, 2), 1 + random.choice([-1, 1]) * 10 ** random.uniform(-12, -1)):
        a = arg(h); rows.append(("log",) + a + (log(mpf(a[0]) + mpf(a[1])),))
    for h in (10 ** random.uniform(-30, 10), -random.random(), random.choice([-1, 1]) * 10 ** random.uniform(-6, -0.01)):
        a = arg(h); z = mpf(a[0]) + mpf(a[1]); rows.append(("log1p",) + a + (log(1 + z),)); rows.append(("log1pmx",) + a + (log(1 + z) - z,))
with open("testdata/elementary.csv", "w") as f:
    f.write("# double-double argument (hi, lo) and the function there, mpmath, 700 bits, by gen/elementary.py\n")
    f.write("function,hi,lo,value\n")
    for n, h, l, v in rows:
        f.write("%s,%r,%r,%s\n" % (n, h, l, nstr(v, 45)))
