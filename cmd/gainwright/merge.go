package main

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"

	"github.com/spf13/cobra"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// largest part file, and largest sum of all
const (
	largestPart  = 256 << 20
	largestParts = 1 << 30
)

func (a *app) mergeCommand() *cobra.Command {
	var name string
	c := &cobra.Command{
		Use:   "merge PART…",
		Short: "Join the parts of divided studies and run their file with them",
		Long: `merge reads the files that gainwright FILE --part 1/N … --part N/N wrote, and runs FILE with
the studies' samples taken from them. What it shows and its exit status are those of the
undivided run.

The file is the one that the parts name, below the folder that merge starts in, or the one
given with --design. It must be the same text, byte by byte.`,
		Args: needsFiles("merge"),
		RunE: func(_ *cobra.Command, args []string) error {
			if err := a.checkFlags(); err != nil {
				return err
			}
			return a.merge(args, name)
		},
	}
	a.runFlags(c)
	c.Flags().StringVar(&name, "design", "", "the design file, when it is not where the parts say")
	return c
}

func (a *app) merge(names []string, design string) error {
	parts, failure := readParts(names)
	if failure != nil {
		return failure
	}
	first := parts[0]
	if design == "" {
		if design = first.Design; !filepath.IsLocal(design) {
			return usage("gainwright merge --design FILE PART…", "the parts are of %s, which is not below this folder", visibleLine(design))
		}
	}
	d, failure := a.open(design)
	if failure != nil {
		return failure
	}
	if hashOf(d.source.Text) != first.Hash {
		return diag.New(diag.File, "%s is not the text that the parts were computed of", design)
	}
	taken := map[string]bool{}
	return a.runDesignWith(d, false, func(name string, s *value.Study) ([][]float64, error) {
		taken[name] = true
		return joined(parts, name, s)
	})
}

// readParts reads the files and puts the parts in order; every part must be there once.
func readParts(names []string) ([]*partFile, *diag.Error) {
	var parts []*partFile
	from := map[int]string{}
	room := int64(largestParts)
	for _, name := range names {
		p, size, err := readPart(name, min(room, largestPart))
		if err != nil {
			return nil, err
		}
		room -= size
		if len(parts) > 0 {
			switch first := parts[0]; {
			case p.Hash != first.Hash:
				return nil, diag.New(diag.File, "%s and %s are parts of different texts", names[0], name)
			case p.Parts != first.Parts:
				return nil, diag.New(diag.File, "%s is one of %d parts, and %s one of %d", names[0], first.Parts, name, p.Parts)
			}
		}
		if earlier, twice := from[p.Part]; twice {
			return nil, diag.New(diag.File, "%s and %s are both part %d", earlier, name, p.Part)
		}
		from[p.Part] = name
		parts = append(parts, p)
	}
	for k := 1; k <= parts[0].Parts; k++ {
		if _, ok := from[k]; !ok {
			return nil, diag.New(diag.File, "part %d of %d is missing", k, parts[0].Parts)
		}
	}
	slices.SortFunc(parts, func(a, b *partFile) int { return a.Part - b.Part })
	return parts, nil
}

func readPart(name string, most int64) (*partFile, int64, *diag.Error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, 0, unreadable(name, err)
	}
	defer f.Close()
	content, err := io.ReadAll(io.LimitReader(f, most+1))
	if err != nil {
		return nil, 0, unreadable(name, err)
	}
	if int64(len(content)) > most {
		return nil, 0, diag.New(diag.Limit, "%s is too long for the %d MiB that the parts may have together", name, int64(largestParts)>>20)
	}
	p := &partFile{}
	if err := json.Unmarshal(content, p); err != nil || p.Format != partFormat {
		return nil, 0, diag.New(diag.File, "%s is no part of a study", name).WithHelp("gainwright FILE --part 1/4 > part1.json writes one")
	}
	if p.Parts < 2 || p.Parts > mostParts || p.Part < 1 || p.Part > p.Parts {
		return nil, 0, diag.New(diag.File, "%s says that it is part %d of %d", name, p.Part, p.Parts)
	}
	return p, int64(len(content)), nil
}

// joined gives the values of a study from the parts, when they are of that very study.
func joined(parts []*partFile, name string, s *value.Study) ([][]float64, error) {
	want := partOf(name, s)
	out := make([][]float64, len(want.Results))
	for _, p := range parts {
		k := slices.IndexFunc(p.Studies, func(c partStudy) bool { return c.Name == name })
		if k < 0 {
			return nil, diag.New(diag.File, "part %d has no study %s", p.Part, name)
		}
		part := &p.Studies[k]
		if why := unlike(part, &want); why != "" {
			return nil, diag.New(diag.File, "part %d is of another study: %s", p.Part, why)
		}
		for j, r := range part.Results {
			if len(r.Values) != len(part.Results[0].Values) || part.First != len(out[j]) {
				return nil, diag.New(diag.File, "part %d does not begin where the part before it ends", p.Part)
			}
			for _, v := range r.Values {
				out[j] = append(out[j], float64(v))
			}
		}
	}
	return out, nil
}

// unlike tells in what a part's study is not the one of the file.
func unlike(part, want *partStudy) string {
	switch {
	case part.Samples != want.Samples:
		return fmt.Sprintf("%d samples, not %d", part.Samples, want.Samples)
	case part.Corners != want.Corners:
		return fmt.Sprintf("%d corners, not %d", part.Corners, want.Corners)
	case part.Seed != want.Seed:
		return fmt.Sprintf("seed %d, not %d", part.Seed, want.Seed)
	case !slices.Equal(part.Parameters, want.Parameters):
		return "its parameters or their tolerances differ"
	case !slices.EqualFunc(part.Results, want.Results, func(a, b partResult) bool { return a.Name == b.Name && a.Text == b.Text }):
		return "its expressions differ"
	}
	return ""
}
