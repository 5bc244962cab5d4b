package lrt

import (
	"errors"
	"fmt"
	"math"
	"testing"

	"subsume.example/dist"
)

// vectorsOf draws rows in k groups.
func vectorsOf(n, p, k int, scale float64, seed uint64) ([][]float64, []int) {
	r := draw(seed)
	var rows [][]float64
	var group []int
	for i := range n {
		row := make([]float64, p)
		common := r.NormFloat64()
		for j := range row {
			row[j] = scale * (r.NormFloat64() + common + float64(j))
		}
		rows, group = append(rows, row), append(group, i%k)
	}
	return rows, group
}

// One and two groups against Hotelling's T² by its textbook formula; one
// response against the ordinary F of a one-way layout.
func TestHotelling(t *testing.T) {
	for _, scale := range []float64{1e-8, 1, 1e8} {
		for _, n := range []int{8, 25} {
			rows, group := vectorsOf(n, 2, 2, scale, 5)
			m, err := NewMeanVectors(rows, group)
			if err != nil {
				t.Fatal(err)
			}
			r, err := Compare(bg, m.Equal(), m.Free(), nil)
			if err != nil {
				t.Fatal(err)
			}
			// T² = n₁n₂/n · d' S⁻¹ d, F = (n−3)/(2(n−2)) T² on 2 and n−3.
			var mean [2][2]float64
			var size [2]float64
			for i, g := range group {
				size[g]++
				mean[g][0] += rows[i][0]
				mean[g][1] += rows[i][1]
			}
			for g := range 2 {
				mean[g][0] /= size[g]
				mean[g][1] /= size[g]
			}
			var a, b, c float64
			for i, g := range group {
				u, v := rows[i][0]-mean[g][0], rows[i][1]-mean[g][1]
				a, b, c = a+u*u, b+u*v, c+v*v
			}
			nu := float64(n - 2)
			a, b, c = a/nu, b/nu, c/nu
			x, y := mean[0][0]-mean[1][0], mean[0][1]-mean[1][1]
			t2 := size[0] * size[1] / float64(n) * (c*x*x - 2*b*x*y + a*y*y) / (a*c - b*b)
			near(t, "F", r.Exact.Statistic, (nu-1)/(2*nu)*t2, 1e-10)
			if want := (dist.F{D1: 2, D2: float64(n - 3)}); r.Exact.Law != want || r.Exact.Kind != Exact {
				t.Errorf("%v, want %v", r.Exact, want)
			}
			near(t, "λ", r.LogLambda, -0.5*float64(n)*math.Log1p(t2/nu), 1e-10)
		}
	}
	rows, group := vectorsOf(15, 1, 3, 1, 9)
	m, err := NewMeanVectors(rows, group)
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, m.Equal(), m.Free(), nil)
	if err != nil {
		t.Fatal(err)
	}
	var within, total, grand float64
	means := make([]float64, 3)
	for i, g := range group {
		means[g] += rows[i][0] / 5
		grand += rows[i][0] / 15
	}
	for i, g := range group {
		within += (rows[i][0] - means[g]) * (rows[i][0] - means[g])
		total += (rows[i][0] - grand) * (rows[i][0] - grand)
	}
	near(t, "one-way F", r.Exact.Statistic, (total-within)/2/(within/12), 1e-10)
}

// Exact cases of Wilks' Λ (Anderson 2003, section 8.4): for p = 2 the square root
// of Λ gives F with 2q and 2(e−1); Rao's formula must reproduce it, and the
// simulated p of an approximate case must agree with Rao's F.
func TestWilks(t *testing.T) {
	rows, group := vectorsOf(20, 2, 4, 1, 3)
	m, err := NewMeanVectors(rows, group)
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, m.Equal(), m.Free(), nil)
	if err != nil {
		t.Fatal(err)
	}
	root := math.Exp(r.LogLambda / 20) // √Λ
	near(t, "F", r.Exact.Statistic, (1-root)/root*15/3, 1e-11)
	if want := (dist.F{D1: 6, D2: 30}); r.Exact.Law != want || r.Exact.Kind != Exact {
		t.Errorf("%v", r.Exact)
	}
	rows, group = vectorsOf(30, 3, 5, 1, 4)
	if m, err = NewMeanVectors(rows, group); err != nil {
		t.Fatal(err)
	}
	r, err = Compare(bg, m.Equal(), m.Free(), &Settings{Seed: 2, References: []Reference{Bootstrap{Draws: 999}, Bartlett{}}})
	if err != nil {
		t.Fatal(err)
	}
	sim := r.Others[0].Simulation
	if r.Exact.Kind != Approximate || r.Recommended != Simulated || r.Exact.P < sim.Lower || r.Exact.P > sim.Upper {
		t.Errorf("Rao's F %v: p %g, simulated %g to %g", r.Exact.Kind, r.Exact.P, sim.Lower, sim.Upper)
	}
	if b := r.Others[1]; math.Abs(b.P-r.Exact.P) > 0.02 {
		t.Errorf("Bartlett's p %g, Rao's %g", b.P, r.Exact.P)
	}
}

func TestMeanVectorsOneSampleInvariance(t *testing.T) {
	rows, _ := vectorsOf(10, 3, 1, 1, 6)
	m, err := NewMeanVectors(rows, nil)
	if err != nil {
		t.Fatal(err)
	}
	at, err := m.At([]float64{0, 1, 2})
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, at, m.Free(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if want := (dist.F{D1: 3, D2: 7}); r.Exact.Law != want || r.Exact.Kind != Exact {
		t.Errorf("%v", r.Exact)
	}
	// A large constant and other units change nothing.
	shifted := make([][]float64, len(rows))
	for i, v := range rows {
		shifted[i] = []float64{v[0]*1e-6 + 3, v[1] + 1e6, 1e7 * v[2]}
	}
	if m, err = NewMeanVectors(shifted, nil); err != nil {
		t.Fatal(err)
	}
	if at, err = m.At([]float64{3, 1e6 + 1, 2e7}); err != nil {
		t.Fatal(err)
	}
	s, err := Compare(bg, at, m.Free(), nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "F", s.Exact.Statistic, r.Exact.Statistic, 1e-8) // the shift itself rounds the data to 1e-10
	if _, err := Compare(bg, m.Free(), at, nil); !errors.Is(err, ErrNotNested) {
		t.Errorf("%v", err)
	}
}

func TestMeanVectorsBadData(t *testing.T) {
	ok := [][]float64{{1, 2}, {2, 1}, {3, 5}, {4, 4}}
	for _, c := range []struct {
		name  string
		rows  [][]float64
		group []int
	}{
		{"none", nil, nil}, {"empty row", [][]float64{{}}, nil}, {"ragged", [][]float64{{1, 2}, {1}}, nil},
		{"NaN", [][]float64{{1, 2}, {math.NaN(), 1}}, nil}, {"groups", ok, []int{0}}, {"negative group", ok, []int{0, 0, -1, 1}},
		{"empty group", ok, []int{0, 0, 2, 2}}, {"group beyond", ok, []int{0, 0, 9, 1}},
	} {
		if _, err := NewMeanVectors(c.rows, c.group); !errors.Is(err, ErrInvalid) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	for _, rows := range [][][]float64{
		{{1, 2}, {2, 1}},                 // too few
		{{1, 2}, {2, 4}, {3, 6}, {4, 8}}, // collinear
		{{1, 7}, {2, 7}, {3, 7}, {4, 7}}, // constant
		{{1, 1e300}, {2, 1e300}, {3, 1e300}, {4, 1e300}},
	} {
		m, err := NewMeanVectors(rows, nil)
		if err != nil {
			t.Fatal(err)
		}
		at, err := m.At([]float64{0, 0})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := Compare(bg, at, m.Free(), nil); !errors.Is(err, ErrNoErrorDF) {
			t.Errorf("%v: %v", rows, err)
		}
	}
	m, err := NewMeanVectors(ok, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, at := range [][]float64{{1}, {1, math.Inf(1)}} {
		if _, err := m.At(at); !errors.Is(err, ErrInvalid) {
			t.Errorf("%v", err)
		}
	}
	_ = fmt.Sprint(m.Free(), m.Equal())
}
