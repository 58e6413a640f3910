package prompt

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"

	"github.com/peterh/liner"
)

// In the history a statement of several lines stands on one, with this sign for the line ends.
const lineEndSign = "⏎"

// lineEditor edits lines on a terminal.
type lineEditor struct {
	state *liner.State
	path  string // of the history; empty when none is kept
}

func newLineEditor(t *talk) *lineEditor {
	e := &lineEditor{state: liner.NewLiner(), path: historyPath()}
	e.state.SetCtrlCAborts(true)
	e.state.SetBeep(false)
	e.state.SetTabCompletionStyle(liner.TabPrints)
	e.state.SetWordCompleter(t.complete)
	if f, err := os.Open(e.path); err == nil {
		// A history that cannot be read is no reason to stop.
		_, _ = e.state.ReadHistory(f)
		f.Close()
	}
	return e
}

func (e *lineEditor) line(prompt string) (string, error) {
	text, err := e.state.Prompt(prompt)
	switch {
	case errors.Is(err, liner.ErrPromptAborted):
		return "", errCancelled
	case errors.Is(err, io.EOF):
		return "", io.EOF
	}
	return strings.ReplaceAll(text, lineEndSign, "\n"), err
}

func (e *lineEditor) remember(text string) {
	e.state.AppendHistory(strings.ReplaceAll(strings.TrimSpace(text), "\n", lineEndSign))
}

// close gives the terminal back and writes the history, through a second file so that
// two sessions that end together leave a whole one.
func (e *lineEditor) close() {
	defer e.state.Close()
	if e.path == "" || os.MkdirAll(filepath.Dir(e.path), 0o700) != nil {
		return
	}
	f, err := os.CreateTemp(filepath.Dir(e.path), "history-*")
	if err != nil {
		return
	}
	_, err = e.state.WriteHistory(f)
	if f.Close() != nil || err != nil || os.Rename(f.Name(), e.path) != nil {
		os.Remove(f.Name())
	}
}

// historyPath is the file of the history in the user's folder for states.
func historyPath() string {
	folder := os.Getenv("XDG_STATE_HOME")
	if folder == "" && runtime.GOOS != "windows" && runtime.GOOS != "darwin" {
		if home, err := os.UserHomeDir(); err == nil {
			folder = filepath.Join(home, ".local", "state")
		}
	}
	if folder == "" {
		config, err := os.UserConfigDir()
		if err != nil {
			return ""
		}
		folder = config
	}
	return filepath.Join(folder, "gainwright", "history")
}
