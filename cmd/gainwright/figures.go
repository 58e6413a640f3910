package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"gainwright/lang/diag"
	"gainwright/lang/figure"
	"gainwright/lang/report"
)

// pictures says where figures are written to as files of their own, and as what.
type pictures struct{ folder, format string }

func (p *pictures) flags(c *cobra.Command) {
	c.Flags().StringVar(&p.folder, "figures", "", "write each figure as a file into this folder")
	c.Flags().StringVar(&p.format, "format", "svg", "of the figures: svg, png or pdf")
}

func (p *pictures) check() error {
	switch p.format {
	case "svg", "png", "pdf":
		return nil
	}
	return usage("", "--format %s is none of svg, png, pdf", p.format)
}

// write makes the files design-figure-1.png, …, numbered in reading order.
func (p *pictures) write(doc *report.Document, design string) error {
	if p.folder == "" {
		return nil
	}
	if err := os.MkdirAll(p.folder, 0o777); err != nil {
		return diag.New(diag.File, "%s cannot be made a folder: %s", p.folder, reason(err))
	}
	base := filepath.Base(design)
	stem := strings.ReplaceAll(strings.TrimSuffix(base, filepath.Ext(base)), " ", "_")
	for k, f := range doc.Figures() {
		content, err := painted(f.Drawing, p.format)
		name := filepath.Join(p.folder, fmt.Sprintf("%s-figure-%d.%s", stem, k+1, p.format))
		if err == nil {
			err = writeWhole(name, content)
		}
		if err != nil {
			return diag.New(diag.File, "%s cannot be written: %s", name, reason(err))
		}
	}
	return nil
}

func painted(d *figure.Drawing, format string) ([]byte, error) {
	switch format {
	case "png":
		return d.PNG()
	case "pdf":
		return d.PDF(), nil
	}
	return []byte(figure.Standalone(d.SVG("figure"))), nil
}
