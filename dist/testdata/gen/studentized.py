"""Reference rows for the studentized range, the maximum modulus and Dunnett's
law where the other tables have none: many groups, small and large degrees of
freedom, and quantiles. Every row is computed by two methods at 24 digits:

  A  trapezoidal rule over log s of the tails at known scale, those by the
     trapezoidal rule in the symmetric variable; for nu < 1 the part where the
     tail is 1 by an incomplete gamma function and the rest by Gauss-Legendre
  B  nu <= 60: integral of the density of W times the distribution function
     of s (incomplete gamma); else Gauss-Legendre panels over log s, with the
     inner integral in Hartley's one-sided form (range), or the
     inner integral by Gauss-Legendre panels (Dunnett)

and dropped (with a message) when they differ by more than 1e-15.
Run: python3 studentized.py > ../studentized.csv   (some minutes)
"""
import sys
from functools import lru_cache
import mpmath as mp

mp.mp.dps = 24
SQ2 = mp.sqrt(2)
phi = lambda x: mp.exp(-x * x / 2) / mp.sqrt(2 * mp.pi)
Q = lambda x: mp.erfc(x / SQ2) / 2
inf = float("inf")

GL = {}


def gauss(n):
    if n not in GL:
        out = []
        for i in range(n):
            x = mp.cos(mp.pi * (i + mp.mpf(3) / 4) / (n + mp.mpf(1) / 2))
            for _ in range(8):
                p0, p1 = mp.mpf(1), x
                for k in range(2, n + 1):
                    p0, p1 = p1, ((2 * k - 1) * x * p1 - (k - 1) * p0) / k
                d = n * (x * p1 - p0) / (x * x - 1)
                x -= p1 / d
            out.append((x, 2 / ((1 - x * x) * d * d)))
        GL[n] = out
    return GL[n]


def panels(f, a, b, count, n=20):
    h = (b - a) / (2 * count)
    s = mp.mpf(0)
    for p in range(count):
        m = a + h * (2 * p + 1)
        for x, w in gauss(n):
            s += w * f(m + h * x)
    return s * h


def outwards(f, mode, h, rel=mp.mpf(10) ** -19):
    """Trapezoidal sum from a point near the mode."""
    s = f(mode)
    for d in (1, -1):
        i, last = d, None
        while True:
            v = f(mode + i * h)
            s += v
            if v < rel * s and (last is None or v <= last):
                break
            last = v
            i += d
    return s * h


class Range:
    def __init__(self, k):
        self.k = k
        b = max(1.0, float(mp.sqrt(2 * mp.log(k))))
        self.h = mp.mpf(0.32) / b
        self.step = 0.075 / max(1.0, b * b / 3)
        self.mid = 2.0 * float(mp.sqrt(2 * mp.log(k))) * 0.85

    def pair(self, w, shift=0):
        k, n, a = self.k, self.k - 1, w / 2
        h = min(self.h, mp.mpf(0.35) / mp.sqrt(1 + n * min(1, 4 / w**2))) * (1 + mp.mpf(shift) / 7)
        lo = up = mp.mpf(0)
        i = 0
        while True:
            t = i * h
            A, B = Q(a + t), Q(a - t)
            fp, fm = phi(a + t), phi(a - t)
            D = (1 - A - B)
            if w < 1e-3:
                D = panels(phi, t - a, t + a, 1, 12)
            d = D**n
            x = (fp + fm) * d
            y = fp * self.missed(A, B) + fm * self.missed(B, A)
            c = 0.5 if i == 0 else 1
            lo += c * x
            up += c * y
            if t > 1 and x < 1e-19 * lo and y < 1e-19 * up or t > 45:
                break
            if x < 1e-19 * lo and w < self.mid / 3:
                break
            i += 1
        lo, up = lo * k * h, up * k * h
        return (lo, 1 - lo) if lo < 0.5 else (1 - up, up)

    def missed(self, a, b):
        """(1-a)^n - (1-a-b)^n without cancellation."""
        c = 1 - a
        return c**(self.k - 1) * -mp.expm1((self.k - 1) * mp.log1p(-b / c)) if b < c else c**(self.k - 1)

    def other(self, w):
        k, n = self.k, self.k - 1
        f = lambda z: phi(z) * (Q(z - w) - Q(z))**n
        if w < 1e-3:
            f = lambda z: phi(z) * panels(phi, z - w, z, 1, 12)**n
        top = w / 2 + min(15, 40 / mp.sqrt(k)) if w < 1 else w / 2 + 15
        low = 2 * k * panels(f, w / 2, top, 24) + (1 - 2 * Q(w / 2))**k
        if low < 0.5:
            return low, 1 - low
        g = lambda z: phi(z) * self.missed(Q(z), Q(w - z))
        up = k * panels(g, mp.mpf(-9), w + 13, int(60 + 3 * w))
        return 1 - up, up

    def density(self, w):
        k, n, a = self.k, self.k - 1, w / 2
        h = min(self.h, mp.mpf(0.35) / mp.sqrt(1 + n * min(1, 4 / w**2))) * mp.mpf(1.07)
        f = lambda t: phi(t + a) * phi(t - a) * (panels(phi, t - a, t + a, 1, 12) if w < 1e-3 else 1 - Q(a + t) - Q(a - t))**(n - 1)
        return k * n * outwards(f, mp.mpf(0), h)


class Modulus:
    def __init__(self, k):
        self.k = k
        b = max(1.0, float(mp.sqrt(2 * mp.log(2 * k + 1))))
        self.step = 0.03 / max(1.0, b * b / 2)
        self.mid = b * 0.85

    def pair(self, w, shift=0):
        p = mp.erf(w / SQ2)**self.k
        if p < 0.5:
            return p, 1 - p
        u = -mp.expm1(self.k * mp.log1p(-2 * Q(w)))
        return 1 - u, u

    other = pair

    def density(self, w):
        return 2 * self.k * phi(w) * mp.erf(w / SQ2)**(self.k - 1)


class Dunnett:
    """lambdas, two-sided; w > 0."""

    def __init__(self, lambdas):
        self.l = [mp.mpf(x) for x in lambdas]
        self.c = min(mp.sqrt(1 - x * x) for x in self.l)
        self.step = 0.06
        self.mid = 1.5

    def split(self, w, z):
        s = mp.mpf(0)
        for l in self.l:
            c = mp.sqrt(1 - l * l)
            s += mp.log1p(-Q((w - l * z) / c) - Q((w + l * z) / c))
        return mp.exp(s), -mp.expm1(s)

    def pair(self, w, shift=0):
        h = self.c * mp.mpf(0.2) * (1 + mp.mpf(shift) / 7)
        lo = up = mp.mpf(0)
        i = 0
        while True:
            z = i * h
            a, b = self.split(w, z)
            c = phi(z) * (1 if i == 0 else 2)
            lo += c * a
            up += c * b
            if z > 10 + w:
                break
            i += 1
        return lo * h, up * h

    def other(self, w):
        lo = up = mp.mpf(0)
        top = 10 + w
        n = int(top / (2 * self.c)) + 1
        h = top / (2 * n)
        for p in range(n):
            for x, c in gauss(20):
                z = h * (2 * p + 1 + x)
                a, b = self.split(w, z)
                lo += c * phi(z) * a
                up += c * phi(z) * b
        return 2 * h * lo, 2 * h * up


class Study:
    def __init__(self, law, nu):
        self.law, self.nu = law, nu
        if nu != inf:
            with mp.workdps(60):  # the logarithms cancel to 14 digits at 1e12
                a = mp.mpf(nu) / 2
                self.c = 2 * mp.exp(a * mp.log(a) - a - mp.loggamma(a))
            self.c = +self.c

    def g(self, v):
        return self.c * mp.exp(-self.nu * (mp.expm1(2 * v) - 2 * v) / 2)

    def mode(self, q, side):
        f = lambda u: mp.log(self.g(u - mp.log(q))) + mp.log(self.law.pair(mp.exp(u))[side])
        u = max(min(mp.log(q), mp.log(self.law.mid)), mp.log(q) - 20 / mp.sqrt(self.nu))
        h = mp.mpf(1) / mp.sqrt(1 + self.nu)
        best = f(u)
        while h > mp.mpf(0.05) / mp.sqrt(1 + self.nu):
            for x in (u + h, u - h):
                y = f(x)
                if y > best:
                    u, best = x, y
                    break
            else:
                h /= 3
        return u

    def a(self, q, side):
        q = mp.mpf(q)
        if self.nu == inf:
            return self.law.pair(q)[side]
        if self.nu < 1:
            return self.split(q, side)
        f = lambda u: self.g(u - mp.log(q)) * self.law.pair(mp.exp(u))[side]
        h = 1 / mp.sqrt(mp.mpf(2) * self.nu / mp.mpf(0.4)**2 + 1 / mp.mpf(self.law.step)**2)
        return outwards(f, self.mode(q, side), h)

    def chi(self, w, q, upper):
        a = mp.mpf(self.nu) / 2
        x = a * (w / q)**2
        return mp.gammainc(a, x, mp.inf, regularized=True) if upper else mp.gammainc(a, 0, x, regularized=True)

    def split(self, q, side):
        # Where the wanted tail is 1 the chi law alone counts; the rest by panels,
        # as far as the integrand matters.
        f = lambda u: self.g(u - mp.log(q)) * self.law.pair(mp.exp(u))[side]
        edge = mp.mpf(self.law.mid)
        while self.law.pair(edge)[1 - side] > mp.mpf(10) ** -19:
            edge *= mp.mpf(0.7) if side == 1 else mp.mpf(1.3)
        rest, u, d = mp.mpf(0), mp.log(edge), mp.mpf(0.25)
        if side == 1:
            rest = self.chi(edge, q, False)
        else:
            d = -d
            if edge < q:
                rest = self.chi(edge, q, True)
            else:
                u = min(u, mp.log(q) + mp.log(mp.mpf(130) / self.nu) / 2)
        start, top = u, rest
        while True:
            y = f(u)
            top = max(top, y)
            u += d
            if y < mp.mpf(10) ** -19 * top:
                break
        lo, hi = sorted((start, u))
        return rest + panels(f, lo, hi, max(3, int((hi - lo) / (9 * self.law.step)) + 1))

    def b(self, q, side):
        q = mp.mpf(q)
        if self.nu == inf:
            return self.law.other(q)[side]
        if self.nu <= 60 and hasattr(self.law, "density"):
            f = lambda u: mp.exp(u) * self.law.density(mp.exp(u)) * self.chi(mp.exp(u), q, side == 0)
            u, h = mp.log(self.law.mid), mp.mpf(0.5)
            best = f(u)
            while h > 0.1:
                for x in (u + h, u - h):
                    y = f(x)
                    if y > best:
                        u, best = x, y
                        break
                else:
                    h /= 2
            hs = 1 / mp.sqrt(mp.mpf(2) * self.nu / mp.mpf(0.4)**2 + 1 / mp.mpf(self.law.step)**2)
            return outwards(f, u, hs * mp.mpf(0.9), mp.mpf(10) ** -19)
        m = self.mode(q, side)
        r = 14 / mp.sqrt(2 * mp.mpf(self.nu))
        lo, hi = m - r * (1 + 5 / mp.sqrt(self.nu)), m + min(r, 2)
        f = lambda u: self.g(u - mp.log(q)) * self.law.other(mp.exp(u))[side]
        return panels(f, lo, hi, max(4, int((hi - lo) / min(4 / mp.sqrt(2 * mp.mpf(self.nu)), 9 * self.law.step)) + 1), 16)


def row(name, k, nu, x, lambdas=""):
    law = {"srange": Range, "smm": Modulus}[name](k) if not lambdas else Dunnett(lambdas.split())
    s = Study(law, nu)
    side = 1
    u = s.a(x, 1)
    if u > 0.5:
        side, u = 0, s.a(x, 0)
    v = s.b(x, side)
    d = abs(u / v - 1)
    if not d < 1e-15:
        print("dropped", name, k, nu, x, lambdas, mp.nstr(u, 20), mp.nstr(v, 20), file=sys.stderr, flush=True)
        return
    print("%s,%s,%s,%r,%s,%s,%s" % (name, lambdas or k, nu, x, "upper" if side else "lower", mp.nstr(u, 20), mp.nstr(d, 2)), flush=True)


SRANGE = [(1000, inf, 16.49), (1000, inf, 5.9), (300, inf, 6.002), (3, 0.02, 6.023e-05), (3, 0.2, 5.894e+11), (3, 1e12, 1.138), (300, 4, 27.15),
          (40, 50, 2.647), (7, 0.001, 0.0048), (40, 0.2, 1.737e+125), (1000, 1e9, 8.089), (1000, 0.2, 2.563e+12)]
SMM = [(1, 0.001, 3.164e-08), (1, 0.2, 98.87), (30, 0.001, 5.429e+153), (30, 50, 4.136),
       (3000, 0.001, 0.02407), (3000, 0.2, 620.2), (3000, 50, 24.13), (3000, 1e9, 2.702),
       (10000, 0.2, 1.627e+45), (10000, 50, 5.79), (10000, 1e12, 11.32)]
DUNNETT = [("0.5 0.5 0.5", inf, 2.5), ("0.5 0.5 0.5", inf, 0.01), ("0.2 0.6 -0.9", inf, 7.5), ("0.2 0.6", 9, 3.1),
           ("0.7 0.75", 20, 0.4), ("0.7 0.7 0.75", 1e6, 8.0), ("0.8 0.1", 3, 40.0)]

if __name__ == "__main__":
    print("# tails of the studentized range, the maximum modulus and Dunnett's two-sided law (groups or lambdas, df)")
    print("# mpmath at 24 digits by two methods, gen/studentized.py; last column: their relative difference")
    print("law,k,df,x,tail,p,difference")
    part = sys.argv[1] if len(sys.argv) > 1 else "all"
    if part in ("all", "smm"):
        for r in SMM:
            row("smm", *r)
    if part in ("all", "dunnett"):
        for l, nu, x in DUNNETT:
            row("dunnett", 0, nu, x, l)
    if part in ("all", "srange"):
        for r in SRANGE if len(sys.argv) < 3 else [SRANGE[int(i)] for i in sys.argv[2:]]:
            row("srange", *r)
