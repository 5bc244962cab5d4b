package main

// record is what somebody needs who has to defend the answer, or to work it
// again: no clock, no path, no rounding. The fields are a promise; new ones may
// be added.
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
	NotFinite    []absence       `json:"not_finite"`
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
	Statistic  string `json:"statistic"`
	Reference  string `json:"reference"`
	Kind       string `json:"kind"`
	Why        string `json:"why"`
	Certified  bool   `json:"certified_exact"`
	Side       string `json:"side"`
	Level      figure `json:"confidence_level"`
	Dispersion string `json:"dispersion"`
	Weights    string `json:"weights"`
	Offset     string `json:"offset"`
	Link       string `json:"link"`
	Coding     string `json:"contrast_coding"`
}

type recNumbers struct {
	Restricted     recFit `json:"restricted"`
	Full           recFit `json:"full"`
	NumeratorDF    figure `json:"numerator_df"`
	DenominatorDF  figure `json:"denominator_df"`
	NumeratorSS    figure `json:"numerator_sum_of_squares"`
	NumeratorMS    figure `json:"numerator_mean_square"`
	DenominatorMS  figure `json:"denominator_mean_square"`
	F              figure `json:"f"`
	P              figure `json:"p"`
	LogP           figure `json:"log_p"`
	Critical       figure `json:"critical_value"`
	Noncentrality  figure `json:"noncentrality_estimate"`
	LogLambda      figure `json:"log_lambda"`
	Lambda         figure `json:"lambda"`
	LambdaOf       string `json:"lambda_of"`
	ChiSquared     figure `json:"minus_two_log_lambda"`
	ChiSquaredDF   figure `json:"chi_squared_df"`
	ChiSquaredP    figure `json:"chi_squared_p"`
	ChiSquaredLogP figure `json:"chi_squared_log_p"`
	ChiSquaredTrue figure `json:"chi_squared_true_size"`
}

type recFit struct {
	N             int    `json:"n"`
	Rank          int    `json:"rank"`
	ErrorDF       int    `json:"error_df"`
	RSS           figure `json:"residual_sum_of_squares"`
	SD            figure `json:"residual_sd"`
	LogLikelihood figure `json:"log_likelihood"`
}

type recRow struct {
	Name string `json:"name"`
	SS   figure `json:"sum_of_squares"`
	DF   figure `json:"df"`
	MS   figure `json:"mean_square"`
	F    figure `json:"f"`
	P    figure `json:"p"`
	LogP figure `json:"log_p"`
	Kind string `json:"kind"`
}

type recEstimates struct {
	At    []recValue `json:"covariates_held_at"`
	Means []recMean  `json:"means"`
	Pairs []recPair  `json:"differences"`
}

type recValue struct {
	Name  string `json:"name"`
	Value figure `json:"value"`
}

type recMean struct {
	Group string `json:"group"`
	Value figure `json:"value"`
	SE    figure `json:"standard_error"`
	Lower figure `json:"lower"`
	Upper figure `json:"upper"`
}

type recPair struct {
	Over  string `json:"over"`
	Under string `json:"under"`
	Value figure `json:"difference"`
	SE    figure `json:"standard_error"`
	T     figure `json:"t"`
	P     figure `json:"p_raw"`
	Joint figure `json:"p_adjusted"`
	Lower figure `json:"lower_simultaneous"`
	Upper figure `json:"upper_simultaneous"`
}

type recMultiplicity struct {
	Family    string `json:"family"`
	Tests     int    `json:"number_of_tests"`
	P         string `json:"p_method"`
	Intervals string `json:"interval_method"`
}

type recCheck struct {
	Name      string `json:"name"`
	Statistic string `json:"statistic"`
	Value     figure `json:"value"`
	P         figure `json:"p"`
	Reference string `json:"reference"`
	Line      int    `json:"line,omitempty"`
	Note      string `json:"note,omitempty"`
}

type recWarning struct {
	Code string `json:"code"`
	Text string `json:"text"`
}

type recPlan struct {
	Difference    figure `json:"difference_of_interest"`
	SD            figure `json:"expected_sd"`
	Alpha         figure `json:"alpha"`
	Noncentrality figure `json:"noncentrality"`
	Power         figure `json:"power_of_this_design"`
	Wanted        figure `json:"wanted_power"`
	Detectable    figure `json:"detectable_difference"`
	Each          int    `json:"rows_a_group_for_wanted_power"`
}

type recReproduction struct {
	Library       string `json:"library_version"`
	Go            string `json:"go_version"`
	Arch          string `json:"goarch"`
	Seed          uint64 `json:"seed"`
	Draws         int    `json:"draws"`
	RankTolerance figure `json:"rank_tolerance"`
	SmallestKept  figure `json:"smallest_pivot_kept"`
	LargestAside  figure `json:"largest_pivot_set_aside"`
	Fitting       string `json:"fitting"`
}
