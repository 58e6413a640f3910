package report

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"reflect"
	"sort"
	"strconv"
	"strings"

	"gainwright/lang/diag"
)

// Kept is what a page kept of an earlier run.
type Kept struct {
	File, Hash, Version string
	Results             []map[string]any
}

// the mark before the data in a page
const dataMark = `<script type="application/json" id="results">`

// largest page that is read back
const largestKept = 256 << 20

// ReadKept reads the data of a page, or the data alone. It refuses what holds none, and
// data of a later format than it knows.
func ReadKept(content []byte) (*Kept, error) {
	if len(content) > largestKept {
		return nil, diag.New(diag.Limit, "the report is larger than %d MiB", largestKept>>20)
	}
	data := bytes.TrimSpace(content)
	if !bytes.HasPrefix(data, []byte("{")) {
		// The text of a page cannot hold the mark: there its < is written as an entity.
		_, after, found := bytes.Cut(content, []byte(dataMark))
		end := bytes.Index(after, []byte("</script>"))
		if !found || end < 0 {
			return nil, diag.New(diag.File, "it holds no results of a run").
				WithHelp("gainwright report FILE -o OUT.html writes a report that does")
		}
		data = after[:end]
	}
	var k struct {
		kept
		Results []map[string]any `json:"results"`
	}
	decoder := json.NewDecoder(bytes.NewReader(data))
	decoder.UseNumber()
	if err := decoder.Decode(&k); err != nil {
		return nil, diag.New(diag.File, "its results cannot be read: they are damaged")
	}
	if k.Format != dataFormat {
		return nil, diag.New(diag.File, "its results have format %d; this program reads format %d", k.Format, dataFormat)
	}
	return &Kept{File: k.File, Hash: k.Hash, Version: k.Version, Results: k.Results}, nil
}

// Difference is a result that is not as it was.
type Difference struct {
	Line   int    // in the file as it is, or in the kept one where it is gone
	Source string // the statement's expression
	Kind   string // "value", "requirement", "claim", "error"
	Text   string // what differs
}

// Compare holds the document's results against kept ones: every shown value, requirement
// and claim. Results belong together when their statements read the same, in the order
// they come. Floating numbers are equal when they agree to the digits that hold in both;
// everything else must be the same. Notes and lines are not compared.
func (d *Document) Compare(k *Kept) ([]Difference, error) {
	now, err := ReadKept(d.Data())
	if err != nil {
		return nil, err
	}
	type key struct{ kind, source string }
	before := map[key][]map[string]any{}
	keyOf := func(r map[string]any) (key, bool) {
		for _, kind := range []string{"value", "requirement", "claim", "error"} {
			if _, ok := r[kind]; !ok {
				continue
			}
			source, _ := r["source"].(string)
			if inner, ok := r[kind].(map[string]any); ok && source == "" {
				source, _ = inner["source"].(string)
				if kind == "error" {
					source, _ = inner["message"].(string)
				}
			}
			return key{kind, source}, true
		}
		return key{}, false
	}
	for _, r := range k.Results {
		if at, ok := keyOf(r); ok {
			before[at] = append(before[at], r)
		}
	}
	var found []Difference
	for _, r := range now.Results {
		at, ok := keyOf(r)
		if !ok {
			continue
		}
		old := before[at]
		if len(old) == 0 {
			found = append(found, Difference{lineOf(r), at.source, at.kind, "is not in the kept report"})
			continue
		}
		before[at] = old[1:]
		if text := differs(at.kind, old[0][at.kind], r[at.kind]); text != "" {
			found = append(found, Difference{lineOf(r), at.source, at.kind, text})
		}
	}
	for _, r := range k.Results {
		at, ok := keyOf(r)
		if ok && len(before[at]) > 0 && reflect.ValueOf(before[at][0]).Pointer() == reflect.ValueOf(r).Pointer() {
			found = append(found, Difference{lineOf(r), at.source, at.kind, "is in the kept report only"})
			before[at] = before[at][1:]
		}
	}
	return found, nil
}

func lineOf(r map[string]any) int {
	n, _ := r["line"].(json.Number)
	line, _ := n.Int64()
	return int(line)
}

// differs tells in words how two results differ; empty when they do not.
func differs(kind string, before, after any) string {
	a, _ := before.(map[string]any)
	b, _ := after.(map[string]any)
	switch kind {
	case "requirement":
		if was, is := a["met"] == true, b["met"] == true; was != is {
			return fmt.Sprintf("was %s, is %s", metWord(was), metWord(is))
		}
	case "claim":
		if was, is := a["agrees"] == true, b["agrees"] == true; was != is {
			return fmt.Sprintf("did %s, does %s", agreeWord(was), agreeWord(is))
		}
		// The distance from the printed number follows from the entries.
		a, b = without(a, "worst_units"), without(b, "worst_units")
		return inWords(compare("", a, b, defaultDigits, 0))
	}
	return inWords(compare("", before, after, defaultDigits, 0))
}

func metWord(met bool) string {
	if met {
		return "met"
	}
	return "missed"
}

func agreeWord(agrees bool) string {
	if agrees {
		return "agree"
	}
	return "not agree"
}

func without(m map[string]any, key string) map[string]any {
	out := make(map[string]any, len(m))
	for k, v := range m {
		if k != key {
			out[k] = v
		}
	}
	return out
}

// mismatch is the first place where two values differ.
type mismatch struct{ path, before, after string }

func inWords(m *mismatch) string {
	switch {
	case m == nil:
		return ""
	case m.path == "":
		return fmt.Sprintf("was %s, is %s", m.before, m.after)
	}
	return fmt.Sprintf("%s was %s, is %s", strings.TrimPrefix(m.path, "."), m.before, m.after)
}

// digits that are compared where a number does not say how many hold
const defaultDigits = 9

// compare walks two values; digits is how many hold, scale the size of the largest number
// beside, below which differences of rounding do not count.
func compare(path string, before, after any, digits int, scale float64) *mismatch {
	switch a := before.(type) {
	case map[string]any:
		b, ok := after.(map[string]any)
		if !ok {
			return differ(path, before, after)
		}
		return compareObjects(path, a, b, digits)
	case []any:
		b, ok := after.([]any)
		if !ok || len(a) != len(b) {
			return differ(path, before, after)
		}
		scale = math.Max(scale, math.Max(largest(a), largest(b)))
		for i := range a {
			if m := compare(path+"["+strconv.Itoa(i+1)+"]", a[i], b[i], digits, scale); m != nil {
				return m
			}
		}
		return nil
	case json.Number:
		b, ok := after.(json.Number)
		if !ok || !sameNumber(a, b, digits, scale) {
			return differ(path, before, after)
		}
		return nil
	}
	if before != after {
		return differ(path, before, after)
	}
	return nil
}

func compareObjects(path string, a, b map[string]any, digits int) *mismatch {
	for _, m := range []map[string]any{a, b} {
		if n, ok := m["digits"].(json.Number); ok {
			if hold, err := n.Int64(); err == nil {
				digits = min(int(hold), max(digits, 15))
			}
		}
	}
	if _, ok := a["exact"]; ok {
		digits = 15
	}
	keys := sortedKeys(a, b)
	scale := 0.0
	if a["kind"] == "complex" {
		// The parts of a complex number share their error.
		scale = math.Max(size(a["real"]), size(a["imaginary"]))
	}
	for _, key := range keys {
		if key == "digits" {
			continue
		}
		one, inA := a[key]
		two, inB := b[key]
		name := path + "." + key
		switch {
		case !inA:
			return &mismatch{name, "absent", brief(two)}
		case !inB:
			return &mismatch{name, brief(one), "absent"}
		}
		if m := compare(name, one, two, digits, scale); m != nil {
			return m
		}
	}
	return nil
}

// sameNumber compares to one unit in the last digit that holds.
func sameNumber(a, b json.Number, digits int, scale float64) bool {
	if a == b {
		return true
	}
	x, errX := a.Float64()
	y, errY := b.Float64()
	if errX != nil || errY != nil {
		return false
	}
	scale = math.Max(scale, math.Max(math.Abs(x), math.Abs(y)))
	return math.Abs(x-y) <= scale*math.Pow(10, 1-float64(max(digits, 1)))
}

func size(v any) float64 {
	n, ok := v.(json.Number)
	if !ok {
		return 0
	}
	x, err := n.Float64()
	if err != nil {
		return 0
	}
	return math.Abs(x)
}

// largest number of a list or of a list of rows.
func largest(list []any) float64 {
	most := 0.0
	for _, v := range list {
		if row, ok := v.([]any); ok {
			most = math.Max(most, largest(row))
		}
		most = math.Max(most, size(v))
	}
	return most
}

func differ(path string, before, after any) *mismatch {
	return &mismatch{path, brief(before), brief(after)}
}

// longest text of a value in a difference, in characters
const longestBrief = 60

func brief(v any) string {
	var text string
	switch x := v.(type) {
	case string:
		text = x
	case json.Number:
		text = x.String()
	default:
		b, err := json.Marshal(v)
		if err != nil {
			return "something else"
		}
		text = string(b)
	}
	if runes := []rune(text); len(runes) > longestBrief {
		return string(runes[:longestBrief]) + "…"
	}
	return text
}

// sortedKeys are the keys of both objects, those that say most first.
func sortedKeys(a, b map[string]any) []string {
	seen := map[string]bool{}
	var keys []string
	for _, m := range []map[string]any{a, b} {
		for k := range m {
			if !seen[k] {
				seen[k] = true
				keys = append(keys, k)
			}
		}
	}
	rank := func(k string) int {
		for i, first := range []string{"kind", "title", "holds", "real", "imaginary", "left", "right"} {
			if k == first {
				return i
			}
		}
		return 100
	}
	sort.Slice(keys, func(i, j int) bool {
		if x, y := rank(keys[i]), rank(keys[j]); x != y {
			return x < y
		}
		return keys[i] < keys[j]
	})
	return keys
}
