package subsume_test

import (
	"flag"
	"os"
	"regexp"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the examples of README.md")

// TestReadmeExamples: the blocks of README.md are the bodies of the examples that
// the tests run, and what they print.
func TestReadmeExamples(t *testing.T) {
	code, err := os.ReadFile("example_test.go")
	if err != nil {
		t.Fatal(err)
	}
	old, err := os.ReadFile("README.md")
	if err != nil {
		t.Fatal(err)
	}
	mark := regexp.MustCompile(`(?s)<!-- example: (\w+) -->\n(?:` + "\n```go\n.*?\n```\n\n```\n.*?\n```\n" + `)?`)
	text := mark.ReplaceAllStringFunc(string(old), func(block string) string {
		name := mark.FindStringSubmatch(block)[1]
		body, output := example(string(code), name)
		if body == "" {
			t.Errorf("no example %q", name)
		}
		return "<!-- example: " + name + " -->\n\n```go\n" + body + "```\n\n```\n" + output + "```\n"
	})
	if text == string(old) {
		return
	}
	if !*update {
		t.Fatal("README.md does not show the examples as they are: run go test . -update")
	}
	if err := os.WriteFile("README.md", []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// example returns the body of func Example_NAME without indentation, and its output.
func example(code, name string) (body, output string) {
	_, code, ok := strings.Cut(code, "func Example_"+name+"() {\n")
	if !ok {
		return "", ""
	}
	code, _, _ = strings.Cut(code, "\n}\n")
	code, out, _ := strings.Cut(code+"\n", "\t// Output:\n")
	for line := range strings.Lines(code) {
		body += strings.TrimPrefix(line, "\t")
	}
	for line := range strings.Lines(out) {
		output += strings.TrimPrefix(strings.TrimPrefix(line, "\t//"), " ")
	}
	return body, output
}
