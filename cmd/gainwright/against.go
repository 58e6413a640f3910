package main

import (
	"bufio"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/report"
)

// checkAgainst runs a file again and lists what differs from a kept report. The exit
// status is 1 when something does, whatever is met or missed.
func (a *app) checkAgainst(name, keptName string) error {
	kept, err := readKept(keptName)
	if err != nil {
		return err
	}
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	doc, status, err := a.document(d)
	if err != nil {
		return err
	}
	differences, err := doc.Compare(kept)
	if err != nil {
		return err
	}
	a.showDifferences(differences, kept, doc, keptName)
	switch {
	case status == statusError:
		a.worsen(statusError)
	case len(differences) > 0:
		a.worsen(statusMissed)
	}
	return nil
}

func readKept(name string) (*report.Kept, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, unreadable(name, err)
	}
	defer f.Close()
	const most = 256 << 20
	content, err := io.ReadAll(io.LimitReader(f, most+1))
	if err != nil {
		return nil, unreadable(name, err)
	}
	kept, err := report.ReadKept(content)
	if err != nil {
		e := diag.New(diag.File, "%s is no kept report: %v", name, err)
		var cause *diag.Error
		if errors.As(err, &cause) {
			e.Help = cause.Help
		}
		return nil, e
	}
	return kept, nil
}

type differenceJSON struct {
	Line       int    `json:"line"`
	Kind       string `json:"kind"`
	Source     string `json:"source"`
	Difference string `json:"difference"`
}

func (a *app) showDifferences(differences []report.Difference, kept *report.Kept, doc *report.Document, keptName string) {
	out := bufio.NewWriter(a.out)
	defer out.Flush()
	if a.json {
		encoder := json.NewEncoder(out)
		encoder.SetEscapeHTML(false)
		for _, d := range differences {
			_ = encoder.Encode(differenceJSON{d.Line, d.Kind, d.Source, d.Text})
		}
		return
	}
	for _, d := range differences {
		fmt.Fprintf(out, "line %d: %s %s\n  %s\n", d.Line, d.Kind, visibleLine(d.Source), visibleLine(d.Text))
	}
	switch n := len(differences); n {
	case 0:
		fmt.Fprintf(out, "nothing differs from %s (%d results)\n", keptName, len(kept.Results))
	case 1:
		fmt.Fprintf(out, "1 result differs from %s\n", keptName)
	default:
		fmt.Fprintf(out, "%d results differ from %s\n", n, keptName)
	}
	if kept.Hash != doc.Hash {
		fmt.Fprintln(out, "the file's text is not the one that the report was made of")
	}
	if kept.Version != doc.Version {
		fmt.Fprintf(out, "the report was made with gainwright %s, this is %s\n", visibleLine(kept.Version), doc.Version)
	}
}

// visibleLine keeps what a kept report says from moving the cursor.
func visibleLine(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r >= 0x80 && r < 0xa0 {
			return '·'
		}
		return r
	}, s)
}
