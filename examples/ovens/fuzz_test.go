package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"testing"
)

// FuzzFile: whatever the file holds, the command answers or refuses it as bad input.
func FuzzFile(f *testing.F) {
	for _, s := range []string{
		"y,g\n1,a\n2,a\n3,b\n5,b\n", "y,g,x\n1,a,0\n2,a,1\n3,b,0\n5,b,1\n7,c,3\n", "y,g\n1e300,1\n2e300,1\n-1e300,2\n4e300,2\n",
		"y,g\n1,a\n1,a\n2,b\n2,b\n", "y,g\n,a\n2,\n", "y;g\n1,5;a\n", "y,g\n1,a\n2,b\n3,c\n", "y,g\n1,a\n1.0000000000000000001,a\n1,b\n1,b\n",
	} {
		f.Add([]byte(s), false)
		f.Add([]byte(s), true)
	}
	f.Fuzz(func(t *testing.T, text []byte, covariate bool) {
		dir := t.TempDir()
		path := filepath.Join(dir, "f.csv")
		if err := os.WriteFile(path, text, 0o600); err != nil {
			t.Fatal(err)
		}
		args := []string{"-file", path, "-response", "y", "-group", "g", "-draws", "99", "-difference", "1", "-sd", "1", "-record", filepath.Join(dir, "r.json")}
		if covariate {
			args = append(args, "-covariate", "x")
		}
		var out, errs bytes.Buffer
		code := run(context.Background(), args, &out, &errs)
		if code != 0 && code != 2 || code == 0 && (out.Len() == 0 || errs.Len() > 0) || code == 2 && errs.Len() == 0 {
			t.Fatalf("exit %d, out %q, errors %q", code, out.String(), errs.String())
		}
	})
}
