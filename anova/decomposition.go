package anova

import "fmt"

// Decomposition says which question each term of a layout is asked. With equal
// counts in all cells the three agree; otherwise they are different questions,
// and a table says which it answered. All rows are judged against the error of
// the largest model.
type Decomposition uint8

const (
	// Sequential: does the term add to those before it? The order matters, and
	// the sums of squares add up to that of the whole model.
	Sequential Decomposition = iota
	// Hierarchical: does the term add to all terms that do not contain it? A
	// main effect is adjusted for the other main effects but not for its own
	// interactions.
	Hierarchical
	// Partial: are the equally weighted means of the cells without this effect?
	// The hypothesis Cμ = 0 is imposed on the means of the cells (with
	// covariates: on the cells at any one value of them) and does not depend on
	// coding or counts. It is refused when it touches an empty cell. The work
	// grows with the third power of the number of cells: 400 cells take two seconds.
	Partial
)

// String names the decomposition in lower case.
func (d Decomposition) String() string {
	switch d {
	case Sequential:
		return "sequential"
	case Hierarchical:
		return "hierarchical"
	case Partial:
		return "partial"
	}
	return fmt.Sprintf("decomposition %d", uint8(d))
}

// Meaning says in a sentence what a row of the decomposition asks.
func (d Decomposition) Meaning() string {
	switch d {
	case Sequential:
		return "each term is asked what it adds to the terms before it"
	case Hierarchical:
		return "each term is asked what it adds to all terms that do not contain it"
	case Partial:
		return "each term is asked about equally weighted cell means"
	}
	return d.String()
}
