package builtins_test

import (
	"context"
	"os"
	"path/filepath"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/stdlib"
)

// TestRequirementsOfTheLanguageAreMet runs files of require lines; every one must be met.
func TestRequirementsOfTheLanguageAreMet(t *testing.T) {
	files, err := filepath.Glob("testdata/*.gain")
	if err != nil || len(files) == 0 {
		t.Fatal("no files of requirements", err)
	}
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		met := 0
		session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
		session.RunText(context.Background(), diag.NewSource(file, string(text)), func(e eval.Event) {
			switch {
			case e.Error != nil:
				t.Error(e.Error.Render())
			case e.Requirement != nil && !e.Requirement.Met:
				t.Errorf("%s:%d: missed: %s (%s)", file, e.Line, e.Text, e.Requirement.Why)
			case e.Requirement != nil:
				met++
			}
		})
		if met == 0 {
			t.Errorf("%s requires nothing", file)
		}
	}
}
