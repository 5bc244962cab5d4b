package lrt

// Restriction is a condition on the parameters of a space, as a value: linear
// equations, bounds, or a map from fewer parameters. Restrictions are made by
// Fix, Equate, Equations, AtLeast, AtMost and Via, and applied by Restrict.
type Restriction struct {
	Equations []Equation
	Bounds    []Bound
	Via       *Map
}

// Equation is the linear equation Σ Coef[i]·Names[i] = Value.
type Equation struct {
	Names []string
	Coef  []float64
	Value float64
}

// Bound keeps one parameter within [Lower, Upper]; ±Inf for no limit.
type Bound struct {
	Name         string
	Lower, Upper float64
}

// Param is a named parameter with its range, an open interval end being ±Inf.
type Param struct {
	Name         string
	Lower, Upper float64
}

// Map expresses the parameters theta of a space by fewer parameters phi. To
// must fill all of theta and keep the equations that hold there already.
type Map struct {
	Params []Param
	To     func(phi, theta []float64)
	Start  []float64 // rough values of phi; nil: searched

	tag string // a map of the library's own
}

// Fix holds one parameter at a value.
func Fix(name string, value float64) Restriction {
	return Restriction{Equations: []Equation{{Names: []string{name}, Coef: []float64{1}, Value: value}}}
}

// Equate makes all the named parameters equal.
func Equate(names ...string) Restriction {
	var r Restriction
	for i := 1; i < len(names); i++ {
		r.Equations = append(r.Equations, Equation{Names: []string{names[0], names[i]}, Coef: []float64{1, -1}})
	}
	return r
}

// Equations imposes linear equations.
func Equations(eqs ...Equation) Restriction { return Restriction{Equations: eqs} }

// AtLeast imposes name >= value.
func AtLeast(name string, value float64) Restriction {
	return Restriction{Bounds: []Bound{{Name: name, Lower: value, Upper: inf}}}
}

// AtMost imposes name <= value.
func AtMost(name string, value float64) Restriction {
	return Restriction{Bounds: []Bound{{Name: name, Lower: -inf, Upper: value}}}
}

// Via expresses the parameters through fewer ones.
func Via(m Map) Restriction { return Restriction{Via: &m} }
