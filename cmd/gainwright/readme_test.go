package main

import (
	"bytes"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// blocks gives the fenced blocks of the README.
func blocks(t *testing.T) []string {
	t.Helper()
	text, err := os.ReadFile("README.md")
	if err != nil {
		t.Fatal(err)
	}
	var all []string
	for i, part := range strings.Split(string(text), "\n```") {
		if i%2 == 1 {
			_, body, _ := strings.Cut(part, "\n")
			all = append(all, body)
		}
	}
	return all
}

var command = regexp.MustCompile(`(?m)^go run \./cmd/gainwright (.+)$`)

// TestReadmeCommandsPrintWhatItShows runs the README's commands from the top of the
// repository and looks for the output that the next block shows; a line … stands for
// what was left out.
func TestReadmeCommandsPrintWhatItShows(t *testing.T) {
	t.Chdir(filepath.Join("..", ".."))
	all := blocks(t)
	ran := 0
	for i, block := range all {
		for _, m := range command.FindAllStringSubmatch(block, -1) {
			ran++
			var out, errOut bytes.Buffer
			if status := Run(strings.Fields(m[1]), strings.NewReader(""), &out, &errOut); status != 0 {
				t.Fatalf("%s: exit status %d\n%s", m[0], status, errOut.String())
			}
			for _, part := range strings.Split(all[i+1], "\n…\n") {
				if !strings.Contains(out.String(), strings.TrimSpace(part)) {
					t.Errorf("%s does not print\n%s\nbut\n%s", m[0], part, out.String())
				}
			}
		}
	}
	if ran == 0 {
		t.Fatal("the README shows no command")
	}
}

// TestReadmeStatementsRun runs the statements of the tour, in order, as one file.
func TestReadmeStatementsRun(t *testing.T) {
	t.Chdir(filepath.Join("..", ".."))
	var file strings.Builder
	for _, block := range blocks(t)[2:] {
		file.WriteString(block + "\n")
	}
	if !strings.Contains(file.String(), "claim K") {
		t.Fatal("the tour has no claim")
	}
	var out, errOut bytes.Buffer
	if status := Run([]string{"-"}, strings.NewReader(file.String()), &out, &errOut); status != 0 {
		t.Errorf("exit status %d\n%s%s", status, out.String(), errOut.String())
	}
}

// scriptStatus tells which designs end with another exit status than 0.
var scriptStatus = map[string]int{"colleague_sheet.gain": 1, "review_wire_feed.md": 1}

func TestDesignsRun(t *testing.T) {
	t.Chdir(filepath.Join("..", "..", "scripts"))
	files, err := filepath.Glob("*.gain")
	if err != nil || len(files) < 5 {
		t.Fatal("designs are missing", err)
	}
	notebooks, err := filepath.Glob("*.md")
	if err != nil {
		t.Fatal(err)
	}
	for _, file := range append(files, notebooks...) {
		var out, errOut bytes.Buffer
		if status := Run([]string{file}, strings.NewReader(""), &out, &errOut); status != scriptStatus[file] {
			t.Errorf("%s: exit status %d, want %d\n%s%s", file, status, scriptStatus[file], out.String(), errOut.String())
		}
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(string(text), "require ") {
			t.Errorf("%s ends without requirements", file)
		}
	}
}
