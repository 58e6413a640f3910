package main

import (
	"bytes"
	"context"
	"errors"
	"io/fs"
	"os"
	"os/signal"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/report"
)

func (a *app) reportCommand() *cobra.Command {
	var output string
	var files pictures
	c := &cobra.Command{
		Use:   "report FILE -o OUT.html",
		Short: "Run a file and write its text, results and figures as one document",
		Long: `report runs a script or a notebook and writes one page that can be read, printed and
kept without anything else: the text with its results beside it, the figures, what was
required and how it came out. OUT.md writes Markdown with the figures beside it.

The page holds the results as data too: gainwright check FILE --against OUT.html runs
the file again and lists what differs. The exit status is that of running the file.`,
		Args:              oneFile("report"),
		ValidArgsFunction: completeDesignFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			if err := a.checkFlags(); err != nil {
				return err
			}
			if err := files.check(); err != nil {
				return err
			}
			return a.writeReport(args[0], output, &files)
		},
	}
	a.valueFlags(c)
	files.flags(c)
	c.Flags().StringVarP(&output, "output", "o", "", "the document to write: .html or .md")
	return c
}

// oneFile is the check of a command's arguments that takes a single file.
func oneFile(command string) cobra.PositionalArgs {
	return func(_ *cobra.Command, args []string) error {
		switch {
		case len(args) == 0:
			return usage("gainwright "+command+" --help shows how it is used", "%s needs a file", command)
		case len(args) > 1:
			return usage("", "%s takes one file, %d were named", command, len(args))
		}
		return nil
	}
}

func (a *app) writeReport(name, output string, files *pictures) error {
	kind := strings.ToLower(filepath.Ext(output))
	switch {
	case output == "":
		return usage("gainwright report "+name+" -o design.html", "report needs a place to write to")
	case kind != ".html" && kind != ".htm" && kind != ".md":
		return usage("", "a report is written as .html or .md, not as %s", filepath.Base(output))
	case sameFile(name, output):
		return usage("", "the report would overwrite the file itself")
	}
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	doc, status, err := a.document(d)
	if err != nil {
		return err
	}
	if err := writeDocument(doc, output, kind == ".md"); err != nil {
		return diag.New(diag.File, "%s cannot be written: %s", output, reason(err))
	}
	if err := files.write(doc, d.source.Name); err != nil {
		return err
	}
	a.worsen(status)
	return nil
}

func sameFile(a, b string) bool {
	one, err := os.Stat(a)
	if err != nil {
		return false
	}
	two, err := os.Stat(b)
	return err == nil && os.SameFile(one, two)
}

// document runs a design to its end, or until Ctrl-C, and shows its error.
func (a *app) document(d *design) (*report.Document, int, error) {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	context.AfterFunc(ctx, stop)
	doc, events, status, err := a.documentOf(ctx, d)
	for _, e := range events {
		if e.Error != nil {
			p := render.Printer{Out: a.errOut, Options: a.look(a.errOut)}
			p.Event(e)
		}
	}
	if err == nil {
		err = doc.Prepare()
	}
	return doc, status, err
}

// documentOf runs a design; pictures of a notebook are read below its folder.
func (a *app) documentOf(ctx context.Context, d *design) (*report.Document, []eval.Event, int, error) {
	root, err := os.OpenRoot(d.folder)
	if err != nil {
		return nil, nil, 0, unreadable(d.folder, err)
	}
	defer root.Close()
	progress := newProgress(a.errOut)
	var events []eval.Event
	outcome := eval.New(a.options(root, progress)).RunText(ctx, d.source, func(e eval.Event) { events = append(events, e) })
	progress.clear()
	doc := report.New(report.Run{Source: d.source, Events: events, Options: render.Options{Digits: a.digits},
		Version: versionText(), Folder: below(d.folder)})
	return doc, events, statusOf(outcome), nil
}

// below is a folder that is opened anew for each file, so that nothing stays open; links
// out of it are refused.
type below string

// Open opens a file below the folder.
func (b below) Open(name string) (fs.File, error) {
	root, err := os.OpenRoot(string(b))
	if err != nil {
		return nil, err
	}
	defer root.Close()
	return root.Open(name)
}

func writeDocument(doc *report.Document, output string, markdown bool) error {
	if markdown {
		stem := strings.TrimSuffix(filepath.Base(output), filepath.Ext(output))
		page, figures := doc.Markdown(stem)
		for _, f := range figures {
			if err := writeWhole(filepath.Join(filepath.Dir(output), f.Name), f.Content); err != nil {
				return err
			}
		}
		return writeWhole(output, page)
	}
	var b bytes.Buffer
	if err := doc.HTML(&b); err != nil {
		return err
	}
	return writeWhole(output, b.Bytes())
}

// writeWhole writes a file whole or not at all. What is no ordinary file, such as a pipe,
// is written to as it is.
func writeWhole(name string, content []byte) error {
	if info, err := os.Stat(name); err == nil && !info.Mode().IsRegular() {
		return os.WriteFile(name, content, 0o666)
	} else if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(name), ".report-*")
	if err != nil {
		return err
	}
	defer os.Remove(f.Name())
	_, err = f.Write(content)
	if err = errors.Join(err, f.Chmod(0o644), f.Close()); err != nil {
		return err
	}
	return os.Rename(f.Name(), name)
}
