package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"net/url"
	"strings"
	"sync"
	"testing"
	"time"

	"subsume.example/glm"
	"subsume.example/lrt"
)

var roomy = Limits{Bytes: 1 << 20, Rows: 10_000, Time: 20 * time.Second, Parallel: 64}

// table is a small table of four plots with a clear difference.
func table(rows int) string {
	var b strings.Builder
	b.WriteString("yield,plot,rain\n")
	for i := range rows {
		fmt.Fprintf(&b, "%d.%02d,%d,%d\n", 10+i%4, (i*37)%100, i%4, (i*7)%13)
	}
	return b.String()
}

func post(t testing.TB, server *httptest.Server, query, body string) (status int, answer []byte) {
	t.Helper()
	r, err := server.Client().Post(server.URL+"/compare?"+query, "text/csv", strings.NewReader(body))
	if err != nil {
		t.Error(err)
		return 0, nil
	}
	defer r.Body.Close()
	answer, err = io.ReadAll(r.Body)
	if err != nil {
		t.Error(err)
	}
	return r.StatusCode, answer
}

func TestAnswer(t *testing.T) {
	server := httptest.NewServer(NewHandler(roomy))
	defer server.Close()
	status, body := post(t, server, "response=yield&group=plot&covariate=rain", table(40)+",2,3\n")
	var a struct {
		Rows    int      `json:"rows"`
		Dropped int      `json:"rows_left_out"`
		Groups  []string `json:"groups"`
		F, P    float64
		D1      float64 `json:"numerator_df"`
		D2      float64 `json:"denominator_df"`
		Kind    string
	}
	if err := json.Unmarshal(body, &a); status != 200 || err != nil {
		t.Fatalf("status %d, %v, %s", status, err, body)
	}
	if a.Rows != 40 || a.Dropped != 1 || len(a.Groups) != 4 || a.D1 != 3 || a.D2 != 35 || a.Kind != "exact" || !(a.P < 1e-10) {
		t.Errorf("answer %s", body)
	}
	// The same question asked of the library directly.
	data, err := glm.ReadCSV(context.Background(), strings.NewReader(table(40)), &glm.CSVOptions{Kinds: map[string]glm.Kind{"plot": glm.Labelled}})
	if err != nil {
		t.Fatal(err)
	}
	want, err := compareGroups(context.Background(), data, "yield", "plot", []string{"rain"})
	if err != nil {
		t.Fatal(err)
	}
	if a.F != float64(want.F) || a.P != float64(want.P) {
		t.Errorf("F = %v, p = %v over HTTP, %v, %v directly", a.F, a.P, want.F, want.P)
	}
}

func TestPerfectFit(t *testing.T) {
	server := httptest.NewServer(NewHandler(roomy))
	defer server.Close()
	status, body := post(t, server, "response=y&group=g", "y,g\n1,a\n1,a\n2,b\n2,b\n")
	if status != 200 || !bytes.Contains(body, []byte(`"f":null`)) || !bytes.Contains(body, []byte(`"nil-residual"`)) {
		t.Errorf("status %d, %s", status, body)
	}
}

// requests that fail, with what the client is told.
var failing = []struct {
	name, query, body string
	status            int
	code              string
	line              int
}{
	{"no query", "", "y,g\n1,a\n", 400, "query", 0},
	{"empty", "response=y&group=g", "", 400, "empty", 0},
	{"no rows", "response=y&group=g", "y,g\n", 400, "empty", 0},
	{"text", "response=y&group=g", "y,g\n1,a\nn/a,b\n", 400, "not-a-number", 3},
	{"NaN", "response=y&group=g", "y,g\nNaN,a\n1,b\n", 400, "not-finite", 2},
	{"ragged", "response=y&group=g", "y,g\n1,a\n2\n", 400, "field-count", 3},
	{"quote", "response=y&group=g", "y,g\n1,\"a\n", 400, "quote", 2},
	{"not UTF-8", "response=y&group=g", "y,g\n1,\xff\n", 400, "encoding", 2},
	{"names twice", "response=y&group=g", "y,g,y\n1,a,2\n", 400, "duplicate-column", 1},
	{"no name", "response=y&group=g", "y,g,\n1,a,2\n", 400, "column-name", 1},
	{"unknown", "response=y&group=depth", "y,g\n1,a\n", 400, "unknown-column", 0},
	{"group is the response", "response=y&group=y", "y,g\n1,a\n2,b\n", 400, "not-numeric", 0},
	{"too many rows", "response=y&group=g", "y,g\n" + strings.Repeat("1,a\n", 10_001), 413, "too-large", 0},
	{"too many bytes", "response=y&group=g", "y,g\n" + strings.Repeat(" ", 1<<20), 413, "too-large", 0},
	{"all missing", "response=y&group=g", "y,g\n,a\n,b\n", 422, "no-complete-rows", 0},
	{"one group", "response=y&group=g", "y,g\n1,a\n2,a\n3,a\n", 422, "nothing-to-test", 0},
	{"one row a group", "response=y&group=g", "y,g\n1,a\n2,b\n3,c\n", 422, "no-error-degrees-of-freedom", 0},
	{"constant", "response=y&group=g", "y,g\n4,a\n4,a\n4,b\n4,b\n", 422, "no-variation", 0},
	{"confounded", "response=y&group=g&covariate=x", "y,g,x\n1,a,0\n2,a,0\n3,b,1\n5,b,1\n", 422, "nothing-to-test", 0},
}

func TestFailures(t *testing.T) {
	server := httptest.NewServer(NewHandler(roomy))
	defer server.Close()
	for _, c := range failing {
		t.Run(c.name, func(t *testing.T) {
			status, body := post(t, server, c.query, c.body)
			var f failure
			if err := json.Unmarshal(body, &f); err != nil {
				t.Fatalf("%v: %s", err, body)
			}
			if status != c.status || f.Status != c.status || f.Code != c.code || f.Line != c.line || f.Message == "" {
				t.Errorf("status %d, %+v, want %d, %s, line %d", status, f, c.status, c.code, c.line)
			}
		})
	}
	r, err := server.Client().Get(server.URL + "/compare")
	if err != nil {
		t.Fatal(err)
	}
	r.Body.Close()
	if r.StatusCode != http.StatusMethodNotAllowed {
		t.Errorf("GET: status %d", r.StatusCode)
	}
}

// TestInternal: an error that no meaning is known for does not leak its text.
func TestInternal(t *testing.T) {
	if f := explain(errors.New("disk of host 17")); f.Status != 500 || strings.Contains(f.Message, "17") {
		t.Errorf("%+v", f)
	}
	if f := explain(&lrt.ComparisonError{Err: lrt.ErrNoErrorDF}); f.Status != 422 {
		t.Errorf("%+v", f)
	}
}

// TestDeadline: an answer that does not fit into the time is 503, whether the
// time runs out while computing or while the body is still on its way.
func TestDeadline(t *testing.T) {
	limits := roomy
	limits.Time = time.Nanosecond
	server := httptest.NewServer(NewHandler(limits))
	defer server.Close()
	status, body := post(t, server, "response=yield&group=plot", table(40))
	if status != 503 || !bytes.Contains(body, []byte(`"out-of-time"`)) {
		t.Errorf("computing: status %d, %s", status, body)
	}
	limits.Time = 50 * time.Millisecond
	slow := httptest.NewServer(NewHandler(limits))
	defer slow.Close()
	reader, writer := io.Pipe()
	defer writer.Close()
	go func() { _, _ = io.WriteString(writer, "yield,plot\n1,2\n") }() // and then nothing
	r, err := slow.Client().Post(slow.URL+"/compare?response=yield&group=plot", "text/csv", reader)
	if err != nil {
		t.Fatal(err)
	}
	r.Body.Close()
	if r.StatusCode != 503 || r.Header.Get("Retry-After") == "" {
		t.Errorf("reading: status %d", r.StatusCode)
	}
}

// TestBusy: more requests than slots are turned away, and slots come free again.
func TestBusy(t *testing.T) {
	limits := roomy
	limits.Parallel = 1
	h := &handler{limits, make(chan struct{}, 1)}
	server := httptest.NewServer(http.HandlerFunc(h.compare))
	defer server.Close()
	h.slots <- struct{}{}
	if status, body := post(t, server, "response=yield&group=plot", table(40)); status != 503 || !bytes.Contains(body, []byte(`"busy"`)) {
		t.Errorf("status %d, %s", status, body)
	}
	<-h.slots
	if status, body := post(t, server, "response=yield&group=plot", table(40)); status != 200 {
		t.Errorf("afterwards: status %d, %s", status, body)
	}
}

// TestClientGone: a client that gives up ends the work.
func TestClientGone(t *testing.T) {
	h := &handler{roomy, make(chan struct{}, 1)}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	q := url.Values{"response": {"yield"}, "group": {"plot"}}
	r := httptest.NewRequestWithContext(ctx, "POST", "/compare?"+q.Encode(), strings.NewReader(table(40)))
	w := httptest.NewRecorder()
	h.compare(w, r)
	if w.Code != 503 || !strings.Contains(w.Body.String(), `"cancelled"`) {
		t.Errorf("status %d, %s", w.Code, w.Body)
	}
}

// TestLoad sends good and bad requests from many clients at once: every answer is
// the one that the request gets alone. Run with -race.
func TestLoad(t *testing.T) {
	server := httptest.NewServer(NewHandler(roomy))
	defer server.Close()
	type request struct{ query, body string }
	requests := []request{
		{"response=yield&group=plot", table(400)},
		{"response=yield&group=plot&covariate=rain", table(41)},
		{"response=rain&group=plot", table(1000)},
	}
	for _, f := range failing {
		requests = append(requests, request{f.query, f.body})
	}
	type reply struct {
		status int
		body   string
	}
	alone := make([]reply, len(requests))
	for i, r := range requests {
		status, body := post(t, server, r.query, r.body)
		alone[i] = reply{status, string(body)}
	}
	var group sync.WaitGroup
	for client := range 8 {
		group.Go(func() {
			for turn := range 3 * len(requests) {
				i := (turn*7 + client*5) % len(requests)
				status, body := post(t, server, requests[i].query, requests[i].body)
				if got := (reply{status, string(body)}); got != alone[i] {
					t.Errorf("request %d under load: %+v, alone %+v", i, got, alone[i])
				}
			}
		})
	}
	group.Wait()
}

// TestServe: the server answers on a loopback port and stops when asked to.
func TestServe(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan error, 1)
	go func() { done <- serve(ctx, "127.0.0.1:0", roomy) }()
	time.Sleep(10 * time.Millisecond)
	cancel()
	select {
	case err := <-done:
		if err != nil {
			t.Error(err)
		}
	case <-time.After(10 * time.Second):
		t.Error("the server does not stop")
	}
}
