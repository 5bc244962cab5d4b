package main

import (
	"fmt"
	"io"
	"math"
	"strings"
	"unicode/utf8"
)

// page collects the text of the report.
type page struct{ b strings.Builder }

func (p *page) title(s string) {
	p.gap()
	fmt.Fprintf(&p.b, "%s\n%s\n", strings.ToUpper(s), strings.Repeat("─", utf8.RuneCountInString(s)))
}

// gap leaves one empty line.
func (p *page) gap() {
	if s := p.b.String(); s != "" && !strings.HasSuffix(s, "\n\n") {
		p.b.WriteByte('\n')
	}
}

func (p *page) line(format string, args ...any) {
	p.b.WriteString(strings.TrimRight(fmt.Sprintf(format, args...), " "))
	p.b.WriteByte('\n')
}

// text writes a paragraph, broken at 88 characters.
func (p *page) text(format string, args ...any) {
	const width = 88
	n := 0
	for _, w := range strings.Fields(fmt.Sprintf(format, args...)) {
		k := utf8.RuneCountInString(w)
		switch {
		case n == 0:
		case n+1+k > width:
			p.b.WriteByte('\n')
			n = 0
		default:
			p.b.WriteByte(' ')
			n++
		}
		p.b.WriteString(w)
		n += k
	}
	p.b.WriteByte('\n')
}

func (p *page) to(w io.Writer) error {
	_, err := io.WriteString(w, p.b.String())
	return err
}

// grid is a table under way: columns aligned left (l) or right (r).
type grid struct {
	p     *page
	align string
	rows  [][]string
}

func (p *page) table(align string) *grid { return &grid{p: p, align: align} }

func (g *grid) row(cells ...string) { g.rows = append(g.rows, cells) }

func (g *grid) end() {
	width := make([]int, len(g.align))
	for _, r := range g.rows {
		for i, c := range r {
			width[i] = max(width[i], utf8.RuneCountInString(c))
		}
	}
	for _, r := range g.rows {
		var b strings.Builder
		for i, c := range r {
			pad := strings.Repeat(" ", width[i]-utf8.RuneCountInString(c))
			if i > 0 {
				b.WriteString("   ")
			}
			if g.align[i] == 'l' {
				b.WriteString(c + pad)
			} else {
				b.WriteString(pad + c)
			}
		}
		g.p.line("  %s", b.String())
	}
	g.p.line("")
}

// fig writes a number with the given significant digits, never in a form that
// hides its size.
func fig(x float64, digits int) string {
	switch {
	case math.IsNaN(x):
		return "–"
	case math.IsInf(x, 1):
		return "∞"
	case math.IsInf(x, -1):
		return "−∞"
	case x == 0:
		return "0"
	}
	e := int(math.Floor(math.Log10(math.Abs(x))))
	if e < -4 || e > 7 {
		return sign(fmt.Sprintf("%.*e", digits-1, x))
	}
	return sign(fmt.Sprintf("%.*f", max(digits-1-e, 0), x))
}

// dec writes a number with the given number of decimals.
func dec(x float64, places int) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return fig(x, 3)
	}
	return sign(fmt.Sprintf("%.*f", places, x))
}

// sign writes a proper minus.
func sign(s string) string {
	if strings.HasPrefix(s, "-") {
		return "−" + s[1:]
	}
	return s
}

// prob writes a probability: never 0 for what is not 0.
func prob(p, logP float64) string {
	switch {
	case math.IsNaN(p):
		return "unknown"
	case p > 0:
		return fmt.Sprintf("%.4g", p)
	case math.IsInf(logP, -1):
		return "0"
	}
	return fmt.Sprintf("10^%.1f", logP/math.Ln10)
}

// percent writes a share.
func percent(x float64) string { return fmt.Sprintf("%.3g %%", 100*x) }

// and joins words: "a", "a and b", "a, b and c".
func and(words []string) string {
	switch n := len(words); n {
	case 0:
		return "none"
	case 1:
		return words[0]
	default:
		return strings.Join(words[:n-1], ", ") + " and " + words[n-1]
	}
}
