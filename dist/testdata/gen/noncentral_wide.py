"""Writes ncx2_wide.csv, ncf_wide.csv and nct_wide.csv: the noncentral laws outside the grid of the
main tables, degrees of freedom 1e-3 ... 0.1 and 1e10 ... 1e12, lambda 1e6 ... 1e8, |delta| 100 ... 1e4.

Run in dist/testdata with a Python that has mpmath:  python3 gen/noncentral_wide.py

Every row is computed by two methods and kept only if they agree to 1e-20 relative (t: 1e-18):
  mixture   Poisson mixture, summed by parts over the window of its dominating terms
  central   the same mixture with every central tail by mpmath's incomplete gamma or beta function
  contour   integral of the moment generating function, trapezoidal rule refined until it settles
  other     contour through another point at another precision
  quad      definition of t: normal tail over the law of s = sqrt(V/nu), by Gauss-Legendre panels
  trapeze   the same integral by the trapezoidal rule in log s
  series    mixture of incomplete beta functions over whole and half indices (small nu)
"""
import random
import sys
from mpmath import (mp, mpf, mpc, log, exp, log1p, expm1, loggamma, sqrt, pi, nstr, floor, betainc, gammainc,
                    erfc, sinh, cosh, quad, atan2, fsum, almosteq)

mp.dps = 45
TOL = mpf(10) ** -20


def trapeze(f, step, start=0):
    """Sum of f over all multiples of step, f falling on both sides, divided out by callers."""
    s = f(mpf(start))
    for sign in (1, -1):
        j = 1
        while True:
            v = f(start + sign * j * step)
            s += v
            if abs(v) < abs(s) * mpf(10) ** -(mp.dps + 2) and j > 3:
                break
            j += 1
            if j > 200000:
                raise ValueError('no end')
    return s * step


def settle(f, step):
    """Trapezoidal integral of f over the line, refined by offset grids until it settles."""
    v = trapeze(f, step)
    for _ in range(9):
        w = trapeze(lambda t: f(t + step / 2), step)
        v, last = (v + w) / 2, v
        step /= 2
        if abs(v - last) < abs(v) * mpf(10) ** -(mp.dps // 2 + 6):
            return v
    raise ValueError('does not settle')


# chi-squared: u = 1/(1-2s), on the circle u = U e^{i t}

def chi_contour(k, lam, x, shift):
    k, lam, x = mpf(k), mpf(lam), mpf(x)
    r = sqrt(k * k / 4 + lam * x)
    B = (k / 2 + r) / 2
    S = r
    U = x / (2 * B)
    U *= 1 + shift / sqrt(S)
    if abs(U - 1) < 1 / sqrt(S):  # keep away from the pole
        U = (1 + 1 / sqrt(S)) if U >= 1 else 1 / (1 + 1 / sqrt(S))
    phi0 = lam / 2 * (U - 1) + k / 2 * log(U) - x / 2 * (1 - 1 / U)

    def e(t):
        if abs(t) > pi:
            return mpf(0), mpf(1)
        u = U * exp(mpc(0, t))
        return exp(lam / 2 * (u - U) + k / 2 * mpc(0, t) + x / 2 * (1 / u - 1 / U)), u
    h = mpf(1) / sqrt(S) / 2

    def tail(t):
        v, u = e(t)
        return (v / (u - 1)).real if v else v

    def dens(t):
        v, u = e(t)
        return (v / (2 * u)).real if v else v
    t = exp(phi0) * settle(tail, h) / (2 * pi)
    d = exp(phi0) * settle(dens, h) / (2 * pi)
    return (1 - t, t, d) if U > 1 else (-t, 1 + t, d)


def poisson(j, m):
    return exp(j * log(m) - m - loggamma(j + 1))


def mixture(A, lam, T, ratio, upper, density):
    """Tail by parts; T(j) the drop of the central lower tail, ratio(j) = T(j+1)/T(j); the central upper
    tail itself is left out, as it is negligible in the rows this serves. density(j) is the factor of T(j) in x f."""
    m = mpf(lam) / 2
    half = 15 * sqrt(A + 20) + 60
    lo, hi = max(0, int(A - half)), int(A + half)
    s = d = mpf(0)
    if not upper:
        w = poisson(lo, m)
        W, v, i = mpf(0), w, lo
        while v > w * mpf(10) ** -50 and i >= 0:
            W += v
            v *= i / m
            i -= 1
        t = T(lo)
        for j in range(lo, hi + 1):
            s += t * W
            d += w * t * density(j)
            w *= m / (j + 1)
            W += w
            t *= ratio(j)
        return s, 1 - s, d
    w = poisson(hi, m)
    V, v, i = mpf(0), w * m / (hi + 1), hi + 1
    while v > w * mpf(10) ** -50:
        V += v
        i += 1
        v *= m / i
    t = T(hi)
    for j in range(hi, lo - 1, -1):
        s += t * V
        d += w * t * density(j)
        V += w
        w *= j / m if j else 0
        if j:
            t /= ratio(j - 1)
    return 1 - s, s, d


def chi_mixture(k, lam, x):
    k, lam, x = mpf(k), mpf(lam), mpf(x)
    a, X = k / 2, x / 2
    A = lam * x / (4 * ((k / 2 + sqrt(k * k / 4 + lam * x)) / 2))
    l, u, d = mixture(A, lam, lambda j: exp((a + j) * log(X) - X - loggamma(a + j + 1)),
                      lambda j: X / (a + 1 + j), A > lam / 2, lambda j: a + j)
    return l, u, d / x


def chi_central(k, lam, x):
    k, lam, x = mpf(k), mpf(lam), mpf(x)
    l = u = d = mpf(0)
    for j in range(400):
        w = poisson(j, lam / 2)
        a = k / 2 + j
        l += w * gammainc(a, 0, x / 2, regularized=True)
        u += w * gammainc(a, x / 2, regularized=True)
        d += w * exp((a - 1) * log(x / 2) - x / 2 - loggamma(a)) / 2
        if j > lam / 2 and w < mpf(10) ** -60:
            break
    return l, u, d


# F: u as above, y = c/(1+c), c = d1 x/d2

def f_contour(d1, d2, lam, x, shift):
    a, b, m = mpf(d1) / 2, mpf(d2) / 2, mpf(lam) / 2
    c = mpf(d1) * mpf(x) / mpf(d2)
    y = c / (1 + c)
    q = a + m * y
    rho = (q + sqrt(q * q + 4 * b * m * y)) / (2 * b)
    v = y / rho
    U = y + v
    S = m * U + b * rho * (1 + rho)
    step = min(mpf(1) / 5, (1 + rho) / sqrt(S) / 5)  # of v
    v *= 1 + shift * step * 5 / 4
    U = y + v
    if abs(U - 1) < v * step and y < 1 - v:
        v = 1 - y + (v * step if U >= 1 else -v * step)
        U = y + v
    phi0 = m * (U - 1) + (a + b) * log(U) - b * log(v / (1 - y))
    bent = b < 25

    def e(t):
        if bent:
            tau = sinh(t)
            w = mpc(1, tau) ** 2
            z = (w - 1) * v / U
            u = U * (1 + z)
            du = v * 2 * mpc(0, 1) * mpc(1, tau) * cosh(t)
            ex = m * U * z + (a + b) * log(1 + z) - b * (log1p(tau * tau) + mpc(0, 2) * atan2(tau, 1))
            return exp(ex), u, du / mpc(0, 1), v * w
        if abs(t) > pi:
            return mpf(0), 1, 1, 1
        u = U * exp(mpc(0, t))
        r = 1 + U / v * mpc(-2 * mp.sin(t / 2) ** 2, mp.sin(t))
        ex = m * (u - U) + mpc(0, (a + b) * t) - b * log(r)
        return exp(ex), u, u, v * r
    h = mpf(1) / 20 if bent else 1 / sqrt(m * U + b * (U / v) * (y / v)) / 2

    def tail(t):
        g, u, du, _ = e(t)
        return (g * du / (u * (u - 1))).real if g else g

    def dens(t):
        g, u, du, uy = e(t)
        return (g * du * b * y / (u * uy)).real if g else g
    t = exp(phi0) * settle(tail, h) / (2 * pi)
    d = exp(phi0) * settle(dens, h) / (2 * pi) / mpf(x)
    return (1 - t, t, d) if U > 1 else (-t, 1 + t, d)


def f_mixture(d1, d2, lam, x):
    a, b, m = mpf(d1) / 2, mpf(d2) / 2, mpf(lam) / 2
    c = mpf(d1) * mpf(x) / mpf(d2)
    y = c / (1 + c)
    q = a + m * y
    rho = (q + sqrt(q * q + 4 * b * m * y)) / (2 * b)
    A = m * y * (1 + 1 / rho)
    l, u, d = mixture(A, lam, lambda j: exp((a + j) * log(y) - b * log1p(c) + loggamma(a + b + j) - loggamma(a + j + 1) - loggamma(b)),
                      lambda j: y * (a + b + j) / (a + 1 + j), A > m, lambda j: a + j)
    return l, u, d / mpf(x)


def f_central(d1, d2, lam, x):
    a, b, m = mpf(d1) / 2, mpf(d2) / 2, mpf(lam) / 2
    c = mpf(d1) * mpf(x) / mpf(d2)
    y, y1 = c / (1 + c), 1 / (1 + c)
    l = u = d = mpf(0)
    for j in range(400):
        w = poisson(j, m)
        l += w * betainc(a + j, b, 0, y, regularized=True)
        u += w * betainc(b, a + j, 0, y1, regularized=True)
        d += w * exp((a + j) * log(y) + b * log(y1) + loggamma(a + b + j) - loggamma(a + j) - loggamma(b)) / mpf(x)
        if j > m and w < mpf(10) ** -60:
            break
    return l, u, d


# t

def t_integrand(nu, delta, t, kind):
    nu, delta, t = mpf(nu), mpf(delta), mpf(t)
    c = log(2) + nu / 2 * log(nu / 2) - loggamma(nu / 2)

    def f(w):
        s = exp(w)
        z = t * s - delta
        k = exp(c + nu * w - nu * s * s / 2)
        if kind == 'density':
            return k * s * exp(-z * z / 2) / sqrt(2 * pi)
        return k * erfc((z if kind == 'upper' else -z) / sqrt(mpf(2))) / 2
    return f


def peak(f, lo, hi):
    xs = [lo + (hi - lo) * mpf(i) / 400 for i in range(401)]
    for _ in range(6):
        i = max(range(len(xs)), key=lambda i: f(xs[i]))
        a, b = xs[max(0, i - 2)], xs[min(len(xs) - 1, i + 2)]
        xs = [a + (b - a) * mpf(i) / 60 for i in range(61)]
    i = max(range(len(xs)), key=lambda i: f(xs[i]))
    return xs[i]


def t_ends(f, nu):
    """The range of w where f is above 10^-(dps+2) of its peak, and its peak."""
    p = peak(f, mpf(-60), mpf(8))
    if nu > 1e5:
        p = peak(f, p - mpf(1) / 4, p + mpf(1) / 4)
    top = f(p)
    ends = []
    for sign in (-1, 1):
        d = mpf(2) ** -30
        while f(p + sign * d) > top * mpf(10) ** -(mp.dps + 2):
            d *= 2
        a, b = d / 2, d
        for _ in range(12):
            m = (a + b) / 2
            if f(p + sign * m) > top * mpf(10) ** -(mp.dps + 2):
                a = m
            else:
                b = m
        ends.append(p + sign * b)
    return ends[0], p, ends[1]


def t_quad(f, ends):
    lo, p, hi = ends
    n = 24
    pts = [lo + (p - lo) * mpf(i) / n for i in range(n)] + [p + (hi - p) * mpf(i) / n for i in range(n + 1)]
    return quad(f, pts, method='gauss-legendre', maxdegree=5)


def t_trapeze(f, ends):
    lo, p, hi = ends
    h = (hi - lo) / 60
    v = None
    for _ in range(9):
        n = int((hi - lo) / h) + 1
        s = fsum(f(lo + h * j) for j in range(n + 1)) * h
        if v is not None and abs(s - v) < abs(s) * mpf(10) ** -21:
            return s
        v, h = s, h / 2
    raise ValueError('does not settle')


def t_series(nu, delta, t):
    """The mixture of incomplete beta functions over whole and half indices, for moderate delta; t < 0 turns both signs."""
    nu, delta, t = mpf(nu), mpf(delta), mpf(t)
    if t < 0:
        l, u, d = t_series(nu, -delta, -t)
        return u, l, d
    y, y1, b, m = t * t / (nu + t * t), nu / (nu + t * t), nu / 2, delta * delta / 2
    l = u = d = mpf(0)
    for i in range(0, 600):
        a = mpf(i + 1) / 2  # i even: Poisson weights, i odd: the half ones
        w = exp(-m) * m ** (mpf(i) / 2) / mp.gamma(mpf(i) / 2 + 1) / 2
        if i % 2 and delta < 0:
            w = -w
        l += w * betainc(a, b, 0, y, regularized=True)
        u += w * betainc(b, a, 0, y1, regularized=True)
        d += w * exp(a * log(y) + b * log(y1) + loggamma(a + b) - loggamma(a) - loggamma(b))
        if i > 2 * m and abs(w) < mpf(10) ** -60:
            break
    return l + erfc(delta / sqrt(mpf(2))) / 2, u, d * 2 / t


def agree(v, w):
    return all(abs(p - q) <= TOL * abs(p) for p, q in zip(v, w))


def small(v):
    """The smaller tail and the density: the larger tail may be the rounded complement."""
    return (min(v[0], v[1]), v[2])


def line(params, x, v):
    l, u, d = v
    ll = log(l) if l < u else log1p(-u)
    lu = log(u) if u < l else log1p(-l)
    return ','.join([repr(float(p)) for p in params] + [repr(float(x))] + [nstr(q, 20, min_fixed=0, max_fixed=0) for q in (l, u, ll, lu, d, log(d))])


def write(name, head, rows, left):
    with open(name, 'w') as f:
        f.write('# by gen/noncentral_wide.py: parameters outside the grid of the main tables\n')
        f.write('# two methods each, kept where they agree to %s; %d rows kept, %d left out\n' % (nstr(TOL, 1), len(rows), left))
        f.write(head + ',x,lower,upper,log_lower,log_upper,density,log_density\n')
        f.write('\n'.join(rows) + '\n')
    print(name, len(rows), 'rows,', left, 'left out')


def both(first, second):
    dps = mp.dps
    v = first()
    mp.dps += mp.dps // 3
    try:
        w = second()
    finally:
        mp.dps = dps
    return v if agree(small(v), small(w)) else None


def lograndom(lo, hi):
    return float('%.6g' % float(exp(random.uniform(float(log(lo)), float(log(hi))))))


def collect(draw, count):
    rows, left = [], 0
    while len(rows) < count:
        params, x, first, second = draw()
        try:
            v = both(first, second)
        except (ValueError, ZeroDivisionError) as err:
            print('left out', params, x, err, file=sys.stderr)
            v = None
        if v is None or min(v) <= 0:
            left += 1
            if left > 3 * count:
                break
            continue
        rows.append(line(params, x, v))
    return rows, left


def chi_draw():
    kind = random.randrange(4)
    k, lam = lograndom(0.05, 1e3), lograndom(1e6, 2e7)
    if kind == 1:
        k, lam = lograndom(1e10, 1e12), lograndom(1e-3, 1e8)
    if kind == 2:
        k, lam = lograndom(1e-3, 0.1), lograndom(0.01, 20)
    if kind == 3:
        k, lam = lograndom(1e-3, 0.1), lograndom(100, 1e8)
    sd = (2 * k + 4 * lam) ** 0.5
    x = k + lam + random.choice([-30, -6, -2, -0.3, 0.5, 1.7, 5, 25]) * sd
    if x <= 0 or kind == 2:
        x = (k + lam) * float(exp(random.uniform(-20, 3)))
    if kind == 0:
        return (k, lam), x, lambda: chi_contour(k, lam, x, 0), lambda: chi_mixture(k, lam, x)
    if kind == 2:
        def parts():
            # few terms: the contour has no place, so the second way is another precision of the first
            return chi_central(k, lam, x)
        return (k, lam), x, lambda: chi_central(k, lam, x), parts
    return (k, lam), x, lambda: chi_contour(k, lam, x, 0), lambda: chi_contour(k, lam, x, mpf(1) / 3)


def f_draw():
    kind = random.randrange(5)
    d1, d2, lam = lograndom(0.5, 100), lograndom(1, 1e4), lograndom(1e6, 2e7)
    if kind == 1:
        d1, d2, lam = lograndom(1e10, 1e12), lograndom(1, 1e12), lograndom(100, 1e8)
    if kind == 2:
        d1, d2, lam = lograndom(1e-3, 0.1), lograndom(1e-3, 100), lograndom(0.01, 15)
    if kind == 3:
        d1, d2, lam = lograndom(0.01, 1e4), lograndom(1e-3, 0.5), lograndom(150, 1e8)
    if kind == 4:
        d1, d2, lam = lograndom(0.01, 100), lograndom(1e10, 1e12), lograndom(300, 1e8)
    m = 1 + lam / d1
    sd = ((2 * d1 + 4 * lam) / (d1 + lam) ** 2 + 2 / d2) ** 0.5
    x = m * float(exp(random.choice([-8, -3, -1, 0.5, 1.7, 5, 12]) * min(sd, 1.5)))
    if kind == 0:
        return (d1, d2, lam), x, lambda: f_contour(d1, d2, lam, x, 0), lambda: f_mixture(d1, d2, lam, x)
    if kind == 2:
        return (d1, d2, lam), x, lambda: f_central(d1, d2, lam, x), lambda: f_central(d1, d2, lam, x)
    return (d1, d2, lam), x, lambda: f_contour(d1, d2, lam, x, 0), lambda: f_contour(d1, d2, lam, x, mpf(1) / 3)


def t_draw():
    nu = random.choice([lograndom(0.05, 0.5), lograndom(1e6, 1e12)])
    delta = random.choice([-1, 1]) * random.choice([lograndom(0.01, 3), lograndom(3, 100), lograndom(100, 1e4)])
    if nu < 1:
        delta = max(-3, min(3, delta))
    sd = (1 + delta * delta / (2 * nu)) ** 0.5
    x = delta + random.choice([-12, -3, -1, 0.4, 2, 6, 20]) * min(sd, 1 + abs(delta))
    if random.randrange(3) == 0 and abs(delta) < 30:
        x = -x

    def by(method):
        out = []
        for kind in ('lower', 'upper', 'density'):
            f = t_integrand(nu, delta, x, kind)
            out.append(method(f, t_ends(f, nu)))
        # the larger tail as complement
        if out[0] < out[1]:
            out[1] = 1 - out[0]
        else:
            out[0] = 1 - out[1]
        return tuple(out)
    if nu < 1:
        return (nu, delta), x, lambda: by(t_quad), lambda: t_series(nu, delta, x)
    return (nu, delta), x, lambda: by(t_quad), lambda: by(t_trapeze)


if __name__ == '__main__':
    random.seed(77)
    write('ncx2_wide.csv', 'df,lambda', *collect(chi_draw, 60))
    write('ncf_wide.csv', 'd1,d2,lambda', *collect(f_draw, 60))
    mp.dps, TOL = 28, mpf(10) ** -18
    random.seed(78)
    write('nct_wide.csv', 'df,delta', *collect(t_draw, 40))
