package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// The reference page is what the program itself says.
func TestReferencePageIsCurrent(t *testing.T) {
	path := filepath.Join("..", "..", "testdata", "reference.md")
	var page, complaints strings.Builder
	if status := Run([]string{"explain", "--all", "--markdown"}, strings.NewReader(""), &page, &complaints); status != 0 {
		t.Fatalf("exit status %d: %s", status, complaints.String())
	}
	if *update {
		if err := os.WriteFile(path, []byte(page.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	kept, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(kept), page.String()); d != "" {
		t.Errorf("testdata/reference.md is out of date; go test ./cmd/gainwright -update rewrites it\n%s", d)
	}
}

func TestEveryWordIsExplained(t *testing.T) {
	w := newWords()
	for _, b := range w.table {
		var text, complaints strings.Builder
		if status := Run([]string{"explain", b.Name}, strings.NewReader(""), &text, &complaints); status != 0 {
			t.Errorf("%s: exit status %d: %s", b.Name, status, complaints.String())
		}
		if !strings.Contains(text.String(), b.Name) || !strings.Contains(strings.Join(strings.Fields(text.String()), " "), strings.Join(strings.Fields(b.Summary), " ")) {
			t.Errorf("%s is explained without its name or summary:\n%s", b.Name, text.String())
		}
	}
}
