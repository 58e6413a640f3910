package report

import (
	"bytes"
	"encoding/json"

	"gainwright/lang/render"
)

// format of the data, counted up when it changes
const dataFormat = 1

// kept is the data of a page.
type kept struct {
	Format  int               `json:"format"`
	File    string            `json:"file"`
	Hash    string            `json:"sha256"`
	Version string            `json:"version"`
	Results []json.RawMessage `json:"results"`
}

// Data gives the results as one JSON object, without any < or >, so that it can stand in
// a page.
func (d *Document) Data() []byte {
	k := kept{Format: dataFormat, File: d.File, Hash: d.Hash, Version: d.Version, Results: []json.RawMessage{}}
	for _, e := range d.run.Events {
		if line := render.JSON(e, d.run.Source); line != nil {
			k.Results = append(k.Results, bytes.TrimSpace(line))
		}
	}
	var b bytes.Buffer
	if err := json.NewEncoder(&b).Encode(k); err != nil { // escapes <, > and & also in what was encoded already
		return []byte(`{"format":0}`)
	}
	return bytes.TrimSpace(b.Bytes())
}
