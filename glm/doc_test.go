package glm_test

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// TestWarningCodes: the table of codes in the package documentation is that of the source.
func TestWarningCodes(t *testing.T) {
	doc, err := os.ReadFile("doc.go")
	if err != nil {
		t.Fatal(err)
	}
	table := string(doc)
	table = table[strings.Index(table, "# Warnings"):]
	table = table[:strings.Index(table, "# For people")]
	listed := make(map[string]bool)
	for _, m := range regexp.MustCompile(`(?m)^//\t([a-z-]+)  +`).FindAllStringSubmatch(table, -1) {
		listed[m[1]] = m[1] != "code"
	}
	files, err := filepath.Glob("*.go")
	if err != nil {
		t.Fatal(err)
	}
	used := make(map[string]bool)
	for _, f := range files {
		if strings.HasSuffix(f, "_test.go") || f == "doc.go" {
			continue
		}
		b, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		for _, m := range regexp.MustCompile(`Code: +"([a-z-]+)"`).FindAllStringSubmatch(string(b), -1) {
			used[m[1]] = true
			if !listed[m[1]] {
				t.Errorf("%s: code %q is not in the table of the package documentation", f, m[1])
			}
		}
	}
	for code, ok := range listed {
		if ok && !used[code] {
			t.Errorf("code %q of the table is not used", code)
		}
	}
}
