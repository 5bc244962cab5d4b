package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
)

// ProfilePoint is one value of a profile.
type ProfilePoint struct {
	Value     float64
	LogLambda float64 // log likelihood there, the rest maximised, minus the maximum; −Inf where nothing is possible
	// SignedRoot is ±√(−2 log λ), negative below the estimate: a straight line
	// where the normal approximation is good.
	SignedRoot float64
	Fit        Fit // the fit with the value fixed
}

// ProfileCurve evaluates the profile of a parameter of a declared space at the
// given values, for a picture or a check by eye. The order of values is kept.
func ProfileCurve(ctx context.Context, full Space, name string, at []float64, s *Settings) ([]ProfilePoint, error) {
	if _, ok := full.(declaredSpace); !ok {
		return nil, profileError(name, fmt.Errorf("%w: %T is not a declared space", ErrInvalid, full))
	}
	pr, err := newProfiler(ctx, full, s, 0, []string{name})
	if err != nil {
		return nil, profileError(name, err)
	}
	pr.restrict = func(v []float64) (Space, error) { return Restrict(pr.declared, Fix(name, v[0])) }
	out := make([]ProfilePoint, len(at))
	for i, v := range at {
		if math.IsNaN(v) {
			return nil, profileError(name, fmt.Errorf("%w: value %d is NaN", ErrInvalid, i))
		}
		t, fit, err := pr.at(ctx, []float64{v})
		if err != nil && !errors.Is(err, errHigher) {
			return nil, profileError(name, err)
		}
		out[i] = ProfilePoint{Value: v, LogLambda: -0.5 * t, Fit: fit,
			SignedRoot: math.Copysign(math.Sqrt(math.Max(t, 0)), v-pr.centre[0])}
	}
	return out, nil
}

// Region is the border of a joint confidence region of two parameters.
type Region struct {
	Names    [2]string
	Level    float64
	Estimate [2]float64
	// Border has the points in order of their angle around the estimate.
	Border [][2]float64
	// Open tells which of them do not exist: nothing is rejected that way, and the
	// point is as far as the search went.
	Open []bool
	Why  string
}

// ProfileRegion returns the border of the region of two parameters of a declared
// space that −2 log λ with χ²(2) does not reject, as points on rays from the
// estimate (on the fitting scale, in the metric of the covariance). A region
// that is not seen whole from the estimate shows its nearest border only. points
// is at least 4.
func ProfileRegion(ctx context.Context, full Space, a, b string, level float64, points int, s *Settings) (Region, error) {
	name := a + ", " + b
	if _, ok := full.(declaredSpace); !ok || points < 4 || a == b {
		return Region{}, profileError(name, fmt.Errorf("%w: a declared space, two parameters and at least 4 points are needed", ErrInvalid))
	}
	pr, err := newProfiler(ctx, full, s, level, []string{a, b})
	if err != nil {
		return Region{}, profileError(name, err)
	}
	pr.restrict = func(v []float64) (Space, error) { return Restrict(pr.declared, Fix(a, v[0]), Fix(b, v[1])) }
	rho, err := pr.correlation(ctx, a, b)
	if err != nil {
		return Region{}, profileError(name, err)
	}
	r := Region{Names: [2]string{a, b}, Level: pr.level, Estimate: [2]float64{pr.centre[0], pr.centre[1]}, Why: pr.why}
	var open []string
	for i := range points {
		phi := 2 * math.Pi * float64(i) / float64(points)
		dir := []float64{pr.unit[0] * math.Cos(phi), pr.unit[1] * (rho*math.Cos(phi) + math.Sqrt(1-rho*rho)*math.Sin(phi))}
		pr.last = pr.base.Estimate
		w, why, err := pr.reach(ctx, dir, inf)
		if err != nil {
			return Region{}, profileError(name, err)
		}
		if why != "" {
			open = append(open, fmt.Sprintf("%.0f°", 360*float64(i)/float64(points)))
			w = 64
		}
		var pt [2]float64
		for k, l := range pr.links {
			pt[k], _ = l.to(l.from(pr.centre[k]) + w*dir[k])
		}
		r.Border, r.Open = append(r.Border, pt), append(r.Open, why != "")
	}
	if len(open) > 0 {
		r.Why += "; open towards " + strings.Join(open, ", ")
	}
	return r, nil
}

// correlation of two estimates, 0 where it is not known.
func (pr *profiler) correlation(ctx context.Context, a, b string) (float64, error) {
	e, err := pr.declared.Estimates(ctx, pr.base)
	if err != nil {
		return 0, ctx.Err()
	}
	f := pr.declared.frame
	i, j, n := f.index[a], f.index[b], len(f.params)
	rho := e.Covariance[i*n+j] / (e.StdErr[i] * e.StdErr[j])
	for k := range pr.links {
		if pr.links[k].kind == linkBelow {
			rho = -rho
		}
	}
	if !(math.Abs(rho) < 0.9999) {
		if math.Abs(rho) >= 0.9999 {
			return math.Copysign(0.9999, rho), nil
		}
		return 0, nil
	}
	return rho, nil
}
