"""Writes chi2_wide.csv, f_wide.csv and t_wide.csv: the central laws outside the grid of the main tables,
degrees of freedom 1e-3 ... 0.1 and 1e10 ... 1e12.

Run in dist/testdata with a Python that has mpmath:  python3 gen/central_wide.py

Every row is computed by two methods and kept only if they agree to 1e-22 relative:
  mills    density of the logarithm (or logit) times the integral of its decay, tanh-sinh
  series   positive power series, its complement with as many more digits as the tail is small
  contour  vertical line integral of the Mellin transform through the saddle point, trapezoidal rule
"""
import random
from mpmath import mp, mpf, mpc, log, exp, log1p, expm1, loggamma, quad, sqrt, pi, nstr, inf, findroot, psi

mp.dps = 50
random.seed(31)


def cut(phi, slope):
    """t with phi(t) near 120, by doubling and bisection."""
    hi = mpf(1) / (1 + abs(slope))
    while phi(hi) < 120:
        hi *= 2
    lo = mpf(0)
    for _ in range(30):
        m = (lo + hi) / 2
        if phi(m) < 120:
            lo = m
        else:
            hi = m
    return hi


def integral(phi, slope):
    T = cut(phi, slope)
    pts = [mpf(0)]
    k = mpf(2) ** -24
    while k < 1:
        pts.append(T * k)
        k *= 4
    pts.append(T)
    return quad(lambda t: exp(-phi(t)), pts) + quad(lambda t: exp(-phi(T + t)), [0, T, 16 * T])


# gamma law: P(a, x), Q(a, x)

def gamma_kernel(a, x):
    return exp(a * log(x) - x - loggamma(a))


def gamma_mills(a, x):
    """(lower, upper) with the tail away from x = a found directly."""
    f = gamma_kernel(a, x)
    if x <= a:
        v = f * integral(lambda t: a * t + x * expm1(-t), a - x)
        return v, 1 - v
    v = f * integral(lambda t: x * expm1(t) - a * t, x - a)
    return 1 - v, v


def gamma_series(a, x):
    t = s = mpf(1) / a
    n = 1
    while True:
        t *= x / (a + n)
        s += t
        if t < s * mpf(10) ** (-mp.dps - 3) and x < a + n:
            break
        n += 1
    v = gamma_kernel(a, x) * s
    return v, 1 - v


def gamma_contour(a, x):
    """Mellin-type line integral: E exp(s w), w = log(X/x), is Gamma(a+s) x^-s/Gamma(a)."""
    lower = x <= a
    g0 = loggamma(a)
    K = lambda s: loggamma(a + s) - g0 - s * log(x)
    s0 = line(lambda s: psi(0, a + s) - log(x), lambda s: psi(1, a + s), lower, a, None)
    return line_sum(K, s0, lower, 1 / sqrt(psi(1, a + s0) + 1 / s0 ** 2))


def line(d1, d2, lower, a, b):
    """Saddle of K(s) - log|s| on the side of 0 that belongs to the tail."""
    s = (-1 if lower else 1) * 1 / sqrt(d2(0))
    if lower and s < -a / 2:
        s = -a / 2
    if b is not None and s > b / 2:
        s = b / 2
    for _ in range(60):
        g = d1(s) - 1 / s
        h = d2(s) + 1 / s ** 2
        n = s - g / h
        if lower:
            n = min(n, s / 2)
            n = max(n, (s - a) / 2)
        else:
            n = max(n, s / 2)
            if b is not None:
                n = min(n, (s + b) / 2)
        if abs(n - s) < abs(s) * mpf(10) ** -10:
            return n
        s = n
    return s


def line_sum(K, s0, lower, width):
    h = width / 6
    while True:
        vals = []
        for step in (h, h / 2):
            tot = mpf(0)
            k = 0
            while True:
                s = mpc(s0, k * step)
                v = (exp(K(s)) / s).real
                tot += v if k else v / 2
                if abs(exp(K(s)) / s) < abs(tot) * mpf(10) ** -45:
                    break
                k += 1
                if k > 20000:
                    raise ArithmeticError
            vals.append(tot * step / pi)
        if abs(vals[0] - vals[1]) < abs(vals[1]) * mpf(10) ** -24:
            break
        h /= 2
        if h < width / 100:
            raise ArithmeticError
    v = vals[1]
    return (-v, 1 + v) if lower else (1 - v, v)


# beta law in the odds r = x/y

def beta_kernel(a, b, x, y):
    return exp(a * log(x) + b * log(y) - loggamma(a) - loggamma(b) + loggamma(a + b))


def beta_mills(a, b, x, y):
    f = beta_kernel(a, b, x, y)
    if a * y >= b * x:
        v = f * integral(lambda t: a * t + (a + b) * log1p(x * expm1(-t)), a * y - b * x)
        return v, 1 - v
    v = f * integral(lambda t: b * t + (a + b) * log1p(y * expm1(-t)), b * x - a * y)
    return 1 - v, v


def beta_series_lower(a, b, x, y):
    t = s = mpf(1) / a
    n = 1
    while n < 60000:
        r = x * (a + b + n - 1) / (a + n)
        t *= r
        s += t
        if r < 1 and t / (1 - max(r, x)) < s * mpf(10) ** (-mp.dps - 3):
            return beta_kernel(a, b, x, y) * s
        n += 1
    raise ArithmeticError


def beta_series(a, b, x, y):
    if x * (a + b) / (a + 1) < y * (a + b) / (b + 1):
        v = beta_series_lower(a, b, x, y)
        return v, 1 - v
    v = beta_series_lower(b, a, y, x)
    return 1 - v, v


def beta_contour(a, b, x, y):
    lower = a * y >= b * x
    g0 = loggamma(a) + loggamma(b)
    w = log(x / y)
    K = lambda s: loggamma(a + s) + loggamma(b - s) - g0 - s * w
    d2 = lambda s: psi(1, a + s) + psi(1, b - s)
    s0 = line(lambda s: psi(0, a + s) - psi(0, b - s) - w, d2, lower, a, b)
    return line_sum(K, s0, lower, 1 / sqrt(d2(s0) + 1 / s0 ** 2))


def both(first, second, args):
    """Values by both methods with digits enough for the complement."""
    mp.dps = 50
    l1, u1 = first(*args)
    small = min(abs(l1), abs(u1))
    mp.dps = 50 + min(420, max(0, int(-mp.log10(small)) if small > 0 else 420))
    l1, u1 = first(*args) if mp.dps > 60 and second is None else (l1, u1)
    try:
        l2, u2 = second(*args)
    except ArithmeticError:
        mp.dps = 50
        return None
    mp.dps = 50
    if abs(l1 - l2) > abs(l2) * mpf(10) ** -22 or abs(u1 - u2) > abs(u2) * mpf(10) ** -22:
        return None
    return +l2, +u2


def num(v):
    return mp.nstr(v, 20, min_fixed=1, max_fixed=0, strip_zeros=False)


def logs(l, u):
    mp.dps = 60
    r = (log1p(-u) if u < 0.5 else log(l)), (log1p(-l) if l < 0.5 else log(u))
    mp.dps = 50
    return r


def row(params, x, lu, density):
    l, u = lu
    ll, lu_ = logs(l, u)
    return ",".join([repr(p) for p in params] + [repr(x)] + [num(v) for v in (l, u, ll, lu_, density, log(density))])


def small():
    return 10 ** random.uniform(-3, -1)


def large():
    return 10 ** random.uniform(10, 12)


def mid():
    return 10 ** random.uniform(-0.3, 4)


def write(name, head, rows, dropped):
    with open(name, "w") as f:
        f.write("# by gen/central_wide.py: degrees of freedom outside the grid of the main tables\n")
        f.write("# two methods each, kept where they agree to 1e-22; %d rows kept, %d left out\n" % (len(rows), dropped))
        f.write(head + "\n" + "\n".join(rows) + "\n")
    print(name, len(rows), "kept", dropped, "left out")


def chi2():
    rows, bad = [], 0
    for i in range(60):
        if i % 2:
            k = small()
            x = 10 ** random.uniform(-300, 2.5) if i % 4 == 1 else 10 ** random.uniform(-3, 2)
            second = gamma_series
        else:
            k = large()
            x = k + random.uniform(-1, 1) * random.choice([1, 5, 36]) * (2 * k) ** 0.5
            second = gamma_contour
        a, h = mpf(k) / 2, mpf(x) / 2
        v = both(gamma_mills, second, (a, h))
        if v is None:
            bad += 1
            continue
        rows.append(row((k,), x, v, gamma_kernel(a, h) / mpf(x)))
    write("chi2_wide.csv", "df,x,lower,upper,log_lower,log_upper,density,log_density", rows, bad)


def odds(d1, d2, x):
    p, q = mpf(d1) * mpf(x), mpf(d2)
    return mpf(d1) / 2, mpf(d2) / 2, p / (p + q), q / (p + q)


def f():
    rows, bad = [], 0
    for i in range(140):
        c = i % 7
        d1, d2, second = [(small(), mid(), beta_series), (mid(), small(), beta_series), (small(), small(), beta_series),
                          (small(), large(), beta_series), (large(), mid(), beta_contour), (mid(), large(), beta_contour),
                          (large(), large(), beta_contour)][c]
        if c < 4:
            x = 10 ** random.uniform(-60, 60) if i % 2 else 10 ** random.uniform(-2, 2)
        else:
            w = (2 / d1 + 2 / d2) ** 0.5
            x = float(exp(random.uniform(-1, 1) * random.choice([1, 4, 12]) * w))
        args = odds(d1, d2, x)
        v = both(beta_mills, second, args)
        if v is None or min(v) < mpf(10) ** -300:
            bad += 1
            continue
        rows.append(row((d1, d2), x, v, beta_kernel(*args) / mpf(x)))
    write("f_wide.csv", "d1,d2,x,lower,upper,log_lower,log_upper,density,log_density", rows, bad)


def t():
    rows, bad = [], 0
    for i in range(60):
        nu = small() if i % 2 else large()
        x = 10 ** random.uniform(-3, 40) if i % 2 else abs(random.gauss(0, 1)) * random.choice([1, 5, 30])
        a, b, X, Y = odds(1.0, nu, mpf(x) ** 2)
        v = both(beta_mills, beta_series if i % 2 else beta_contour, (a, b, X, Y))
        if v is None:
            bad += 1
            continue
        u = v[1] / 2
        rows.append(row((nu,), x, (1 - u, u), beta_kernel(a, b, X, Y) / mpf(x)))
    write("t_wide.csv", "df,x,lower,upper,log_lower,log_upper,density,log_density", rows, bad)


chi2()
f()
t()
