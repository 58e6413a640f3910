package files

import (
	"bytes"
	"encoding/json"
	"errors"
	"io"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// matrixFromJSON reads [[…], …], a plain list as a column, or {"matrix": [[…], …]}.
func matrixFromJSON(c *value.Call, data []byte) (value.Value, error) {
	d := json.NewDecoder(bytes.NewReader(data))
	d.UseNumber()
	var v any
	if err := d.Decode(&v); err != nil {
		offset := int(d.InputOffset())
		var fault *json.SyntaxError
		if errors.As(err, &fault) {
			offset = int(fault.Offset)
		} else if errors.Is(err, io.ErrUnexpectedEOF) {
			offset = len(data)
		}
		return nil, placed(c, lineAt(data, offset), "this is no JSON: %v", err)
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return nil, placed(c, lineAt(data, int(d.InputOffset())), "something follows the matrix")
	}
	if object, ok := v.(map[string]any); ok {
		v, ok = object["matrix"]
		if !ok {
			return nil, value.Errf(diag.File, "file", "the object has no field \"matrix\"")
		}
	}
	list, ok := v.([]any)
	if !ok {
		return nil, value.Errf(diag.File, "file", "the file holds no list of rows")
	}
	rows := make([][]any, len(list))
	width := 1
	for i, x := range list {
		row, isRow := x.([]any)
		if !isRow {
			row = []any{x}
		}
		if i == 0 {
			width = len(row)
		}
		if len(row) != width {
			return nil, value.Errf(diag.Shape, "file", "row %d has %d entries, row 1 has %d", i+1, len(row), width)
		}
		rows[i] = row
	}
	m, err := newStore(len(rows), width)
	if err != nil {
		return nil, err
	}
	for i, row := range rows {
		for j, x := range row {
			text := ""
			switch x := x.(type) {
			case json.Number:
				text = x.String()
			case string:
				text = x
			}
			r, ok := number(text)
			if !ok {
				return nil, value.Errf(diag.File, "file", "entry [%d, %d] is no number", i+1, j+1)
			}
			m.add(i, j, r, nil)
		}
	}
	return m.matrix(c), nil
}

func lineAt(data []byte, offset int) int {
	offset = min(max(offset, 0), len(data))
	return 1 + bytes.Count(data[:offset], []byte("\n"))
}
