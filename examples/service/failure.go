package main

import (
	"context"
	"errors"
	"net/http"
	"os"

	"subsume.example/glm"
	"subsume.example/lrt"
)

var (
	errQuery = errors.New("bad query")
	errBusy  = errors.New("too many requests are being worked on, try again later")
)

// failure is the body of every other status. Code is stable; the place is
// given where there is one.
type failure struct {
	Status   int    `json:"status"`
	Code     string `json:"code"`
	Message  string `json:"message"`
	Line     int    `json:"line,omitempty"`     // of the body, from 1
	Position int    `json:"position,omitempty"` // in that line, from 1
	Column   string `json:"column,omitempty"`   // of the table
}

// meanings says what each condition of the library means to a client, the more
// particular ones first:
//
//	400  the request cannot be understood: its query, or the text of the table
//	413  it is larger than allowed
//	422  it was understood, and the question has no answer for these data
//	503  there is no time or no room for it now
var meanings = []struct {
	err    error
	status int
	code   string
}{
	{errBusy, http.StatusServiceUnavailable, "busy"},
	{context.DeadlineExceeded, http.StatusServiceUnavailable, "out-of-time"},
	{os.ErrDeadlineExceeded, http.StatusServiceUnavailable, "out-of-time"},
	{context.Canceled, http.StatusServiceUnavailable, "cancelled"},
	{glm.ErrTooLarge, http.StatusRequestEntityTooLarge, "too-large"},
	{errQuery, http.StatusBadRequest, "query"},
	{glm.ErrUnknownColumn, http.StatusBadRequest, "unknown-column"},
	{glm.ErrDuplicateColumn, http.StatusBadRequest, "duplicate-column"},
	{glm.ErrName, http.StatusBadRequest, "column-name"},
	{glm.ErrNotNumeric, http.StatusBadRequest, "not-numeric"},
	{glm.ErrFieldCount, http.StatusBadRequest, "field-count"},
	{glm.ErrQuote, http.StatusBadRequest, "quote"},
	{glm.ErrEncoding, http.StatusBadRequest, "encoding"},
	{glm.ErrNotNumber, http.StatusBadRequest, "not-a-number"},
	{glm.ErrNotFinite, http.StatusBadRequest, "not-finite"},
	{glm.ErrEmpty, http.StatusBadRequest, "empty"},
	{glm.ErrNoCompleteRows, http.StatusUnprocessableEntity, "no-complete-rows"},
	{lrt.ErrNothingTested, http.StatusUnprocessableEntity, "nothing-to-test"},
	{lrt.ErrNoErrorDF, http.StatusUnprocessableEntity, "no-error-degrees-of-freedom"},
	{lrt.ErrNoVariation, http.StatusUnprocessableEntity, "no-variation"},
	{glm.ErrOverflow, http.StatusUnprocessableEntity, "overflow"},
}

// explain maps an error to what the client is told.
func explain(err error) failure {
	f := failure{Status: http.StatusInternalServerError, Code: "internal", Message: "the request could not be answered"}
	var large *http.MaxBytesError
	if errors.As(err, &large) {
		err = errors.Join(glm.ErrTooLarge, err)
	}
	for _, m := range meanings {
		if errors.Is(err, m.err) {
			f.Status, f.Code, f.Message = m.status, m.code, err.Error()
			break
		}
	}
	var text *glm.CSVError
	var column *glm.ColumnError
	switch {
	case errors.As(err, &text):
		f.Line, f.Position, f.Column = text.Line, text.Column, text.Field
	case errors.As(err, &column):
		f.Column = column.Column
	}
	return f
}

// writeFailure writes the failure of a request.
func writeFailure(w http.ResponseWriter, err error) {
	f := explain(err)
	if f.Status == http.StatusServiceUnavailable {
		w.Header().Set("Retry-After", "1")
	}
	writeJSON(w, f.Status, f)
}
