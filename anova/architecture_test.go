package anova_test

import (
	"context"
	"go/parser"
	"go/token"
	"iter"
	"math"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"sync/atomic"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// lawFiles are the files that may use laws: none of them makes the p-value of a comparison.
var lawFiles = []string{
	"effect.go", // limits of a noncentrality
}

// TestImports: tables are made from comparisons, never from linear algebra or
// tail probabilities of their own.
func TestImports(t *testing.T) {
	files, err := filepath.Glob("*.go")
	if err != nil || len(files) == 0 {
		t.Fatal(err, len(files))
	}
	for _, name := range files {
		if strings.HasSuffix(name, "_test.go") {
			continue
		}
		f, err := parser.ParseFile(token.NewFileSet(), name, nil, parser.ImportsOnly)
		if err != nil {
			t.Fatal(err)
		}
		for _, imp := range f.Imports {
			path, _ := strconv.Unquote(imp.Path.Value)
			switch {
			case path == "subsume.example/dist" && slices.Contains(lawFiles, name):
			case path == "subsume.example/glm", path == "subsume.example/lrt", path == "subsume.example/internal/canon":
			case path == "subsume.example": // its version
			case !strings.Contains(strings.Split(path, "/")[0], "."): // standard library
			default:
				t.Errorf("%s imports %s", name, path)
			}
		}
	}
}

// TestRowIsClosed: outside this package a row cannot be put together by hand.
func TestRowIsClosed(t *testing.T) {
	for _, typ := range []reflect.Type{reflect.TypeFor[anova.Row](), reflect.TypeFor[anova.Table]()} {
		for i := range typ.NumField() {
			if f := typ.Field(i); f.IsExported() {
				t.Errorf("%s has the exported field %s", typ, f.Name)
			}
		}
	}
}

// counted counts the passes over a source.
type counted struct {
	glm.Source
	passes atomic.Int64
}

func (c *counted) Windows(ctx context.Context) iter.Seq2[glm.Window, error] {
	c.passes.Add(1)
	return c.Source.Windows(ctx)
}

// countedReference counts conclusions: lrt asks it once for each comparison it concludes.
type countedReference struct{ calls *atomic.Int64 }

func (r countedReference) Refer(context.Context, lrt.Comparison, lrt.Pair, *lrt.Settings) (lrt.Test, error) {
	r.calls.Add(1)
	return lrt.Test{}, nil
}

// TestOneFactorization: a table costs one pass over the rows, and one comparison a row (the
// whole model, for the totals, is asked for no references).
func TestOneFactorization(t *testing.T) {
	ctx := context.Background()
	_, d := load(t, "factorial-bottling")
	for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
		src := &counted{Source: d}
		cs, err := anova.Crossed(ctx, src, "y", []string{"A", "B", "C"}, &anova.Options{Decomposition: dec})
		if err != nil {
			t.Fatal(err)
		}
		src.passes.Store(0)
		var calls atomic.Int64
		tab, err := anova.Tabulate(ctx, cs, &lrt.Settings{References: []lrt.Reference{countedReference{&calls}}})
		if err != nil {
			t.Fatal(err)
		}
		if n := src.passes.Load(); n != 1 {
			t.Errorf("%v: %d passes, want 1", dec, n)
		}
		if n := calls.Load(); n != int64(len(cs)) {
			t.Errorf("%v: %d comparisons for %d rows, want one each", dec, n, len(cs))
		}
		for _, r := range tab.Rows() {
			before := src.passes.Load()
			again, err := r.Comparison().Run(ctx, nil)
			if err != nil {
				t.Fatal(err)
			}
			if src.passes.Load() != before {
				t.Errorf("%s: running the row again factors again", r.Name())
			}
			was, _ := r.Result()
			if again.LogLambda != was.LogLambda || again.P() != was.P() || again.LogP() != was.LogP() {
				t.Errorf("%s: run again: log λ %v, p %v; in the table %v, %v", r.Name(), again.LogLambda, again.P(), was.LogLambda, was.P())
			}
		}
		// The comparisons as the layout gave them, each on a factorization of its own.
		for i, c := range cs {
			alone, err := c.Run(ctx, nil)
			if err != nil {
				t.Fatal(err)
			}
			was, _ := tab.Rows()[i].Result()
			if d := alone.LogLambda/was.LogLambda - 1; math.Abs(d) > 1e-13 {
				t.Errorf("%s: log λ alone %.17g, in the table %.17g", c.Name, alone.LogLambda, was.LogLambda)
			}
		}
	}
}
