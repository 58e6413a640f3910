package main

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"unicode/utf8"

	"gainwright/lang/diag"
)

// largest design file that is read
const largestFile = 16 << 20

// design is a text to run and the folder that its files are read below.
type design struct {
	source *diag.Source
	folder string
}

// open reads a file, or standard input for "-".
func (a *app) open(name string) (*design, *diag.Error) {
	if name == "-" {
		text, err := readAll(a.in)
		if err != nil {
			return nil, diag.New(diag.File, "standard input cannot be read: %s", reason(err))
		}
		return newDesign("standard input", text, ".")
	}
	info, err := os.Stat(name)
	if err != nil {
		return nil, unreadable(name, err)
	}
	if info.IsDir() {
		return nil, diag.New(diag.File, "%s is a folder", name).WithHelp("name a file in it, such as %s", exampleIn(name))
	}
	f, err := os.Open(name)
	if err != nil {
		return nil, unreadable(name, err)
	}
	defer f.Close()
	text, err := readAll(f)
	if err != nil {
		return nil, unreadable(name, err)
	}
	return newDesign(name, text, filepath.Dir(name))
}

// exampleIn names a design file of a folder.
func exampleIn(folder string) string {
	for _, pattern := range []string{"*.gain", "*.md"} {
		if found, err := filepath.Glob(filepath.Join(folder, pattern)); err == nil && len(found) > 0 {
			return found[0]
		}
	}
	return filepath.Join(folder, "design.gain")
}

func readAll(r io.Reader) (string, error) {
	text, err := io.ReadAll(io.LimitReader(r, largestFile+1))
	if err != nil {
		return "", err
	}
	if len(text) > largestFile {
		return "", fmt.Errorf("it is longer than %d MiB", largestFile>>20)
	}
	return string(text), nil
}

func unreadable(name string, err error) *diag.Error {
	e := diag.New(diag.File, "%s cannot be read: %s", name, reason(err))
	if errors.Is(err, fs.ErrNotExist) {
		e.Message = fmt.Sprintf("there is no file %s", name)
		e.Help = "gainwright --help lists the commands"
	}
	return e
}

// reason is the cause of a file error without the path, which is named already.
func reason(err error) string {
	var path *fs.PathError
	if errors.As(err, &path) {
		return path.Err.Error()
	}
	return err.Error()
}

// newDesign refuses what is no text with a place where that helps.
func newDesign(name, text, folder string) (*design, *diag.Error) {
	if n := len(text); n >= 3 && text[:3] == "\xef\xbb\xbf" {
		text = text[3:]
	}
	src := diag.NewSource(name, text)
	for i := 0; i < len(text); {
		r, size := utf8.DecodeRuneInString(text[i:])
		if r == 0 {
			return nil, diag.New(diag.File, "%s is a binary file, not a design", name).
				WithHelp("byte %d is zero", i+1)
		}
		if r == utf8.RuneError && size == 1 {
			return nil, diag.New(diag.Syntax, "the text is not UTF-8: byte %d is 0x%02x", i+1, text[i]).
				At(diag.Span{Start: i, End: i + 1}).In(src)
		}
		i += size
	}
	return &design{source: src, folder: folder}, nil
}

// asFailure is an error of reading with its place.
func asFailure(err error, src *diag.Source) *diag.Error {
	var failure *diag.Error
	if !errors.As(err, &failure) {
		failure = diag.New(diag.Syntax, "%s cannot be read: %v", src.Name, err)
	}
	return failure.In(src)
}
