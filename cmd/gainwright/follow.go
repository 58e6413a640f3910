package main

import (
	"bytes"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"net"
	"os"
	"os/signal"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/fsnotify/fsnotify"
	"github.com/spf13/cobra"

	"gainwright/lang/diag"
	"gainwright/lang/report"
)

func (a *app) followCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "follow FILE",
		Short: "Show a file's report in a browser and renew it whenever the file is saved",
		Long: `follow runs a script or a notebook, serves its report to browsers on this machine alone,
and runs it again on every save. The page keeps its place and marks what changed; an
error is shown where it stands, with the last results behind it. Ctrl-C ends it.

The address holds a random word without which nothing is answered.`,
		Args:              oneFile("follow"),
		ValidArgsFunction: completeDesignFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			if err := a.checkFlags(); err != nil {
				return err
			}
			ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
			defer stop()
			return a.follow(ctx, args[0], func(address string) {
				fmt.Fprintf(a.out, "%s\nCtrl-C ends it.\n", address)
			})
		},
	}
	a.valueFlags(c)
	return c
}

// follow serves the file's report until the context ends; ready hears the address.
func (a *app) follow(ctx context.Context, name string, ready func(address string)) error {
	if name == "-" {
		return usage("", "follow needs a file, because standard input is not saved again")
	}
	watcher, err := fsnotify.NewWatcher()
	if err != nil {
		return diag.New(diag.File, "saves cannot be watched for: %v", err)
	}
	defer watcher.Close()
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	// Editors replace a file; its folder stays.
	if err := watcher.Add(d.folder); err != nil {
		return diag.New(diag.File, "%s cannot be watched: %v", d.folder, err)
	}
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return diag.New(diag.File, "no page can be served on this machine: %v", err)
	}
	live, err := newLivePage(listener.Addr().String())
	if err != nil {
		listener.Close()
		return err
	}
	served := make(chan error, 1)
	go func() { served <- live.serve(ctx, listener) }()
	f := &follower{app: a, name: name, folder: d.folder, live: live, watcher: watcher}
	f.run(ctx, d)
	ready(live.address())
	f.watch(ctx)
	return <-served
}

// follower runs the file again after each save.
type follower struct {
	app     *app
	name    string
	folder  string
	live    *livePage
	watcher *fsnotify.Watcher
	good    *report.Document // the last run without an error
	shown   [sha256.Size]byte
	other   map[string]bool // folders of used files that are watched too
}

// settled is how long a file must be left alone before it is read: an editor may write in pieces.
const settled = 25 * time.Millisecond

// watch waits for saves. A save during a run stops the run.
func (f *follower) watch(ctx context.Context) {
	timer := time.NewTimer(time.Hour)
	timer.Stop()
	stop := func() {} // ends the run under way and waits for it
	defer func() { stop() }()
	for {
		select {
		case <-ctx.Done():
			return
		case e, ok := <-f.watcher.Events:
			if !ok {
				return
			}
			if f.matters(e) {
				timer.Reset(settled)
			}
		case _, ok := <-f.watcher.Errors:
			if !ok {
				return
			}
			timer.Reset(settled) // something may have been missed
		case <-timer.C:
			stop()
			stop = f.start(ctx)
		}
	}
}

// start reads the file and runs it; the function it gives ends the run and waits for that.
func (f *follower) start(ctx context.Context) (stop func()) {
	d, failure := f.app.open(f.name)
	if failure == nil && strings.TrimSpace(d.source.Text) == "" {
		// An editor that empties the file before it writes needs a moment more.
		time.Sleep(4 * settled)
		d, failure = f.app.open(f.name)
	}
	if failure != nil {
		f.live.trouble(failure.Error())
		return func() {}
	}
	once, cancel := context.WithCancel(ctx)
	done := make(chan struct{})
	go func() {
		defer close(done)
		f.run(once, d)
	}()
	return func() {
		cancel()
		<-done
	}
}

// the kinds of file that a design may read
var readKinds = []string{".gain", ".md", ".markdown", ".csv", ".json", ".mtx", ".png", ".svg", ".jpg", ".jpeg", ".gif", ".webp"}

func (f *follower) matters(e fsnotify.Event) bool {
	if e.Op == fsnotify.Chmod {
		return false
	}
	if filepath.Base(e.Name) == filepath.Base(f.name) {
		return true
	}
	return slices.Contains(readKinds, strings.ToLower(filepath.Ext(e.Name))) && !strings.HasPrefix(filepath.Base(e.Name), ".")
}

// run makes the report anew; a run that was stopped leaves the page as it is.
func (f *follower) run(ctx context.Context, d *design) {
	doc, events, status, err := f.app.documentOf(ctx, d)
	if errors.Is(ctx.Err(), context.Canceled) {
		return
	}
	if err != nil {
		f.live.trouble(err.Error())
		return
	}
	for _, e := range events {
		if e.Source != nil && e.Source != d.source {
			f.watchFolderOf(e.Source.Name)
		}
	}
	if status == statusError {
		doc.Recall(f.good)
	} else {
		f.good = doc
	}
	var page bytes.Buffer
	if err := doc.HTML(&page); err != nil {
		f.live.trouble(err.Error())
		return
	}
	sum := sha256.Sum256(page.Bytes())
	if f.live.isFine() && sum == f.shown {
		return // saved without a change
	}
	f.shown = sum
	f.live.show(doc)
}

// most folders that are watched besides the file's own
const mostFolders = 100

func (f *follower) watchFolderOf(name string) {
	folder := filepath.Dir(filepath.Join(f.folder, filepath.FromSlash(name)))
	if f.other == nil {
		f.other = map[string]bool{}
	}
	if folder == filepath.Clean(f.folder) || f.other[folder] || len(f.other) == mostFolders {
		return
	}
	f.other[folder] = true
	_ = f.watcher.Add(folder) // a folder that cannot be watched is read on the next save all the same
}
