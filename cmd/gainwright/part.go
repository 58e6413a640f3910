package main

import (
	"bufio"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"math"
	"os"
	"os/signal"
	"strconv"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

// partFormat marks a file that --part writes and merge reads.
const partFormat = "gainwright part 1"

// partFile is one share of the studies of a design.
type partFile struct {
	Format  string      `json:"format"`
	Design  string      `json:"design"`
	Hash    string      `json:"sha256"`
	Version string      `json:"version"`
	Part    int         `json:"part"`
	Parts   int         `json:"parts"`
	Studies []partStudy `json:"studies"`
}

// partStudy is a study's definition and the values of the samples from First on.
type partStudy struct {
	Name       string          `json:"name"`
	Samples    int             `json:"samples"`
	Corners    int             `json:"corners"`
	Seed       int64           `json:"seed"`
	First      int             `json:"first"`
	Parameters []partParameter `json:"parameters"`
	Results    []partResult    `json:"results"`
}

type partParameter struct {
	Model   string  `json:"model"`
	Name    string  `json:"name"`
	Unit    string  `json:"unit,omitempty"`
	Nominal float64 `json:"nominal"`
	Low     float64 `json:"low"`
	High    float64 `json:"high"`
}

type partResult struct {
	Name   string       `json:"name,omitempty"`
	Text   string       `json:"expression"`
	Unit   string       `json:"unit,omitempty"`
	Values []partNumber `json:"values"`
}

// partNumber is written so that it reads back as the same binary64 number; a failed sample
// is null.
type partNumber float64

func (n partNumber) MarshalJSON() ([]byte, error) {
	f := float64(n)
	switch {
	case math.IsNaN(f):
		return []byte("null"), nil
	case math.IsInf(f, 0):
		return []byte(map[bool]string{true: `"infinity"`, false: `"-infinity"`}[f > 0]), nil
	}
	return strconv.AppendFloat(nil, f, 'g', -1, 64), nil
}

func (n *partNumber) UnmarshalJSON(text []byte) error {
	switch string(text) {
	case "null":
		*n = partNumber(math.NaN())
	case `"infinity"`:
		*n = partNumber(math.Inf(1))
	case `"-infinity"`:
		*n = partNumber(math.Inf(-1))
	default:
		f, err := strconv.ParseFloat(string(text), 64)
		*n = partNumber(f)
		return err
	}
	return nil
}

// parsePart reads 3/16.
func parsePart(text string) (part, parts int, err error) {
	const help = "--part 3/16 computes the third of sixteen parts"
	first, second, ok := strings.Cut(text, "/")
	part, err1 := strconv.Atoi(first)
	parts, err2 := strconv.Atoi(second)
	if !ok || err1 != nil || err2 != nil || parts < 2 || parts > mostParts || part < 1 || part > parts {
		return 0, 0, usage(help, "--part %s is not a part of 2 to %d", text, mostParts)
	}
	return part, parts, nil
}

// most parts of a study
const mostParts = 10_000

// runPart computes a share of every study of a file and writes it to standard output for
// merge; values and requirements are not shown.
func (a *app) runPart(name, text string) error {
	part, parts, err := parsePart(text)
	if err != nil {
		return err
	}
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	root, err := os.OpenRoot(d.folder)
	if err != nil {
		return unreadable(d.folder, err)
	}
	defer root.Close()
	progress := newProgress(a.errOut)
	options := a.options(root, progress)
	options.Part, options.Parts = part, parts
	file := partFile{Format: partFormat, Design: d.source.Name, Hash: hashOf(d.source.Text), Version: versionText(), Part: part, Parts: parts}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	stopped := false
	outcome := eval.New(options).RunText(ctx, d.source, func(e eval.Event) {
		progress.clear()
		if e.Error != nil {
			a.fail(e.Error)
		}
		if e.Bound == nil {
			return
		}
		if s, ok := e.Bound.Value.(*value.Study); ok {
			stopped = stopped || s.Stopped
			file.Studies = append(file.Studies, partOf(e.Bound.Name, s))
		}
	})
	progress.clear()
	switch {
	case outcome.Failed:
		a.worsen(statusError)
		return nil
	case stopped:
		return diag.New(diag.Interrupted, "part %d of %d was stopped before it was whole, and is not written", part, parts)
	case len(file.Studies) == 0:
		return diag.New(diag.File, "%s has no study, so there is nothing to divide", d.source.Name)
	}
	out := bufio.NewWriterSize(a.out, 64<<10)
	defer out.Flush()
	encoder := json.NewEncoder(out)
	encoder.SetEscapeHTML(false)
	return encoder.Encode(file)
}

func hashOf(text string) string {
	sum := sha256.Sum256([]byte(text))
	return hex.EncodeToString(sum[:])
}

func partOf(name string, s *value.Study) partStudy {
	out := partStudy{Name: name, Samples: s.Samples, Corners: s.Corners, Seed: s.Seed, First: s.First}
	for _, p := range s.Parameters {
		out.Parameters = append(out.Parameters, partParameter{p.Model, p.Name, p.Unit.Text, p.Nominal, p.Low, p.High})
	}
	for _, r := range s.Results {
		result := partResult{Name: r.Name, Text: r.Text, Unit: r.Unit.Text, Values: make([]partNumber, len(r.Values))}
		for k, v := range r.Values {
			result.Values[k] = partNumber(v)
		}
		out.Results = append(out.Results, result)
	}
	return out
}
