package main

// record is what somebody needs who has to defend the answer, or to work it
// again: no clock, no path, no rounding. A number that is NaN or infinite is
// null, and a field of its name with "_reason" added says which. The fields are a
// promise; new ones may be added.
type record struct {
	Schema       string          `json:"schema"`
	Hypothesis   recHypothesis   `json:"hypothesis"`
	Design       recDesign       `json:"design"`
	Data         recData         `json:"data"`
	Method       recMethod       `json:"method"`
	Numbers      recNumbers      `json:"numbers"`
	Table        []recRow        `json:"table"`
	Estimates    recEstimates    `json:"estimates"`
	Multiplicity recMultiplicity `json:"multiplicity"`
	Checks       []recCheck      `json:"checks"`
	NotChecked   []string        `json:"not_checked"`
	Warnings     []recWarning    `json:"warnings"`
	Plan         *recPlan        `json:"plan"`
	Conclusion   []string        `json:"conclusion"`
	Reproduction recReproduction `json:"reproduction"`
}

type recHypothesis struct {
	Words      string   `json:"words"`
	Null       string   `json:"null"`
	Restricted string   `json:"restricted_model"`
	Full       string   `json:"full_model"`
	ErrorPair  []string `json:"error_pair"`
	Tested     []string `json:"parameters_tested"`
}

type recDesign struct {
	Unit          string     `json:"unit"`
	Factor        string     `json:"factor"`
	Kind          string     `json:"factor_kind"`
	Covariates    []string   `json:"covariates"`
	Groups        []recGroup `json:"groups"`
	EmptyCells    []string   `json:"empty_cells"`
	Blocks        []string   `json:"blocks"`
	Randomization string     `json:"randomization"`
}

type recGroup struct {
	Name string `json:"name"`
	Rows int    `json:"rows"`
}

type recData struct {
	Source         string     `json:"source"`
	RowsRead       int        `json:"rows_read"`
	RowsUsed       int        `json:"rows_used"`
	Dropped        []recDrop  `json:"dropped"`
	Emptied        []recLevel `json:"levels_without_rows"`
	Levels         []string   `json:"levels_in_order"`
	MissingRule    string     `json:"missing_rule"`
	MissingWords   []string   `json:"missing_words"`
	Digest         string     `json:"sha256_of_rows"`
	ResponseDigest string     `json:"sha256_of_response"`
}

type recDrop struct {
	Column string `json:"column"`
	Reason string `json:"reason"`
	Lines  []int  `json:"lines"`
}

type recLevel struct {
	Column string `json:"column"`
	Level  string `json:"level"`
}

type recMethod struct {
	Statistic  string  `json:"statistic"`
	Reference  string  `json:"reference"`
	Kind       string  `json:"kind"`
	Why        string  `json:"why"`
	Certified  bool    `json:"certified_exact"`
	Side       string  `json:"side"`
	Level      float64 `json:"confidence_level"`
	Dispersion string  `json:"dispersion"`
	Weights    string  `json:"weights"`
	Offset     string  `json:"offset"`
	Link       string  `json:"link"`
	Coding     string  `json:"contrast_coding"`
}

type recNumbers struct {
	Restricted     recFit  `json:"restricted"`
	Full           recFit  `json:"full"`
	NumeratorDF    float64 `json:"numerator_df"`
	DenominatorDF  float64 `json:"denominator_df"`
	NumeratorSS    float64 `json:"numerator_sum_of_squares"`
	NumeratorMS    float64 `json:"numerator_mean_square"`
	DenominatorMS  float64 `json:"denominator_mean_square"`
	F              float64 `json:"f"`
	P              float64 `json:"p"`
	LogP           float64 `json:"log_p"`
	Critical       float64 `json:"critical_value"`
	Noncentrality  float64 `json:"noncentrality_estimate"`
	LogLambda      float64 `json:"log_lambda"`
	Lambda         float64 `json:"lambda"`
	LambdaOf       string  `json:"lambda_of"`
	ChiSquared     float64 `json:"minus_two_log_lambda"`
	ChiSquaredDF   float64 `json:"chi_squared_df"`
	ChiSquaredP    float64 `json:"chi_squared_p"`
	ChiSquaredLogP float64 `json:"chi_squared_log_p"`
	ChiSquaredTrue float64 `json:"chi_squared_true_size"`
}

type recFit struct {
	N             int     `json:"n"`
	Rank          int     `json:"rank"`
	ErrorDF       int     `json:"error_df"`
	RSS           float64 `json:"residual_sum_of_squares"`
	SD            float64 `json:"residual_sd"`
	LogLikelihood float64 `json:"log_likelihood"`
}

type recRow struct {
	Name       string  `json:"name"`
	Hypothesis string  `json:"hypothesis"`
	SS         float64 `json:"sum_of_squares"`
	DF         float64 `json:"df"`
	MS         float64 `json:"mean_square"`
	F          float64 `json:"f"`
	P          float64 `json:"p"`
	LogP       float64 `json:"log_p"`
	Kind       string  `json:"kind"`
}

type recEstimates struct {
	At    []recValue `json:"covariates_held_at"`
	Means []recMean  `json:"means"`
	Pairs []recPair  `json:"differences"`
}

type recValue struct {
	Name  string  `json:"name"`
	Value float64 `json:"value"`
}

type recMean struct {
	Group string  `json:"group"`
	N     float64 `json:"n"`
	Raw   float64 `json:"mean_as_measured"`
	RawSD float64 `json:"sd_as_measured"`
	Value float64 `json:"adjusted_mean"`
	SE    float64 `json:"standard_error"`
	Lower float64 `json:"lower"`
	Upper float64 `json:"upper"`
}

type recPair struct {
	Over       string  `json:"over"`
	Under      string  `json:"under"`
	Hypothesis string  `json:"hypothesis"`
	Value      float64 `json:"difference"`
	SE         float64 `json:"standard_error"`
	T          float64 `json:"t"`
	P          float64 `json:"p_raw"`
	LogP       float64 `json:"log_p_raw"`
	Joint      float64 `json:"p_adjusted"`
	LogJoint   float64 `json:"log_p_adjusted"`
	Lower      float64 `json:"lower_simultaneous"`
	Upper      float64 `json:"upper_simultaneous"`
}

type recMultiplicity struct {
	Family    string `json:"family"`
	Tests     int    `json:"number_of_tests"`
	P         string `json:"p_method"`
	Intervals string `json:"interval_method"`
}

type recCheck struct {
	Name      string  `json:"name"`
	Statistic string  `json:"statistic"`
	Value     float64 `json:"value"`
	P         float64 `json:"p"`
	Reference string  `json:"reference"`
	Line      int     `json:"line,omitempty"`
	Note      string  `json:"note,omitempty"`
}

type recWarning struct {
	Code string `json:"code"`
	Text string `json:"text"`
}

type recPlan struct {
	Difference    float64 `json:"difference_of_interest"`
	SD            float64 `json:"expected_sd"`
	Alpha         float64 `json:"alpha"`
	Noncentrality float64 `json:"noncentrality"`
	Power         float64 `json:"power_of_this_design"`
	Wanted        float64 `json:"wanted_power"`
	Detectable    float64 `json:"detectable_difference"`
	Each          int     `json:"rows_a_group_for_wanted_power"`
}

type recReproduction struct {
	Library       string  `json:"library_version"`
	Go            string  `json:"go_version"`
	Arch          string  `json:"goarch"`
	Seed          uint64  `json:"seed"`
	Draws         int     `json:"draws"`
	RankTolerance float64 `json:"rank_tolerance"`
	SmallestKept  float64 `json:"smallest_pivot_kept"`
	LargestAside  float64 `json:"largest_pivot_set_aside"`
	Fitting       string  `json:"fitting"`
}
