package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// gainwright runs the program and gives its exit status and both outputs.
func gainwright(args ...string) (status int, out, errOut string) {
	var o, e bytes.Buffer
	status = Run(args, strings.NewReader(""), &o, &e)
	return status, o.String(), e.String()
}

func TestReportsOfTheDesignsDoNotDifferFromThemselves(t *testing.T) {
	folder := t.TempDir()
	t.Chdir(filepath.Join("..", "..", "scripts"))
	for _, pattern := range []string{"*.gain", "*.md"} {
		files, err := filepath.Glob(pattern)
		if err != nil {
			t.Fatal(err)
		}
		for _, file := range files {
			one, two := filepath.Join(folder, file+".html"), filepath.Join(folder, file+".2.html")
			for _, output := range []string{one, two} {
				if status, _, errOut := gainwright("report", file, "-o", output); status != scriptStatus[file] {
					t.Fatalf("report %s: exit status %d\n%s", file, status, errOut)
				}
			}
			a, errA := os.ReadFile(one)
			b, errB := os.ReadFile(two)
			if errA != nil || errB != nil || !bytes.Equal(a, b) {
				t.Errorf("two reports of %s differ", file)
			}
			if status, out, errOut := gainwright("check", file, "--against", one); status != 0 || !strings.HasPrefix(out, "nothing differs") {
				t.Errorf("check %s --against its report: exit status %d\n%s%s", file, status, out, errOut)
			}
		}
	}
}

func TestCheckAgainstFindsAChange(t *testing.T) {
	t.Chdir(t.TempDir())
	write := func(text string) {
		if err := os.WriteFile("a.gain", []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	write("K = [[1, 2]]\nK\nrequire K[1, 2] == 2\n")
	if status, _, errOut := gainwright("report", "a.gain", "-o", "a.html"); status != 0 {
		t.Fatal(status, errOut)
	}
	write("K = [[1, 3]]\nK\nrequire K[1, 2] == 2\n")
	status, out, _ := gainwright("check", "a.gain", "--against", "a.html")
	for _, want := range []string{"line 2: value K\n", "real[1][2] was 2, is 3", "was met, is missed", "2 results differ", "not the one that the report"} {
		if !strings.Contains(out, want) {
			t.Errorf("the answer lacks %q:\n%s", want, out)
		}
	}
	if status != 1 {
		t.Errorf("exit status %d", status)
	}
}

func TestReportRefuses(t *testing.T) {
	t.Chdir(t.TempDir())
	if err := os.WriteFile("a.gain", []byte("1\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("a.gain", "a.html"); err != nil {
		t.Skip(err)
	}
	for _, c := range []struct {
		args   []string
		status int
		says   string
	}{
		{[]string{"report"}, 64, "needs a file"},
		{[]string{"report", "a.gain"}, 64, "needs a place to write to"},
		{[]string{"report", "a.gain", "-o", "a.pdf"}, 64, "is written as .html or .md"},
		{[]string{"report", "a.gain", "-o", "a.html"}, 64, "would overwrite the file itself"},
		{[]string{"report", "b.gain", "-o", "b.html"}, 2, "there is no file"},
		{[]string{"report", "a.gain", "-o", "none/b.html"}, 2, "cannot be written"},
		{[]string{"check", "a.gain", "--against", "a.gain"}, 2, "holds no results"},
		{[]string{"check", "a.gain", "--against", "none.html"}, 2, "there is no file"},
	} {
		if status, _, errOut := gainwright(c.args...); status != c.status || !strings.Contains(errOut, c.says) {
			t.Errorf("%v: exit status %d, %q", c.args, status, errOut)
		}
	}
}

func TestAReportWithAnErrorIsWritten(t *testing.T) {
	t.Chdir(t.TempDir())
	if err := os.WriteFile("a.gain", []byte("1\n2 + y\n3\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if status, _, _ := gainwright("report", "a.gain", "-o", "a.html"); status != 2 {
		t.Errorf("exit status %d", status)
	}
	page, err := os.ReadFile("a.html")
	if err != nil || !strings.Contains(string(page), "stops at an error in line 2") {
		t.Error("the page does not say where the file stops", err)
	}
}
