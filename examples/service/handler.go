package main

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"net/http"
	"time"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Limits bound what one request may cost.
type Limits struct {
	Bytes    int64         // of the body
	Rows     int64         // of the table
	Time     time.Duration // for one answer, reading included
	Parallel int           // answers worked on at once; the others are turned away
}

// handler compares groups in posted CSV tables.
type handler struct {
	limits Limits
	slots  chan struct{}
}

// NewHandler returns the handler of POST /compare. The query names the columns: response,
// group, and any number of covariate. The body is the table as CSV. The answer is
// JSON, also where the request fails: see answer and failure.
func NewHandler(limits Limits) http.Handler {
	h := &handler{limits, make(chan struct{}, limits.Parallel)}
	mux := http.NewServeMux()
	mux.HandleFunc("POST /compare", h.compare)
	return mux
}

// answer is the body of status 200. A number that is not finite is null; the
// warnings say why (nil-residual: the fit is perfect).
type answer struct {
	Question      string    `json:"question"`
	Rows          int       `json:"rows"`
	Dropped       int       `json:"rows_left_out"`
	Groups        []string  `json:"groups"`
	LogLambda     number    `json:"log_lambda"`
	ChiSquared    number    `json:"minus_two_log_lambda"`
	ChiSquaredP   number    `json:"chi_squared_p"`
	F             number    `json:"f"`
	NumeratorDF   number    `json:"numerator_df"`
	DenominatorDF number    `json:"denominator_df"`
	P             number    `json:"p"`
	LogP          number    `json:"log_p"`
	Kind          string    `json:"kind"`
	Why           string    `json:"why"`
	Warnings      []warning `json:"warnings"`
}

type warning struct {
	Code string `json:"code"`
	Text string `json:"text"`
}

// number is a float64 that JSON may have no word for.
type number float64

// MarshalJSON writes null for NaN and the infinities.
func (x number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(x)) || math.IsInf(float64(x), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(x))
}

// compare serves one request.
func (h *handler) compare(w http.ResponseWriter, r *http.Request) {
	ctx, cancel := context.WithTimeout(r.Context(), h.limits.Time)
	defer cancel()
	select {
	case h.slots <- struct{}{}:
		defer func() { <-h.slots }()
	default:
		writeFailure(w, errBusy)
		return
	}
	// The deadline holds for reading the body as well.
	if deadline, ok := ctx.Deadline(); ok {
		_ = http.NewResponseController(w).SetReadDeadline(deadline) // not every writer has one
	}
	a, err := h.work(ctx, w, r)
	if err != nil {
		if ctx.Err() != nil {
			err = fmt.Errorf("%w: %w", ctx.Err(), err)
		}
		writeFailure(w, err)
		return
	}
	writeJSON(w, http.StatusOK, a)
}

// work reads the table and compares.
func (h *handler) work(ctx context.Context, w http.ResponseWriter, r *http.Request) (*answer, error) {
	q := r.URL.Query()
	response, group, covariates := q.Get("response"), q.Get("group"), q["covariate"]
	if response == "" || group == "" {
		return nil, fmt.Errorf("%w: the query needs response and group, the names of two columns", errQuery)
	}
	used := append([]string{response, group}, covariates...)
	kinds := map[string]glm.Kind{response: glm.Numeric}
	for _, c := range covariates {
		kinds[c] = glm.Numeric
	}
	data, err := glm.ReadCSV(ctx, http.MaxBytesReader(w, r.Body, h.limits.Bytes), &glm.CSVOptions{
		Only: used, Kinds: kinds, MaxRows: h.limits.Rows, Workers: 1,
	})
	if err != nil {
		return nil, err
	}
	complete, err := data.Complete(used...)
	if err != nil {
		return nil, err
	}
	if complete, err = complete.Categorical(group); err != nil {
		return nil, err
	}
	return compareGroups(ctx, complete, response, group, covariates)
}

// compareGroups asks the question of the complete rows.
func compareGroups(ctx context.Context, data *glm.Data, response, group string, covariates []string) (*answer, error) {
	terms := []glm.Term{glm.Constant{}}
	for _, c := range covariates {
		terms = append(terms, glm.Covariate{Field: c})
	}
	options := &glm.Options{Workers: 1} // requests run in parallel already
	small, err := glm.Normal(ctx, data, response, terms, options)
	if err != nil {
		return nil, err
	}
	full, err := small.With(ctx, glm.Factor{Field: group})
	if err != nil {
		return nil, err
	}
	c := lrt.Comparison{Restricted: small, Full: full}
	r, err := c.Run(ctx, &lrt.Settings{Workers: 1})
	if err != nil {
		return nil, err
	}
	levels, _ := data.Field(group)
	d1, d2 := r.Pair.Linear.DF()
	a := &answer{
		Question: c.Hypothesis(), Rows: data.Len(), Dropped: data.Account().Left(), Groups: levels.Levels,
		LogLambda: number(r.LogLambda), ChiSquared: number(r.Statistic), ChiSquaredP: number(r.ChiSquared.P),
		F: number(r.Exact.Statistic), NumeratorDF: number(d1), DenominatorDF: number(d2),
		P: number(r.P()), LogP: number(r.LogP()), Kind: r.Recommended.String(), Why: r.Why, Warnings: []warning{},
	}
	for _, v := range r.Warnings {
		a.Warnings = append(a.Warnings, warning{v.Code, v.Text})
	}
	return a, nil
}

// writeJSON writes a body with its status.
func writeJSON(w http.ResponseWriter, status int, body any) {
	w.Header().Set("Content-Type", "application/json; charset=utf-8")
	w.Header().Set("X-Content-Type-Options", "nosniff")
	w.WriteHeader(status)
	_ = json.NewEncoder(w).Encode(body) // a client that has gone does not read it
}
