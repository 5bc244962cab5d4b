// Package glm fits normal linear models to columns of data and makes them
// comparable: each model is a parameter space (lrt.Space), and two of them, one
// inside the other, are compared exactly by F.
//
// # The question
//
// Does the richer description of the mean (a level of its own for each oven, a slope,
// a product of factors) fit better than the simpler one by more than chance allows? The
// simpler model is the restricted space, the richer one the full space:
//
//	data, err := glm.ReadCSV(ctx, file, nil)
//	simple, err := glm.Normal(ctx, data, "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}}, nil)
//	rich, err := simple.With(ctx, glm.Factor{Field: "substrate"})
//	result, err := lrt.Compare(ctx, simple, rich, nil)
//	fmt.Print(result) // λ, −2 log λ with χ² and its true size, exact F, which to read and why
//
//	fit, err := rich.Fit(ctx, nil) // estimates, standard errors, intervals
//	for _, c := range fit.Coefficients {
//		fmt.Println(c.Name, c.Estimate, c.SE, c.P)
//	}
//	predictions, warnings, err := fit.Predict(ctx, newRows)
//
// # The model
//
// Row i of the data has a response y_i with
//
//	y_i = o_i + x_i1 β_1 + … + x_ip β_p + e_i,   e_i independent normal, mean 0, variance σ²/w_i
//
// where the columns x are those of the terms in their order, o is the offset (0
// where there is none) and w are precision weights (1 where there are none). β and
// σ² maximise the likelihood; estimates of σ² and the F test use the residual
// sum of squares over its degrees of freedom n − rank. The log likelihood holds every constant:
//
//	log L = −(n/2)(log 2π + 1 + log(RSS/n)) + ½ Σ log w_i
//
// and with a known variance −½(n log 2πσ² + RSS/σ²) + ½ Σ log w_i. So two
// models of the same rows differ by log λ.
//
// # Terms and the names of their columns
//
//	term                                  columns                 names
//	Constant{}                            1                       constant
//	Covariate{"x"}                        x                       x
//	Powers{"x", 3}                        x, x², x³               x, x^2, x^3
//	Factor{Field: "a"}                    one for each level      a=p, a=q
//	Cross{Factor{"a"}, Factor{"b"}}       one for each cell       a=p × b=u
//	Cross{Factor{"a"}, Covariate{"x"}}    a slope for each level  a=p × x
//	Cross{Covariate{"x"}, Covariate{"z"}} xz                      x × z
//
// A factor has a column for every level; none is left out in writing. With a
// constant before it they are one too many, and the last is set aside: that of
// the reference level, the first one unless Factor.Reference names another. The
// coefficient of any other level is then its difference from the reference. Without
// a constant those of a factor alone are the means of its levels. Which it
// is does not change the space, nor any comparison. A numeric field serves as a
// factor, too: its distinct values are the levels in ascending order, named by
// their shortest decimals. A name that two columns share is refused.
//
// Restrict takes linear equations between coefficients by these names:
// lrt.Fix("x", 0.5), lrt.Equate("a=q", "a=r"), lrt.Equations for any other. Beside
// a constant lrt.Fix("a=q", 0.5) speaks of the difference from the reference, as the
// fit shows it; with products of factors state differences of levels or cells. The
// space then lies about another origin, and nesting is decided with it.
//
// # Rows, missing values, weights
//
// Rows stand in the order of the source and keep their numbers, from 0. Nothing is
// left out silently: a missing value in a field that a model uses is an error that
// names column and row. Take the rows complete for all models first, by
// Data.CompleteFor or Data.Complete; every result then counts what was dropped. Models are compared only
// on the same rows with the same response and weights, which is checked by identity
// and, failing that, by a digest of the content.
//
//	weights      meaning                       n                 log likelihood
//	Frequency    w equal observations in one   Σw                that of the rows written out
//	Precision    variance σ²/w                 rows with w > 0   + ½ Σ log w
//
// Rows of weight 0 are counted (warning "zero-weight") and otherwise ignored. Sampling
// weights, inverse chances of selection, are neither: no comparison here holds for them.
//
// Decimals read from text keep the digits that a float64 loses (about 32 in all),
// through to the sums of squares.
//
// # Rank
//
// Columns are taken in the order of the terms. One is set aside when what earlier
// ones leave of it is at most the tolerance, 100·p·2⁻⁵² of its length unless
// Options.RankTolerance says otherwise, p the number of columns of the largest
// model; lengths are taken in twice the working precision, after a shift where
// the model holds a constant. So ranks do not depend on units, on the order or repetition of
// rows, or on how many workers there are. Degrees of freedom are differences of
// ranks, never counts of columns. A column set aside has coefficient 0 and is
// listed in Fit.Aliased; a linear function that it makes undetermined is refused
// (ErrNotEstimable) or, in a prediction, marked.
//
// With more than 600 columns the largest factor is eliminated first, by sums and
// counts of its levels; the coefficients follow the order of the terms all the same.
//
// # Error terms and exactness
//
// A comparison may name the pair of spaces that estimates its error
// (lrt.ErrorPair) and what else may be in the data (lrt.Effects): plots, subjects,
// batches with variances of their own. From the design alone it is then decided
// whether F has exactly the F law under the null for every value of those variances;
// if not, the result says which term breaks which identity, and F counts as
// approximate. Join factors all spaces of many comparisons in one pass over the rows.
//
// # Errors
//
// Errors are typed and name the place; tell them apart by errors.Is and errors.As:
//
//	*ColumnError          a field: its name, the row, the text; wraps ErrUnknownColumn, ErrNotNumeric,
//	                      ErrNotCategorical, ErrUnknownLevel, ErrMissing, ErrNotFinite, ErrWeight, ErrEmpty …
//	*CSVError, *LimitError  a text file: line and position; or its size
//	*TermError            a term; wraps ErrTerm or what the term itself returned
//	*CoefficientError     a name; wraps ErrUnknownCoefficient
//	*lrt.ComparisonError  a comparison and the space at fault; wraps lrt.ErrNotNested,
//	                      lrt.ErrDifferentObservations, lrt.ErrNothingTested, lrt.ErrNoErrorDF …
//	ErrNotEstimable       the data say nothing about a linear function
//	ErrContradiction      restrictions that cannot hold together
//	ErrOption, ErrOverflow
//
// An error of the context is returned as it is. Nothing panics on data.
//
// # Warnings
//
// What is usable but doubtful stands in Warnings, with a code that stays:
//
//	code                        meaning
//	collinear                   columns that earlier ones span were set aside
//	coefficient-range           a coefficient is outside the floating-point range in the units of its field
//	empty                       no row has a level or cell, or a column is zero
//	extrapolation               new rows lie outside the range of the fit
//	group-of-one                a level has a single row
//	largest-factor-first        with very many columns, those set aside are not the last of the terms
//	nil-residual                the residual is nil on the scale of the data: a perfect fit, F = +Inf
//	no-error                    no degrees of freedom for error: no standard errors
//	not-estimable               new rows ask for what the data say nothing about
//	rank-doubtful               another way to decide the rank, or rounding, speaks for another one
//	standard-errors-on-request  more than 2,000 coefficients: standard errors by Combination only
//	sum-of-squares-range        the residual sum of squares leaves the floating-point range; nothing else is lost
//	zero-weight                 rows of weight 0 are not counted as observations
//
// # For people who write a Source
//
// A Source shows its rows in windows: consecutive rows, each field a slice. It
// may generate, stream or decode them; nothing is copied that need not be, and no
// array of the whole design is ever formed. Each call of Windows is a pass of its own over the same rows
// in the same order, and passes may run at the same time. The levels of a
// categorical field are declared in the schema before the first row. How the
// rows are cut does not change a bit of any result. Implement Sliced, too, where
// any block of rows can be had at once: workers then share a pass. Observations
// gives the identity by which models are known to rest on the same rows:
// one lrt.NewID for the life of the source, and another for each response.
//
// # For people who write a Term
//
// A Term names fields and holds no data. Bind finds the fields in the schema, passes
// over the rows if it needs a centre or knots, and returns Columns: names, and
// either Fill, which writes dense columns of a window, or Index, which names the one
// column that is not zero in each row (and Value, where that is not 1). The same
// Columns serve the rows of the fit and new rows, so they must not look at anything but the
// window and what Bind found. Give them a Key that says all that they depend on,
// and two models share the columns. A term that also has
//
//	Fields() []string
//
// (interface Fielder) says what it reads: new rows need no other fields, a prediction
// knows when it extrapolates, and CompleteFor knows which values must be there.
// Columns made from the response must be marked FromResponse: no F about them
// is exact but by a theorem of its own.
//
// # What it does not do
//
// Errors are normal, independent given the random terms, and of one variance up
// to weights: no variance is modelled here. Random terms enter the certificate of an F, they are not
// estimated. Columns are not selected, data are not changed, and no test picks
// another test. A covariate as a slope for each level (Cross) loses digits only where its mean is more
// than 10⁹ times its spread; otherwise large origins cost nothing. Decisions that can
// hurt people need qualified review and the rules of their field.
package glm
