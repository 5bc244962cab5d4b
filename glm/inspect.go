package glm

// HasConstant reports whether the model holds a common mean: a Constant, or a
// factor with a column for every level.
func (m *Model) HasConstant() bool { return m.carrier() >= 0 }

// Factors returns the names of the fields that stand as levels in the model's
// terms, in the order of the terms, each once.
func (m *Model) Factors() []string {
	var names []string
	for _, b := range m.cols {
		for _, f := range b.factors {
			if indexOf(names, f.field) < 0 {
				names = append(names, f.field)
			}
		}
	}
	return names
}

// Covariates returns the names of the fields that stand as numbers in the
// model's terms, in the order of the terms, each once.
func (m *Model) Covariates() []string {
	var names []string
	for _, b := range m.cols {
		for _, f := range b.numeric {
			if indexOf(names, f) < 0 {
				names = append(names, f)
			}
		}
	}
	return names
}

// TermOf returns the name of the term that a coefficient belongs to, "" when the
// model has no such coefficient.
func (m *Model) TermOf(coefficient string) string {
	t, _, ok := m.coefficient(coefficient)
	if !ok {
		return ""
	}
	return m.cols[t].name
}

// Opaque returns the names of the terms of which it is not known which fields
// they read: those that are not of this package.
func (m *Model) Opaque() []string {
	var names []string
	for _, b := range m.cols {
		if b.fields == nil && b.Key != "constant" {
			names = append(names, b.name)
		}
	}
	return names
}
