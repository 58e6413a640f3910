package files

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// call reads a file with the named built-in from a folder that holds it.
func call(t *testing.T, builtin, name, content string) (value.Value, error) {
	t.Helper()
	dir := t.TempDir()
	if content != "" {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	root, err := os.OpenRoot(dir)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { root.Close() })
	c := &value.Call{Args: map[string]value.Value{"file": value.Text(name)}, Root: root, Charge: func(int64) error { return nil }}
	for _, b := range Builtins() {
		if b.Name == builtin {
			return b.Func(c)
		}
	}
	t.Fatal("no built-in", builtin)
	return nil, nil
}

func TestMatricesAreReadExactly(t *testing.T) {
	for name, x := range map[string]struct{ file, content, want string }{
		"comma":            {"a.csv", "1,2\n3,4.5\n", "1 2 3 9/2"},
		"semicolon":        {"a.csv", "1;2\n3;1e-3\n", "1 2 3 1/1000"},
		"names and tabs":   {"a.csv", "x\ty\n1\t2\n", "1 2"},
		"comment and mark": {"a.csv", "\xef\xbb\xbf# note\n1, 2\n", "1 2"},
		"json":             {"a.json", `[[1, "24/7"], [0.1, -2e2]]`, "1 24/7 1/10 -200"},
		"json object":      {"a.json", `{"matrix": [[1], [2]]}`, "1 2"},
		"json column":      {"a.json", `[1, 2]`, "1 2"},
		"dense":            {"a.mtx", "%%MatrixMarket matrix array real general\n%\n2 2\n1\n2\n3\n4\n", "1 3 2 4"},
		"dense symmetric":  {"a.mtx", "%%MatrixMarket matrix array integer symmetric\n2 2\n1\n2\n3\n", "1 2 2 3"},
		"dense skew":       {"a.mtx", "%%MatrixMarket matrix array real skew-symmetric\n3 3\n1\n2\n3\n", "0 -1 -2 1 0 -3 2 3 0"},
		"coordinate":       {"a.mtx", "%%MatrixMarket matrix coordinate real general\n2 3 2\n1 3 2.5\n2 1 -1\n", "0 0 5/2 -1 0 0"},
		"pattern":          {"a.mtx", "%%MatrixMarket matrix coordinate pattern symmetric\n2 2 2\n1 1\n2 1\n", "1 1 1 0"},
	} {
		v, err := call(t, "matrix_from", x.file, x.content)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		m := v.(*value.Matrix)
		var got []string
		r, c := m.Dims()
		for i := range r {
			for j := range c {
				got = append(got, m.At(i, j).(value.Number).Exact.RatString())
			}
		}
		if strings.Join(got, " ") != x.want {
			t.Errorf("%s: %v, want %s", name, got, x.want)
		}
	}
}

func TestComplexMarketMatrix(t *testing.T) {
	v, err := call(t, "matrix_from", "a.mtx", "%%MatrixMarket matrix coordinate complex hermitian\n2 2 2\n1 1 1 0\n2 1 2 3\n")
	if err != nil {
		t.Fatal(err)
	}
	if got := v.(*value.Matrix).At(0, 1).(value.Complex).Complex128(); got != 2-3i {
		t.Errorf("entry [1, 2] = %v, want 2 − 3i", got)
	}
}

func TestFaultsAreNamedWithTheirLine(t *testing.T) {
	for name, x := range map[string]struct{ builtin, file, content, want string }{
		"unequal rows":    {"matrix_from", "a.csv", "1,2\n3\n", "a.csv:2: this row has 1 entries"},
		"no number":       {"matrix_from", "a.csv", "1,2\n3,x\n", "a.csv:2: entry 2 is \"x\""},
		"hexadecimal":     {"matrix_from", "a.csv", "1\n0x10\n", "a.csv:2: entry 1"},
		"huge exponent":   {"matrix_from", "a.csv", "1\n1e999999999\n", "a.csv:2: entry 1"},
		"empty":           {"matrix_from", "a.csv", "\n", "no rows"},
		"broken json":     {"matrix_from", "a.json", "[[1,\n2]", "a.json:2"},
		"json trailing":   {"matrix_from", "a.json", "[1] 2", "something follows"},
		"json rows":       {"matrix_from", "a.json", "[[1], [2, 3]]", "row 2 has 2 entries"},
		"banner":          {"matrix_from", "a.mtx", "1 2\n", "a.mtx:1"},
		"outside":         {"matrix_from", "a.mtx", "%%MatrixMarket matrix coordinate real general\n2 2 1\n3 1 1\n", "a.mtx:3: [3, 1] lies outside"},
		"too few":         {"matrix_from", "a.mtx", "%%MatrixMarket matrix array real general\n2 2\n1\n", "4 entries were announced, 1"},
		"too large":       {"matrix_from", "a.mtx", "%%MatrixMarket matrix array real general\n100000 100000\n1\n", "entries"},
		"binary":          {"matrix_from", "a.csv", "1,\x00", "not a text file"},
		"not UTF-8":       {"matrix_from", "a.csv", "1,\xff", "not a text file"},
		"ending":          {"matrix_from", "a.xyz", "1", "ending"},
		"names missing":   {"table_from", "a.csv", "1,2\n3,4\n", "names"},
		"names doubled":   {"table_from", "a.csv", "x,x\n1,2\n", "two columns"},
		"above":           {"matrix_from", "../a.csv", "", "outside the folder"},
		"absolute":        {"matrix_from", "/etc/hosts", "", "outside the folder"},
		"missing":         {"matrix_from", "b.csv", "", "there is no file"},
		"unclosed quotes": {"matrix_from", "a.csv", "1,\"2\n", "a.csv:"},
	} {
		_, err := call(t, x.builtin, x.file, x.content)
		if err == nil {
			t.Errorf("%s: was accepted", name)
			continue
		}
		if _, ok := err.(*diag.Error); !ok || !strings.Contains(err.Error(), x.want) {
			t.Errorf("%s: %v; want %q", name, err, x.want)
		}
	}
}

func TestLinkOutOfTheFolderIsRefused(t *testing.T) {
	dir := t.TempDir()
	if err := os.Symlink("/etc/hostname", filepath.Join(dir, "a.csv")); err != nil {
		t.Skip("no links here")
	}
	root, err := os.OpenRoot(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer root.Close()
	c := &value.Call{Args: map[string]value.Value{"file": value.Text("a.csv")}, Root: root, Charge: func(int64) error { return nil }}
	if _, err := Builtins()[0].Func(c); err == nil {
		t.Error("a link out of the folder was followed")
	}
}

func TestTableColumnsAreFields(t *testing.T) {
	v, err := call(t, "table_from", "a.csv", "speed [m/s],remark\n1.5,first\n2,\n")
	if err != nil {
		t.Fatal(err)
	}
	r := v.(*value.Report)
	if r.Fields[0].Name != "speed" || len(r.Fields[0].Value.(*value.List).Items) != 2 || r.Fields[1].Value.(*value.List).Items[0] != value.Text("first") {
		t.Errorf("%+v", r.Fields)
	}
}
