package main

import (
	"os/exec"
	"sort"
	"strings"
	"testing"
)

// imports gives the direct imports of every package of the module, tests left out.
func imports(t *testing.T) map[string][]string {
	t.Helper()
	out, err := exec.Command("go", "list", "-f", "{{.ImportPath}}: {{join .Imports \" \"}}", "gainwright/...").Output()
	if err != nil {
		t.Fatal(err)
	}
	all := map[string][]string{}
	for line := range strings.Lines(string(out)) {
		name, list, _ := strings.Cut(strings.TrimSpace(line), ": ")
		all[name] = strings.Fields(list)
	}
	return all
}

// mayImport lists, for each package of the language, which packages of the module it may import.
var mayImport = map[string][]string{
	"gainwright/lang/diag":   {},
	"gainwright/lang/exact":  {},
	"gainwright/lang/syntax": {"diag"},
	"gainwright/lang/value":  {"diag", "syntax", "exact"},
	"gainwright/lang/model":  {"diag", "syntax", "exact", "value"},
	"gainwright/lang/eval":   {"diag", "syntax", "exact", "value", "model"},
	"gainwright/lang/render": {"diag", "syntax", "exact", "value", "model", "eval"},
	"gainwright/lang/prompt": {"diag", "syntax", "value", "eval", "render"},
	"gainwright/lang/report": {"diag", "syntax", "value", "eval", "render", "figure"},
	"gainwright/lang/figure": {"diag", "value"},
}

func TestPackagesImportDownwardsOnly(t *testing.T) {
	for name, list := range imports(t) {
		for _, path := range list {
			if !strings.HasPrefix(path, "gainwright/") {
				continue
			}
			switch {
			case strings.HasPrefix(name, "gainwright/lang/"):
				allowed, known := mayImport[name]
				if !known {
					t.Errorf("%s is not in the list of packages", name)
				}
				fits := false
				for _, a := range allowed {
					fits = fits || path == "gainwright/lang/"+a || strings.HasPrefix(path, "gainwright/lang/"+a+"/")
				}
				if !fits {
					t.Errorf("%s must not import %s", name, path)
				}
			case name == "gainwright/builtins/numeric":
				t.Errorf("the numerical package imports %s; it knows nothing of the module", path)
			case strings.HasPrefix(name, "gainwright/builtins/"):
				base := strings.TrimPrefix(path, "gainwright/")
				if strings.HasPrefix(base, "lang/") && base != "lang/diag" && base != "lang/exact" && base != "lang/value" {
					t.Errorf("%s must not import %s", name, path)
				}
			}
		}
	}
}

// owners lists the libraries that belong to one place.
var owners = map[string][]string{
	"github.com/expr-lang/expr": {"gainwright/lang/eval"},
	"github.com/peterh/liner":   {"gainwright/lang/prompt"},
	"golang.org/x/image":        {"gainwright/lang/figure"},
	"gonum.org/v1/gonum":        {"gainwright/lang/value", "gainwright/builtins"},
}

func TestLibrariesStayInTheirPlace(t *testing.T) {
	all := imports(t)
	names := make([]string, 0, len(all))
	for name := range all {
		names = append(names, name)
	}
	sort.Strings(names)
	for _, name := range names {
		for _, path := range all[name] {
			for library, places := range owners {
				if path != library && !strings.HasPrefix(path, library+"/") {
					continue
				}
				at := false
				for _, place := range places {
					at = at || name == place || strings.HasPrefix(name, place+"/")
				}
				if !at {
					t.Errorf("%s imports %s, which belongs to %v", name, path, places)
				}
			}
		}
	}
}
