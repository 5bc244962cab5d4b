package anova

import (
	"encoding/csv"
	"io"
	"strings"

	"subsume.example/internal/canon"
)

// WriteMarkdown writes the report as a heading, a table in pipes and lists.
func (r Report) WriteMarkdown(w io.Writer) error {
	var b strings.Builder
	if r.Title != "" {
		b.WriteString("### " + markdown(r.Title) + "\n\n")
	}
	for _, f := range r.Facts {
		if s := f.Value.String(); f.Title != "" && s != "" {
			b.WriteString("- " + markdown(f.Title) + " " + markdown(s) + "\n")
		}
	}
	if len(r.Facts) > 0 {
		b.WriteByte('\n')
	}
	cols := r.visible()
	line := func(cell func(c int) string) {
		b.WriteByte('|')
		for _, c := range cols {
			b.WriteString(" " + cell(c) + " |")
		}
		b.WriteByte('\n')
	}
	line(func(c int) string { return markdown(r.Columns[c].Title) })
	line(func(c int) string {
		if r.Columns[c].Numeric {
			return "---:"
		}
		return "---"
	})
	text := make([][]string, len(r.Columns))
	for _, c := range cols {
		text[c] = r.cells(c)
	}
	for i := range r.Lines {
		line(func(c int) string { return markdown(text[c][i]) })
	}
	if len(r.Notes)+len(r.Warnings) > 0 {
		b.WriteByte('\n')
	}
	for _, n := range r.Notes {
		b.WriteString("- " + markdown(n) + "\n")
	}
	for _, x := range r.Warnings {
		b.WriteString("- **" + markdown(x.Code) + "**: " + markdown(x.Text) + "\n")
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// markdown keeps a text from being read as markup or breaking its cell.
func markdown(s string) string {
	s = strings.NewReplacer("\\", "\\\\", "|", "\\|", "*", "\\*", "_", "\\_", "`", "\\`", "[", "\\[", "]", "\\]",
		"<", "&lt;", ">", "&gt;", "&", "&amp;", "\r\n", " ", "\n", " ", "\r", " ").Replace(s)
	return s
}

// WriteCSV writes the lines as comma-separated values (RFC 4180, lines ending in
// LF), all columns with every digit, after a line of the columns' keys. A number
// that does not exist is an empty field, an infinite one "+Inf" or "-Inf". Facts, notes and
// warnings are not written.
func (r Report) WriteCSV(w io.Writer) error {
	c := csv.NewWriter(w)
	rec := make([]string, len(r.Columns))
	for i, col := range r.Columns {
		rec[i] = col.Key
	}
	if err := c.Write(rec); err != nil {
		return err
	}
	for _, l := range r.Lines {
		for i, v := range l {
			rec[i] = v.exact()
		}
		if err := c.Write(rec); err != nil {
			return err
		}
	}
	c.Flush()
	return c.Error()
}

// WriteJSON writes the report as one JSON object, the same bytes for the same
// report: "schema", "title", each fact by its key, "lines" (objects with the keys
// of the columns, in their order), "notes", and "warnings" (objects of "code" and
// "text"). Numbers keep every digit. A number that is not finite is null, and a
// field of its name with "_reason" added says why: "not-a-number", "plus-infinity",
// "minus-infinity", or a code of the report such as "not-tested".
func (r Report) WriteJSON(w io.Writer) error {
	b, err := canon.Indent(r.object())
	if err != nil {
		return err
	}
	_, err = w.Write(b)
	return err
}

func (r Report) object() canon.Object {
	o := canon.Object{{Name: "schema", Value: r.Schema}, {Name: "title", Value: r.Title}}
	for _, f := range r.Facts {
		o = append(o, f.Value.member(f.Key))
	}
	lines := make([]canon.Object, len(r.Lines))
	for i, l := range r.Lines {
		for c, v := range l {
			lines[i] = append(lines[i], v.member(r.Columns[c].Key))
		}
	}
	warnings := make([]canon.Object, len(r.Warnings))
	for i, x := range r.Warnings {
		warnings[i] = canon.Object{{Name: "code", Value: x.Code}, {Name: "text", Value: x.Text}}
	}
	notes := r.Notes
	if notes == nil {
		notes = []string{}
	}
	return append(o, canon.Member{Name: "lines", Value: lines}, canon.Member{Name: "notes", Value: notes}, canon.Member{Name: "warnings", Value: warnings})
}

func (v Value) member(key string) canon.Member {
	if v.Numeric {
		return canon.Member{Name: key, Value: v.Number, Reason: v.Reason}
	}
	return canon.Member{Name: key, Value: v.Text}
}
