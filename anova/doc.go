// Package anova puts nested comparisons of means into tables and follows them up.
//
// Its question is which of several factors, interactions and covariates explain
// a response by more than chance allows. Each row of a table is one
// lrt.Comparison: a restricted model inside a full one, judged against a stated
// error. The package computes no sum of squares, no likelihood and no p-value of
// a comparison of its own: glm fits, lrt concludes, and a row can be made only from what
// they return. So a table and a comparison cannot disagree, and every row can be
// run again alone.
//
// # A table in three steps
//
//	data, err := glm.ReadCSV(ctx, file, nil)
//	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, nil)
//	table, err := anova.Tabulate(ctx, rows, nil)
//	fmt.Print(table)
//
// A layout (OneWay, Crossed, Terms) is only a function that returns comparisons;
// write your own the same way, with any error pair. Tabulate joins all linear
// models that the comparisons name in one factorization, made in one pass over
// the rows, and runs each.
//
// # Which question
//
// With equal counts in all cells the sums of squares of factors and interactions
// are the same however they are asked for. Otherwise the Decomposition says
// which question each row answers:
//
//   - Sequential: what does the term add to those before it? The order matters.
//   - Hierarchical: what does it add to all terms that do not contain it?
//   - Partial: are the equally weighted cell means without this effect? The
//     hypothesis Cμ = 0 is imposed as equations on the model of all terms.
//
// The table prints the two spaces of each row or the equations between them. Degrees
// of freedom come from ranks, so that empty cells are no special case: a
// hierarchical interaction has as many as the filled cells allow, a partial
// hypothesis that touches an empty cell is refused with the cells named, and a
// row of which nothing is left to test says so. It is still a row.
//
// # Error
//
// All rows of a layout are judged against what its largest model leaves. λ of a
// row is then taken over the rows of the data where that model is the row's own,
// and over the stratum of numerator and error otherwise (lrt.Result.Stratum);
// both go with the same F. For split plots, nested factors and other designs
// with several errors, give each comparison its lrt.ErrorPair.
//
// # Following up
//
// Means gives the means of groups as observed and by the model, covariates held
// and other factors averaged as stated. Groups.Test tests contrasts of them: each is
// the model restricted by one equation, inside the model, so that t² is the F of
// a comparison; Method says how the family is accounted for (Tukey for all pairs,
// Scheffe for contrasts that the data suggested, Bonferroni or Holm for a few fixed in
// advance), and raw p-values and intervals are always kept beside. Row.Effect and Table.Effects give effect sizes
// with intervals, ContrastResult.Standardized differences in error standard deviations.
//
// # Planning
//
// A Design states the means worth finding before there are data. Its Power,
// SampleSize and Detectable fit the comparisons that Crossed would make for data
// to the expected means, so that plan and analysis test the same. There is no
// power at an estimated effect: it would be the p-value in other words.
//
// # Writing
//
// Table, Groups, Family, Power and Size have a Report: one value with WriteText,
// WriteMarkdown and WriteHTML for people and WriteCSV and WriteJSON for programs, whose keys are
// a promise (see each Report method). p is never written as zero unless the fit is perfect.
// NewRecord makes the account of an analysis that an auditor needs, byte-equal on
// a rerun.
//
// # What a table does not show
//
// F is exact for independent normal errors of one variance about the mean of the
// largest model. The table does not check that, nor that units were
// randomized, and several rows are several tests. Where a decision can hurt
// someone (medicine, safety), have the design and the analysis reviewed by a
// qualified person, and follow the rules of the field.
//
// # Errors
//
// What a layout cannot be made of is a *LayoutError wrapping ErrLayout; a field
// that is missing or has a value at fault is a *glm.ColumnError. A row that
// cannot be tested has an *EmptyCellsError, or an *lrt.ComparisonError wrapping
// lrt.ErrNothingTested, lrt.ErrNoErrorDF or lrt.ErrNoVariation.
package anova
