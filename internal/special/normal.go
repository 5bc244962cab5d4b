package special

import "math"

// Standard normal law. Every tail is φ times the Mills ratio
//
//	M(y) = Q(y)/φ(y) = ∫_0^∞ exp(-y x - x²/2) dx
//
// which is smooth, positive and without cancellation, so that relative
// accuracy holds in the far tails and the logarithms never underflow:
//
//	0 <= y < 8    128 cells, polynomial of degree 7 each  error < 2e-17 + rounding
//	8 <= y        y M(y), polynomial of degree 12 in 1/y²  error < 2e-17 + rounding
//
// (own Chebyshev interpolation at 60 digits, gen/mills.py). exp(-x²/2) takes
// the rounding error of x² into account. Against mpmath: tails within 1 ulp
// in the median and 3 at most wherever they are normal numbers.

const (
	invSqrt2Pi = 0.3989422804014327     // 1/sqrt(2 pi)
	sqrt2Pi    = 2.50662827463100050242 // sqrt(2 pi)
	logSqrt2Pi = 0.9189385332046728     // log(sqrt(2 pi))
)

// Mills returns Q(y)/φ(y), the ratio of the upper tail of the standard normal
// law to its density. For y < 0 it overflows below y = -38.5 as it must;
// Mills(NaN) = NaN, Mills(+Inf) = 0.
func Mills(y float64) float64 {
	if y >= 0 {
		return millsPositive(y)
	}
	if y < 0 {
		return (1 - NormalUpper(-y)) / NormalDensity(y)
	}
	return y
}

// millsPositive is Mills for y >= 0; it does not check.
func millsPositive(y float64) float64 {
	if y < 8 {
		i := int(y * 16)
		c := &millsTable[i&(millsCells-1)]
		d := y - (float64(i)+0.5)*0.0625
		d2 := d * d
		return (c[0] + c[1]*d) + d2*((c[2]+c[3]*d)+d2*((c[4]+c[5]*d)+d2*(c[6]+c[7]*d)))
	}
	if y < 1e9 {
		x := 1/(y*y) - 1.0/128
		x2 := x * x
		c := &millsFar
		p := (c[8] + c[9]*x) + x2*((c[10]+c[11]*x)+x2*c[12])
		p = (c[4] + c[5]*x) + x2*((c[6]+c[7]*x)+x2*p)
		return ((c[0] + c[1]*x) + x2*((c[2]+c[3]*x)+x2*p)) / y
	}
	return 1 / y
}

// MillsPair returns the Mills ratios of x and y, both at least 0. It does not
// check: it is the inner loop of integrals over products of normal intervals.
func MillsPair(x, y float64) (mx, my float64) {
	if x < 8 && y < 8 {
		i, j := int(x*16), int(y*16)
		c, e := &millsTable[i&(millsCells-1)], &millsTable[j&(millsCells-1)]
		d, f := x-(float64(i)+0.5)*0.0625, y-(float64(j)+0.5)*0.0625
		d2, f2 := d*d, f*f
		mx = (c[0] + c[1]*d) + d2*((c[2]+c[3]*d)+d2*((c[4]+c[5]*d)+d2*(c[6]+c[7]*d)))
		my = (e[0] + e[1]*f) + f2*((e[2]+e[3]*f)+f2*((e[4]+e[5]*f)+f2*(e[6]+e[7]*f)))
		return mx, my
	}
	return millsPositive(x), millsPositive(y)
}

// expHalfSquare returns exp(-x²/2) to about 1 ulp.
func expHalfSquare(x float64) float64 {
	h := x * x
	if h > 3000 {
		return 0
	}
	return math.Exp(-0.5*h) * (1 - 0.5*math.FMA(x, x, -h))
}

// NormalDensity returns φ(x) = exp(-x²/2)/sqrt(2 pi).
func NormalDensity(x float64) float64 { return invSqrt2Pi * expHalfSquare(x) }

// NormalLogDensity returns log φ(x).
func NormalLogDensity(x float64) float64 { return -0.5*x*x - logSqrt2Pi }

// NormalUpper returns Q(x) = P(Z > x), with relative accuracy in the tail.
func NormalUpper(x float64) float64 {
	if x >= 0 {
		if x > 39 {
			return 0
		}
		return invSqrt2Pi * expHalfSquare(x) * millsPositive(x)
	}
	if x < 0 {
		return 1 - NormalUpper(-x)
	}
	return x
}

// NormalLower returns Φ(x) = P(Z <= x), with relative accuracy in the tail.
func NormalLower(x float64) float64 { return NormalUpper(-x) }

// NormalLogUpper returns log Q(x), finite until x² overflows.
func NormalLogUpper(x float64) float64 {
	if x >= 0 {
		if x > 1e154 {
			return math.Inf(-1)
		}
		return -0.5*x*x - (logSqrt2Pi - math.Log(millsPositive(x)))
	}
	if x < 0 {
		return math.Log1p(-NormalUpper(-x))
	}
	return x
}

// NormalLogLower returns log Φ(x).
func NormalLogLower(x float64) float64 { return NormalLogUpper(-x) }

// NormalCentral returns Φ(x) - 1/2, odd in x and relatively accurate near 0.
func NormalCentral(x float64) float64 {
	if x > -1 && x < 1 {
		return 0.5 * math.Erf(x*math.Sqrt2*0.5)
	}
	if x > 0 {
		return 0.5 - NormalUpper(x)
	}
	return NormalUpper(-x) - 0.5
}

// Gauss8X and Gauss8W are the positive half of the eight-point Gauss-Legendre
// rule on [-1, 1] (Abramowitz and Stegun 25.4.30, recomputed at 40 digits).
var (
	Gauss8X = [4]float64{0.18343464249564980, 0.52553240991632899, 0.79666647741362674, 0.96028985649753623}
	Gauss8W = [4]float64{0.36268378337836198, 0.31370664587788729, 0.22238103445337447, 0.10122853629037626}
)

// NormalBetween returns P(a < Z <= b) for a <= b with relative accuracy: also
// when the two are close together or far out on the same side. It is NaN for
// a > b.
func NormalBetween(a, b float64) float64 {
	if !(a <= b) {
		return math.NaN()
	}
	w := b - a
	if m := a + 0.5*w; w*math.Max(1, math.Abs(m)) <= 1 {
		e := (a - m) + 0.5*w // what rounding took from the middle
		return NormalDensity(m) * (1 - m*e) * w * narrow(m, 0.5*w)
	}
	switch {
	case a >= 0:
		return NormalUpper(a) - NormalUpper(b)
	case b <= 0:
		return NormalUpper(-b) - NormalUpper(-a)
	}
	return NormalCentral(b) - NormalCentral(a)
}

// narrow returns P(|Z-m| < h) / (2 h φ(m)) for h max(1, |m|) <= 1/2: the mean of
// cosh(m x) exp(-x²/2) over |x| < h by the eight-point Gauss-Legendre rule.
// Wider intervals need no such care: their tails differ by a factor of at
// least e^-1, and the difference of those is safe.
func narrow(m, h float64) float64 {
	if h*math.Max(1, math.Abs(m)) < 1e-8 {
		return 1
	}
	s := 0.0
	for i, x := range Gauss8X {
		x *= h
		s += Gauss8W[i] * math.Exp(-0.5*x*x) * math.Cosh(m*x)
	}
	return s
}

// NormalAround returns log P(|Z-m| < h) for h > 0, however small h or the
// probability.
func NormalAround(m, h float64) float64 {
	m = math.Abs(m)
	if h*math.Max(1, m) <= 0.5 {
		return NormalLogDensity(m) + math.Log(2*h*narrow(m, h))
	}
	if m < h {
		return math.Log1p(-(NormalUpper(m+h) + NormalUpper(h-m)))
	}
	l := NormalLogUpper(m - h)
	return l + math.Log1p(-math.Exp(NormalLogUpper(m+h)-l))
}

// NormalUpperQuantile returns the x with Q(x) = q: +Inf at 0, -Inf at 1, NaN
// outside [0, 1]. The lower quantile of p is -NormalUpperQuantile(p).
func NormalUpperQuantile(q float64) float64 {
	switch {
	case !(q >= 0 && q <= 1):
		return math.NaN()
	case q == 0:
		return math.Inf(1)
	case q == 1:
		return math.Inf(-1)
	case q < 0.25:
		return normalTailQuantile(math.Log(q))
	case q > 0.75:
		return -normalTailQuantile(math.Log(1 - q))
	}
	return normalCentralQuantile(0.5 - q)
}

// NormalLogUpperQuantile returns the x with log Q(x) = l, for l <= 0; it
// reaches far beyond the smallest positive q.
func NormalLogUpperQuantile(l float64) float64 {
	switch {
	case !(l <= 0):
		return math.NaN()
	case l == 0:
		return math.Inf(-1)
	case math.IsInf(l, -1):
		return math.Inf(1)
	case l < -1.3863:
		return normalTailQuantile(l)
	case l > -0.2877:
		return -normalTailQuantile(math.Log(-math.Expm1(l)))
	}
	return normalCentralQuantile(-0.5 - math.Expm1(l))
}

// normalCentralQuantile solves Φ(x) - 1/2 = y for |y| <= 0.26 by Halley's
// iteration, f”/f' = -x, from the first terms of the inverse series.
func normalCentralQuantile(y float64) float64 {
	t := y * sqrt2Pi
	t2 := t * t
	x := t * (1 + t2*(1.0/6+t2*(7.0/120+t2*(127.0/5040))))
	for range 6 {
		d := (NormalCentral(x) - y) / NormalDensity(x)
		d /= 1 + 0.5*d*x
		x -= d
		if math.Abs(d) <= 1e-6*math.Abs(x) {
			break // the next correction is of third order in d
		}
	}
	return x
}

// normalTailQuantile solves log Q(x) = l for l < -1.3 by Halley's iteration:
// with the hazard h = 1/M(x), f' = -h and f”/f' = h - x. The function is
// concave, nearly a parabola. It starts from Hastings' fraction (Abramowitz and
// Stegun 26.2.23, error below 4.5e-4), far out from Q(x) ~ φ(x)/x.
func normalTailQuantile(l float64) float64 {
	x := math.Sqrt(-2 * l)
	switch {
	case l > -2000:
		x -= (2.515517 + x*(0.802853+x*0.010328)) / (1 + x*(1.432788+x*(0.189269+x*0.001308)))
	case x < 1e8:
		x = math.Sqrt(-2 * (l + logSqrt2Pi + math.Log(x)))
	}
	for range 8 {
		m := millsPositive(x)
		f := -0.5*x*x - logSqrt2Pi + math.Log(m) - l
		d := -f * m
		d /= 1 - 0.5*d*(1/m-x)
		x -= d
		if math.Abs(d) <= 1e-5*x {
			break
		}
	}
	return x
}
