package report_test

import (
	"bytes"
	"strings"
	"testing"

	"gainwright/lang/report"
)

func keptOf(t *testing.T, text string) *report.Kept {
	t.Helper()
	var b bytes.Buffer
	if err := run(t, "x.gain", text).HTML(&b); err != nil {
		t.Fatal(err)
	}
	k, err := report.ReadKept(b.Bytes())
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func TestWhatDiffersFromAKeptReport(t *testing.T) {
	const before = "a = 2\na\n[[1, a], [3, 4]]\nrequire a < 3\nclaim a is 2.0\n1/3\n"
	cases := []struct{ name, now, want string }{
		{"nothing", before, ""},
		{"a comment", "# new\n" + before, ""},
		{"the value behind a name", strings.Replace(before, "a = 2", "a = 5/2", 1),
			"2 value a: real was 2, is 2.5|3 value [[1, a], [3, 4]]: real[1][2] was 2, is 2.5|4 requirement a < 3: left was 2, is 2.5|5 claim a is 2.0: did agree, does not agree"},
		{"a requirement that is missed now", strings.Replace(before, "a = 2", "a = 4", 1),
			"2 value a: real was 2, is 4|3 value [[1, a], [3, 4]]: real[1][2] was 2, is 4|4 requirement a < 3: was met, is missed|5 claim a is 2.0: did agree, does not agree"},
		{"a statement more", before + "7\n", "7 value 7: is not in the kept report"},
		{"a statement less", strings.Replace(before, "1/3\n", "", 1), "6 value 1/3: is in the kept report only"},
		{"another statement", strings.Replace(before, "1/3", "1/4", 1), "6 value 1/4: is not in the kept report|6 value 1/3: is in the kept report only"},
	}
	for _, c := range cases {
		found, err := run(t, "x.gain", c.now).Compare(keptOf(t, before))
		if err != nil {
			t.Fatal(err)
		}
		parts := make([]string, len(found))
		for i, d := range found {
			parts[i] = strings.Join([]string{itoa(d.Line), d.Kind, d.Source + ":", d.Text}, " ")
		}
		if got := strings.Join(parts, "|"); got != c.want {
			t.Errorf("%s: got\n%s\nwant\n%s", c.name, got, c.want)
		}
	}
}

func itoa(n int) string { return string(rune('0' + n)) }

// TestRoundingIsNoDifference changes floating numbers in their last places, as another
// machine does, and beyond the digits that hold.
func TestRoundingIsNoDifference(t *testing.T) {
	const kept = `{"format":1,"results":[{"line":1,"source":"root_of_two()","value":{"kind":"number","real":REAL,"digits":15}}]}`
	for real, differs := range map[string]bool{"1.4142135623730951": false, "1.4142135623730945": false, "1.41421356237": true, "1.5": true} {
		k, err := report.ReadKept([]byte(strings.Replace(kept, "REAL", real, 1)))
		if err != nil {
			t.Fatal(err)
		}
		found, err := run(t, "x.gain", "root_of_two()\n").Compare(k)
		if err != nil {
			t.Fatal(err)
		}
		if (len(found) > 0) != differs {
			t.Errorf("%s: differences %v", real, found)
		}
	}
}

func TestADamagedReportIsRefused(t *testing.T) {
	for _, content := range []string{"", "{", `{"format":99}`, "<html>", `<script type="application/json" id="results">`,
		`<script type="application/json" id="results">{"format":</script>`, `{"format":1,"results":[7]}`} {
		if k, err := report.ReadKept([]byte(content)); err == nil {
			t.Errorf("%q was read as %v", content, k)
		}
	}
}

// FuzzReadKept looks for content that cannot be read or compared without harm.
func FuzzReadKept(f *testing.F) {
	f.Add([]byte(`{"format":1,"results":[{"line":1,"source":"1","value":{"kind":"number","real":1e999,"digits":-4}}]}`))
	f.Add([]byte(`{"format":1,"results":[{"line":"x","requirement":[1],"claim":null,"value":[[[]]]}]}`))
	f.Fuzz(func(t *testing.T, content []byte) {
		k, err := report.ReadKept(content)
		if err != nil {
			return
		}
		d := report.New(report.Run{Source: source("1\n[1, 2]\n")})
		if _, err := d.Compare(k); err != nil {
			t.Fatal(err)
		}
	})
}
