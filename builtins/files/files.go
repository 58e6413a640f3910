// Package files is the family that reads matrices and tables from files beside the design.
// Paths lead below the folder of the run only (os.Root); sizes are bounded; errors name the line.
package files

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path/filepath"
	"strings"
	"unicode/utf8"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// mostBytes bounds a file that is read.
const mostBytes = 64 << 20

// Builtins lists the family.
func Builtins() []*value.Builtin {
	file := value.Param{Name: "file", Shape: value.AText, Doc: "a path below the folder of the run"}
	return []*value.Builtin{
		{
			Name: "matrix_from", Family: "files", Params: []value.Param{file},
			Result: "matrix; exact for decimals in CSV and JSON", Summary: "a matrix from a CSV, JSON or Matrix Market file",
			Doc: "The ending decides. .csv: rows of numbers separated by commas, semicolons or tabs; a first row of names becomes the columns' names; # begins a comment. " +
				".json: a list of rows, or an object with field \"matrix\"; texts such as \"24/7\" are exact. " +
				".mtx: NIST Matrix Market, dense (array) and coordinate; real, integer, complex and pattern; general, symmetric, skew-symmetric and Hermitian. " +
				"Decimals as written are exact, as in the language.",
			Examples: []value.Example{{Input: "size(matrix_from(\"testdata/frame.mtx\"))", Output: "= [3, 3]"}},
			Errors:   []string{"a file outside the folder of the run", "rows of unequal length, with the line", "an entry that is no number, with line and place"},
			Source:   "Boisvert, Pozo & Remington 1996, NISTIR 5935; RFC 4180; RFC 8259", SeeAlso: []string{"table_from", "plant"},
			Func: matrixFrom,
		},
		{
			Name: "table_from", Family: "files", Params: []value.Param{file},
			Result: "report with a field for each column and the table", Summary: "a table with named columns from a CSV file",
			Doc:      "The first row holds the names. Each column becomes a field: a list of numbers (exact), or of texts where an entry is none. Names that are no names of the language get _ for other characters.",
			Examples: []value.Example{{Input: "table_from(\"testdata/runs.csv\").speed", Output: "= [1.5, 2, 2.5]"}},
			Errors:   []string{"a file outside the folder of the run", "rows of unequal length, with the line", "two columns of one name"},
			Source:   "RFC 4180", SeeAlso: []string{"matrix_from"},
			Func: tableFrom,
		},
	}
}

// read gives a file's bytes and its ending in lower case.
func read(c *value.Call) (data []byte, ending string, err error) {
	name := c.Text("file", "")
	refuse := func(kind diag.Kind, format string, args ...any) error {
		return value.Errf(kind, "file", format, args...)
	}
	if c.Root == nil {
		return nil, "", refuse(diag.File, "files cannot be read here")
	}
	if name == "" || strings.ContainsRune(name, 0) {
		return nil, "", refuse(diag.File, "%q is no file name", name)
	}
	if !filepath.IsLocal(name) {
		return nil, "", refuse(diag.File, "%q leads outside the folder of the run", name)
	}
	info, err := c.Root.Stat(name)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, "", refuse(diag.File, "there is no file %q in the folder of the run", name)
	case err != nil:
		return nil, "", refuse(diag.File, "%q cannot be read: it leads outside the folder of the run or is not accessible", name)
	case !info.Mode().IsRegular():
		return nil, "", refuse(diag.File, "%q is not a plain file", name)
	case info.Size() > mostBytes:
		return nil, "", refuse(diag.Limit, "%q has %d bytes; at most %d are read", name, info.Size(), mostBytes)
	}
	if err := c.Charge(info.Size()); err != nil {
		return nil, "", err
	}
	f, err := c.Root.Open(name)
	if err != nil {
		return nil, "", refuse(diag.File, "%q cannot be read", name)
	}
	defer f.Close()
	data, err = io.ReadAll(io.LimitReader(f, mostBytes))
	if err != nil {
		return nil, "", refuse(diag.File, "%q cannot be read to its end", name)
	}
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))
	if !utf8.Valid(data) || bytes.IndexByte(data, 0) >= 0 {
		return nil, "", refuse(diag.File, "%q is not a text file in UTF-8", name)
	}
	return data, strings.ToLower(filepath.Ext(name)), nil
}

// placed is a fault in a file's text.
func placed(c *value.Call, line int, format string, args ...any) *diag.Error {
	return value.Errf(diag.File, "file", "%s:%d: %s", c.Text("file", ""), line, fmt.Sprintf(format, args...))
}

func matrixFrom(c *value.Call) (value.Value, error) {
	data, ending, err := read(c)
	if err != nil {
		return nil, err
	}
	switch ending {
	case ".csv", ".tsv", ".txt":
		t, err := parseTable(c, string(data))
		if err != nil {
			return nil, err
		}
		return t.matrix(c)
	case ".json":
		return matrixFromJSON(c, data)
	case ".mtx":
		return matrixMarket(c, string(data))
	}
	return nil, value.Errf(diag.File, "file", "the ending %q is not known", ending).WithHelp("matrices are read from .csv, .json and .mtx files")
}
