package eval

import (
	"errors"
	"io"
	"io/fs"
	"path"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

// use runs another file once, relative to the file it stands in.
func (r *run) use(src *diag.Source, st *syntax.Use) *diag.Error {
	s := r.session
	name, err := s.resolve(st.Path)
	if err != nil {
		return err.At(st.PathSpan)
	}
	for i, open := range s.using {
		if open == name {
			chain := strings.Join(append(append([]string(nil), s.using[i:]...), name), " → ")
			return diag.New(diag.File, "files use one another in a circle: %s", chain).At(st.PathSpan)
		}
	}
	if s.used[name] {
		return nil
	}
	if len(s.used) >= s.limits.Files {
		return diag.New(diag.Limit, "more than %d files are used", s.limits.Files).At(st.PathSpan)
	}
	text, err := s.read(name)
	if err != nil {
		return err.At(st.PathSpan)
	}
	s.used[name] = true
	outside := s.using
	s.using = append(outside[:len(outside):len(outside)], name)
	defer func() { s.using = outside }()
	r.text(diag.NewSource(name, text))
	if r.outcome.Failed {
		delete(s.used, name)
		return errAlreadyTold
	}
	return nil
}

// resolve gives a file's path below the root.
func (s *Session) resolve(written string) (string, *diag.Error) {
	if s.root == nil {
		return "", diag.New(diag.File, "files cannot be read here")
	}
	clean := strings.ReplaceAll(written, "\\", "/")
	if written == "" {
		return "", diag.New(diag.File, "the file's name is empty")
	}
	folder := s.folder
	if n := len(s.using); n > 0 {
		folder = path.Dir(s.using[n-1])
	}
	name := path.Join(folder, clean)
	if path.IsAbs(clean) || !fs.ValidPath(name) {
		return "", diag.New(diag.File, "%s lies outside the folder of the run", written).
			WithHelp("files are named relative to the file that uses them, and stay below the folder the run started in")
	}
	return name, nil
}

// read reads a file below the root, up to the bound on its size.
func (s *Session) read(name string) (string, *diag.Error) {
	file, err := s.root.Open(name)
	if err != nil {
		return "", unreadable(name, err)
	}
	defer file.Close()
	if info, err := file.Stat(); err == nil && !info.Mode().IsRegular() {
		return "", diag.New(diag.File, "%s is not a file", name)
	}
	text, err := io.ReadAll(io.LimitReader(file, s.limits.Source+1))
	if err != nil {
		return "", unreadable(name, err)
	}
	if int64(len(text)) > s.limits.Source {
		return "", diag.New(diag.Limit, "%s is larger than %s", name, bytesText(s.limits.Source))
	}
	return string(text), nil
}

// unreadable says why in plain words; the system's own wording stays in the cause.
func unreadable(name string, err error) *diag.Error {
	e := diag.New(diag.File, "%s cannot be read", name)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		e = diag.New(diag.File, "there is no file %s", name)
	case errors.Is(err, fs.ErrPermission):
		e = diag.New(diag.File, "%s may not be read", name)
	case strings.Contains(err.Error(), "escapes"):
		e = diag.New(diag.File, "%s lies outside the folder of the run", name)
	}
	e.Cause = err
	return e
}
