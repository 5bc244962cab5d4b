package glm_test

import (
	"context"
	"fmt"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// BenchmarkCertificate: one row of a split plot, joined beforehand, decided by
// nesting, and one of an unbalanced mixed layout, decided in coordinates.
func BenchmarkCertificate(b *testing.B) {
	for _, blocks := range []int{6, 60, 600} {
		l := layout{design: crossing("r a b", blocks, 3, 4), s: "1 r", b: "1 r a", e0: "1 r a", e1: "r:a", fixed: "1 a b a:b", random: "r r:a"}
		run(b, fmt.Sprintf("nesting/blocks=%d", blocks), l)
	}
	for _, levels := range []int{5, 15, 25} {
		l := layout{design: uneven(crossing("a b rep", levels, levels, 2)), s: "1 b", b: "1 a b", e0: "1 a b", e1: "1 a b a:b", fixed: "1 a", random: "b a:b"}
		run(b, fmt.Sprintf("coordinates/cells=%d", levels*levels), l)
	}
}

func run(b *testing.B, name string, l layout) {
	b.Run(name, func(b *testing.B) {
		ctx := context.Background()
		cs, err := glm.Join(ctx, l.comparison(b))
		if err != nil {
			b.Fatal(err)
		}
		b.ReportAllocs()
		for b.Loop() {
			if _, err := cs[0].Run(ctx, (*lrt.Settings)(nil)); err != nil {
				b.Fatal(err)
			}
		}
	})
}
