package main

import (
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
		if p.folder == "" {
			return nil
		}
		_, err := p.below()
		return err
	}
	return usage("", "--format %s is none of svg, png, pdf", p.format)
}

// write makes the files design-r.png, design-line-12.png, …, below the folder that the run
// starts in.
func (p *pictures) write(doc *report.Document, design string) error {
	if p.folder == "" {
		return nil
	}
	folder, err := p.below()
	if err != nil {
		return err
	}
	root, err := os.OpenRoot(".")
	if err != nil {
		return unreadable("the current folder", err)
	}
	defer root.Close()
	if err := root.MkdirAll(folder, 0o777); err != nil {
		return diag.New(diag.File, "%s cannot be made a folder: %s", p.folder, reason(err))
	}
	base := filepath.Base(design)
	stem := strings.ReplaceAll(strings.TrimSuffix(base, filepath.Ext(base)), " ", "_")
	for _, f := range doc.Figures() {
		content, err := painted(f.Drawing, p.format)
		name := filepath.Join(folder, stem+"-"+f.Name+"."+p.format)
		if err == nil {
			err = replaceBelow(root, name, content)
		}
		if err != nil {
			return diag.New(diag.File, "%s cannot be written: %s", name, reason(err))
		}
	}
	return nil
}

// below is the folder as seen from the one that the run starts in, which it must not leave.
func (p *pictures) below() (string, error) {
	folder := p.folder
	if filepath.IsAbs(folder) {
		here, err := os.Getwd()
		if err != nil {
			return "", unreadable("the current folder", err)
		}
		if folder, err = filepath.Rel(here, folder); err != nil {
			folder = ".."
		}
	}
	if !filepath.IsLocal(folder) {
		return "", usage("start the run in a folder above the figures'", "--figures %s leaves the folder that the run starts in", p.folder)
	}
	return folder, nil
}

// replaceBelow writes a file below root whole or not at all.
func replaceBelow(root *os.Root, name string, content []byte) error {
	part := name + ".part"
	err := root.WriteFile(part, content, 0o666)
	if err == nil {
		err = root.Rename(part, name)
	}
	if err != nil {
		_ = root.Remove(part)
	}
	return err
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
