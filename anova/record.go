package anova

import (
	"io"

	"subsume.example/internal/canon"
)

// Record is the account of an analysis that an auditor needs: what was asked, of
// which data, by which method, with which numbers, what was checked and what was
// not, and how to get the same again. Its JSON has one form: two runs of one
// program on the same data give the same bytes, for no clock, path or machine
// name is in it. The names of the fields in JSON are a promise.
type Record struct {
	Schema       string             `json:"schema"` // "anova.record/1"
	Declared     Declaration        `json:"declared"`
	Design       RecordDesign       `json:"design"`
	Data         RecordData         `json:"data"`
	Method       RecordMethod       `json:"method"`
	Rows         []RecordRow        `json:"rows"`
	Reports      []Report           `json:"-"` // means, contrasts, effects, plans: written under "reports"
	Warnings     []RecordWarning    `json:"warnings"`
	Reproduction RecordReproduction `json:"reproduction"`
}

// Declaration is what only a person knows about an analysis.
type Declaration struct {
	// Question is the hypothesis in words.
	Question string `json:"question"`
	// Units are what was measured; Blocks and Strata group them; Randomization says
	// how treatments were given to them.
	Units         string `json:"units"`
	Blocks        string `json:"blocks"`
	Strata        string `json:"strata"`
	Randomization string `json:"randomization"`
	// Fixed and Random list the factors by what their levels stand for.
	Fixed  []string `json:"fixed,omitempty"`
	Random []string `json:"random,omitempty"`
	// MissingRule says how missing values were dealt with.
	MissingRule string `json:"missing_rule"`
	// Decomposition is the question asked of each row.
	Decomposition string `json:"decomposition"`
	// Plan is what was planned, Deviations how the analysis departs from it.
	Plan       string   `json:"plan,omitempty"`
	Deviations []string `json:"deviations,omitempty"`
	// Checks of assumptions that were made, with their results, and those that were not.
	Checks        []RecordCheck `json:"checks,omitempty"`
	ChecksNotMade []string      `json:"checks_not_made,omitempty"`
}

// RecordCheck is the result of a check of an assumption. A check without a test has
// P = NaN.
type RecordCheck struct {
	Name      string  `json:"name"`
	Statistic string  `json:"statistic"`
	Value     float64 `json:"value"`
	P         float64 `json:"p"`
	Reference string  `json:"reference"`
	Note      string  `json:"note,omitempty"`
}

// RecordDesign is the layout as the data have it.
type RecordDesign struct {
	Factors    []RecordFactor    `json:"factors"`
	Covariates []RecordCovariate `json:"covariates"`
	// Cells lists the combinations of all factors with their counts, unless there
	// are more than 10,000; EmptyCells those without observations.
	Cells      []RecordCell `json:"cells"`
	EmptyCells []string     `json:"empty_cells"`
	CellCount  int          `json:"cell_count"`
}

// RecordFactor is a factor with its levels in order.
type RecordFactor struct {
	Name   string   `json:"name"`
	Levels []string `json:"levels"`
}

// RecordCovariate is a numeric field of the model with its mean over the observations.
type RecordCovariate struct {
	Name string  `json:"name"`
	Mean float64 `json:"mean"`
}

// RecordCell is a cell with the number of its observations.
type RecordCell struct {
	Name  string  `json:"name"`
	Count float64 `json:"count"`
}

// RecordData identifies the data.
type RecordData struct {
	// Source is the name of the file without its folders; "" for data in memory.
	Source   string       `json:"source"`
	RowsRead int          `json:"rows_read"`
	RowsUsed int          `json:"rows_used"`
	Dropped  []RecordDrop `json:"dropped"`
	Emptied  []string     `json:"emptied_levels"`
	// RowsDigest is the SHA-256 of all columns with their names, ColumnDigests those of
	// the columns that the models use, of the values as they were used.
	RowsDigest    string         `json:"rows_sha256"`
	ColumnDigests []RecordDigest `json:"columns"`
}

// RecordDrop is a set of rows left out for one reason, by their numbers in the
// source from 0, and their lines where it is a file.
type RecordDrop struct {
	Column string `json:"column"`
	Reason string `json:"reason"`
	Rows   []int  `json:"rows"`
	Lines  []int  `json:"lines,omitempty"`
}

// RecordDigest is the digest of a column.
type RecordDigest struct {
	Column string `json:"column"`
	Role   string `json:"role"`
	SHA256 string `json:"sha256"`
}

// RecordMethod says how the rows were tested; what differs between rows is in them.
type RecordMethod struct {
	Response    string  `json:"response"`
	Model       string  `json:"model"` // whose residual is the error of the rows
	Family      string  `json:"family"`
	Link        string  `json:"link"`
	Level       float64 `json:"level"`
	Side        string  `json:"side"`
	Dispersion  string  `json:"dispersion"`
	WeightsKind string  `json:"weights_kind"`
	Weights     string  `json:"weights"`
	Offset      string  `json:"offset"`
	Coding      string  `json:"coding"`
}

// RecordRow is a comparison with its numbers. Numbers that do not exist are null
// with a reason.
type RecordRow struct {
	Name       string `json:"name"`
	Restricted string `json:"restricted"`
	Full       string `json:"full"`
	ErrorSpace string `json:"error_space"`
	Hypothesis string `json:"hypothesis"`
	// Reading is exact, approximate, asymptotic or simulated, Why the reason; for a row that could not
	// be tested, what failed.
	Reading   string `json:"reading"`
	Why       string `json:"why"`
	Statistic string `json:"statistic"`
	Reference string `json:"reference"`

	RankRestricted int     `json:"rank_restricted"`
	RankFull       int     `json:"rank_full"`
	RankErrorLess  int     `json:"rank_error_smaller"`
	RankErrorMore  int     `json:"rank_error_larger"`
	RSSRestricted  float64 `json:"rss_restricted"`
	RSSFull        float64 `json:"rss_full"`
	LogLRestricted float64 `json:"log_likelihood_restricted"`
	LogLFull       float64 `json:"log_likelihood_full"`
	SS             float64 `json:"ss"`
	DF             float64 `json:"df"`
	MS             float64 `json:"ms"`
	DFError        float64 `json:"df_error"`
	MSError        float64 `json:"ms_error"`
	Value          float64 `json:"value"`
	P              float64 `json:"p"`
	LogP           float64 `json:"log_p"`
	Critical       float64 `json:"critical"`
	// Noncentrality is the unbiased estimate F·d1·(d2 − 2)/d2 − d1, which may be negative.
	Noncentrality  float64 `json:"noncentrality_estimate"`
	LogLambda      float64 `json:"log_lambda"`
	Lambda         float64 `json:"lambda"`
	LambdaOf       string  `json:"lambda_of"`
	ChiSquaredP    float64 `json:"chi_squared_p"`
	ChiSquaredSize float64 `json:"chi_squared_true_size"`
	// Certified says that F has exactly its law by the design; Violation is the
	// largest departure from the identities of the certificate, Allowed what passes.
	Certified bool    `json:"certified"`
	Violation float64 `json:"certificate_residual"`
	Allowed   float64 `json:"certificate_tolerance"`
	Failed    string  `json:"certificate_failed,omitempty"`
	Nesting   string  `json:"nesting"`
}

// RecordWarning is a warning with its stable code.
type RecordWarning struct {
	Code string `json:"code"`
	Text string `json:"text"`
}

// RecordReproduction is what it takes to get the same again.
type RecordReproduction struct {
	Library string `json:"library"`
	Go      string `json:"go"`
	Arch    string `json:"goarch"`
	Seed    uint64 `json:"seed"`
	// RankTolerance is the relative pivot below which a column is set aside,
	// SmallestKept and LargestAside the pivots on both sides of it.
	RankTolerance float64 `json:"rank_tolerance"`
	SmallestKept  float64 `json:"smallest_pivot_kept"`
	LargestAside  float64 `json:"largest_pivot_aside"`
	Fitting       string  `json:"fitting"`
}

// CanonicalJSON returns the record as JSON without white space. The form is
// fixed: fields in the order of the struct, shortest floats that read back, null
// with a field of its name and "_reason" for what is not finite.
func (r Record) CanonicalJSON() ([]byte, error) { return canon.Marshal(r.object()) }

// WriteJSON writes the record as JSON in indented lines; its values are those of CanonicalJSON.
func (r Record) WriteJSON(w io.Writer) error {
	b, err := canon.Indent(r.object())
	if err != nil {
		return err
	}
	_, err = w.Write(b)
	return err
}

func (r Record) object() canon.Object {
	reports := make([]canon.Object, len(r.Reports))
	for i, p := range r.Reports {
		reports[i] = p.object()
	}
	return canon.Object{
		{Name: "schema", Value: r.Schema}, {Name: "declared", Value: r.Declared}, {Name: "design", Value: r.Design},
		{Name: "data", Value: r.Data}, {Name: "method", Value: r.Method}, {Name: "rows", Value: r.Rows},
		{Name: "reports", Value: reports}, {Name: "warnings", Value: r.Warnings}, {Name: "reproduction", Value: r.Reproduction},
	}
}
