package lrt

import (
	"fmt"
	"math"
	"strings"
)

// audit holds the model's optional functions against the log likelihood at a
// first point, and turns off with a warning those that disagree. Each costs an
// evaluation or two; simulated data are not audited again.
func (p *problem) audit(u []float64, f float64) *problem {
	ev := p.ev
	if ev.core.drawn || ev.audited || p.co.m == 0 {
		return p
	}
	ev.audited = true
	if p.each && ev.core.logLik != nil {
		if total := ev.value(p.root(u)); ev.err == nil && !(math.Abs(total-f) <= 1e-8*(1+math.Abs(f))) {
			ev.noEach = true
			ev.warn("each-disagrees", fmt.Sprintf("the sum of Each is %.10g where LogLikelihood is %.10g: Each is not used", f, total))
		}
	}
	if p.gradient {
		p.auditGradient(u, f)
	}
	if ev.noEach || ev.noGradient || ev.noHessian {
		return newProblem(ev, p.co)
	}
	return p
}

func (e *evaluator) warn(code, text string) { e.warnings = append(e.warnings, Warning{code, text}) }

func (p *problem) auditGradient(u []float64, f float64) {
	m, ev := p.co.m, p.ev
	g := make([]float64, m)
	curv := make([]float64, m*m)
	p.noise = 4 * epsilon * (1 + math.Abs(f))
	p.survey(u, f, curv)
	if !p.pullBack(u, g) {
		if ev.err == nil {
			ev.noGradient = true
			ev.warn("gradient-disagrees", "Gradient is not finite at the start: differences are used instead")
		}
		return
	}
	// along returns the gradient's and the likelihood's slope along d.
	along := func(d []float64) (own, seen, doubt float64) {
		v := make([]float64, m)
		slope := func(t float64) float64 {
			var e [2]float64
			for i, s := range []float64{t, -t} {
				for j := range v {
					v[j] = u[j] + s*d[j]
				}
				e[i] = p.value(v)
			}
			return (e[0] - e[1]) / (2 * t)
		}
		a, b := slope(2e-3), slope(1e-3)
		seen = (4*b - a) / 3
		return dot(g, d), seen, 0.1*math.Abs(a-b) + 1e4*p.noise
	}
	d := make([]float64, m)
	for j := range d {
		d[j] = p.scale[j] * (0.6 + 0.4*frac(float64(j+1)*math.Phi))
		if g[j] < 0 {
			d[j] = -d[j] // no cancellation between components
		}
	}
	own, seen, doubt := along(d)
	if math.IsNaN(seen) || math.Abs(own-seen) <= 1e-4*math.Max(math.Abs(own), math.Abs(seen))+doubt {
		p.auditHessian(u, d)
		return
	}
	var wrong []string
	for j := range d {
		e := make([]float64, m)
		e[j] = p.scale[j]
		own, seen, doubt := along(e)
		if math.Abs(own-seen) > 1e-4*math.Max(math.Abs(own), math.Abs(seen))+doubt {
			wrong = append(wrong, fmt.Sprintf("%s (given %.6g, differences %.6g)", strings.Join(p.co.names(j), ", "), own/e[j], seen/e[j]))
		}
	}
	if len(wrong) == 0 {
		wrong = []string{fmt.Sprintf("a direction (given %.6g, differences %.6g)", own, seen)}
	}
	ev.noGradient = true
	ev.warn("gradient-disagrees", "Gradient disagrees with differences of the log likelihood, which are used instead; on the fitting scale: "+strings.Join(wrong, "; "))
}

func (p *problem) auditHessian(u, d []float64) {
	if !p.hessian {
		return
	}
	m, ev := p.co.m, p.ev
	info := make([]float64, m*m)
	ok := p.ownHessian(u, info)
	var own float64
	for j := range m {
		own -= d[j] * dot(info[j*m:j*m+m], d)
	}
	v, a, b := make([]float64, m), make([]float64, m), make([]float64, m)
	const t = 1e-3
	for j := range v {
		v[j] = u[j] + t*d[j]
	}
	ok = ok && p.pullBack(v, a)
	for j := range v {
		v[j] = u[j] - t*d[j]
	}
	ok = ok && p.pullBack(v, b)
	seen := (dot(a, d) - dot(b, d)) / (2 * t)
	if ev.err == nil && !(ok && math.Abs(own-seen) <= 1e-3*math.Max(math.Abs(own), math.Abs(seen))+1e-6) {
		ev.noHessian = true
		ev.warn("hessian-disagrees", fmt.Sprintf("Hessian disagrees with differences of Gradient, which are used instead: %.6g against %.6g along one direction", own, seen))
	}
}

func frac(x float64) float64 { return x - math.Floor(x) }
