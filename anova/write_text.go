package anova

import (
	"io"
	"strings"
	"unicode/utf8"
)

// textWidth is where notes are broken.
const textWidth = 96

// WriteText writes the report as aligned text: numbers aligned at their decimal
// points, notes broken at 96 characters.
func (r Report) WriteText(w io.Writer) error {
	_, err := io.WriteString(w, r.Text())
	return err
}

// Text returns the report as aligned text.
func (r Report) Text() string {
	var b strings.Builder
	if r.Title != "" {
		b.WriteString(oneLine(r.Title) + "\n")
	}
	var facts []string
	for _, f := range r.Facts {
		if s := f.Value.String(); f.Title != "" && s != "" {
			facts = append(facts, f.Title+" "+s)
		}
	}
	if len(facts) > 0 {
		wrap(&b, "", strings.Join(facts, " · "))
	}
	if b.Len() > 0 {
		b.WriteByte('\n')
	}
	r.grid(&b)
	if len(r.Notes)+len(r.Warnings) > 0 {
		b.WriteByte('\n')
	}
	for _, n := range r.Notes {
		wrap(&b, "- ", n)
	}
	for _, x := range r.Warnings {
		wrap(&b, "! ", x.Code+": "+x.Text)
	}
	return b.String()
}

// grid writes the lines in columns.
func (r Report) grid(b *strings.Builder) {
	cols := r.visible()
	cells := make([][]string, len(r.Lines)+1)
	for _, c := range cols {
		text := r.cells(c)
		num := r.Columns[c].Numeric
		if num {
			alignPoints(text)
		}
		title := oneLine(r.Columns[c].Title)
		width := utf8.RuneCountInString(title)
		for _, s := range text {
			width = max(width, utf8.RuneCountInString(s))
		}
		for i, s := range append([]string{title}, text...) {
			space := strings.Repeat(" ", width-utf8.RuneCountInString(s))
			if num {
				s = space + s
			} else {
				s += space
			}
			cells[i] = append(cells[i], s)
		}
	}
	for i, line := range cells {
		s := strings.TrimRight(strings.Join(line, "   "), " ")
		b.WriteString(s + "\n")
		if i == 0 {
			b.WriteString(strings.Repeat("─", widest(cells)) + "\n")
		}
	}
}

func widest(cells [][]string) int {
	w := 0
	for _, line := range cells {
		w = max(w, utf8.RuneCountInString(strings.Join(line, "   ")))
	}
	return w
}

// alignPoints pads numbers on the right so that their decimal points stand
// under each other; texts among them are left alone.
func alignPoints(text []string) {
	after := func(s string) int {
		i := strings.IndexByte(s, '.')
		if i < 0 {
			if j := strings.IndexByte(s, 'e'); j >= 0 {
				return utf8.RuneCountInString(s[j:])
			}
			return 0
		}
		return utf8.RuneCountInString(s[i:])
	}
	most := 0
	for _, s := range text {
		if isNumber(s) {
			most = max(most, after(s))
		}
	}
	for i, s := range text {
		if isNumber(s) {
			text[i] = s + strings.Repeat(" ", most-after(s))
		}
	}
}

func isNumber(s string) bool {
	s = strings.TrimPrefix(s, "−")
	return s != "" && s[0] >= '0' && s[0] <= '9' && !strings.ContainsAny(s, " (^")
}

// wrap writes a text broken into lines, each after the first indented by as much
// as the lead is long.
func wrap(b *strings.Builder, lead, text string) {
	indent := strings.Repeat(" ", utf8.RuneCountInString(lead))
	line := lead
	n := utf8.RuneCountInString(lead)
	start := true
	for _, word := range strings.Fields(text) {
		k := utf8.RuneCountInString(word)
		if !start && n+1+k > textWidth {
			b.WriteString(line + "\n")
			line, n, start = indent, len(indent), true
		}
		if !start {
			line += " "
			n++
		}
		line, n, start = line+word, n+k, false
	}
	b.WriteString(line + "\n")
}
