package anova

import (
	"html/template"
	"io"
)

// page is the form of a report in HTML: a section to be put into a page of the
// caller's. Everything a name or level may hold is escaped.
var page = template.Must(template.New("report").Parse(`<section class="subsume-report" data-schema="{{.Schema}}">
{{- with .Title}}
<h3>{{.}}</h3>{{end}}
{{- with .Facts}}
<dl>
{{- range .}}
<dt>{{.Title}}</dt><dd>{{.Value}}</dd>{{end}}
</dl>{{end}}
<table>
<thead><tr>{{range .Head}}<th scope="col"{{if .Numeric}} style="text-align:right"{{end}}>{{.Text}}</th>{{end}}</tr></thead>
<tbody>
{{- range .Lines}}
<tr>{{range .}}<td{{if .Numeric}} style="text-align:right"{{end}}>{{.Text}}</td>{{end}}</tr>{{end}}
</tbody>
</table>
{{- if or .Notes .Warnings}}
<ul>
{{- range .Notes}}
<li>{{.}}</li>{{end}}
{{- range .Warnings}}
<li><strong>{{.Code}}</strong>: {{.Text}}</li>{{end}}
</ul>{{end}}
</section>
`))

// WriteHTML writes the report as a section of HTML with a heading, a table and
// lists, rounded as in WriteText. All texts are escaped.
func (r Report) WriteHTML(w io.Writer) error {
	type cell struct {
		Text    string
		Numeric bool
	}
	type fact struct{ Title, Value string }
	doc := struct {
		Report
		Facts []fact
		Head  []cell
		Lines [][]cell
	}{Report: r}
	for _, f := range r.Facts {
		if s := f.Value.String(); f.Title != "" && s != "" {
			doc.Facts = append(doc.Facts, fact{f.Title, s})
		}
	}
	doc.Lines = make([][]cell, len(r.Lines))
	for _, c := range r.visible() {
		col := r.Columns[c]
		doc.Head = append(doc.Head, cell{col.Title, col.Numeric})
		for i, s := range r.cells(c) {
			doc.Lines[i] = append(doc.Lines[i], cell{s, col.Numeric})
		}
	}
	return page.Execute(w, doc)
}
