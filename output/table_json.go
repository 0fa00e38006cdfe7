package output

import (
	"bufio"
	"encoding/json"
	"io"
	"math"
	"strconv"
)

// WriteJSON renders the table as one object: name, notes, provenance, columns
// (name, kind, unit, meaning) and rows, each an object with the columns in
// order. A missing value is null. JSON has no NaN or infinity, so those are the
// strings "NaN", "Inf" and "-Inf".
func (t *Table) WriteJSON(w io.Writer) error {
	if err := t.Validate(); err != nil {
		return err
	}
	type column struct {
		Name    string `json:"name"`
		Kind    string `json:"kind"`
		Unit    string `json:"unit"`
		Meaning string `json:"meaning"`
	}
	columns := make([]column, len(t.Columns))
	for j, c := range t.Columns {
		columns[j] = column{c.Name, c.Kind.String(), c.Unit, c.Meaning}
	}
	b := bufio.NewWriterSize(w, 1<<16)
	// A bufio.Writer keeps the first error.
	put := func(p []byte) { _, _ = b.Write(p) }
	put([]byte(`{"name":`))
	put(jsonText(t.Name))
	if len(t.Provenance) > 0 {
		put([]byte(`,"provenance":`))
		put(jsonText(t.Provenance)) // maps are written in order of their keys
	}
	if len(t.Notes) > 0 {
		put([]byte(`,"notes":`))
		put(jsonText(t.Notes))
	}
	put([]byte(`,"columns":`))
	put(jsonText(columns))
	put([]byte(`,"rows":[`))
	names := make([][]byte, len(t.Columns))
	for j, c := range t.Columns {
		names[j] = append(jsonText(c.Name), ':')
	}
	for i := range t.Len() {
		sep := "\n{"
		if i > 0 {
			sep = ",\n{"
		}
		for j, c := range t.Columns {
			put([]byte(sep))
			put(names[j])
			put(c.json(i))
			sep = ","
		}
		put([]byte{'}'})
	}
	put([]byte("\n]}\n"))
	return b.Flush()
}

// json returns value i as JSON.
func (c *Column) json(i int) []byte {
	switch {
	case c.IsMissing(i):
		return []byte("null")
	case c.Kind == String:
		return jsonText(c.Strings[i])
	case c.Kind == Int:
		return strconv.AppendInt(nil, c.Ints[i], 10)
	}
	v := c.Floats[i]
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return jsonText(floatText(v))
	}
	return []byte(floatText(v))
}

// jsonText marshals what cannot fail.
func jsonText(v any) []byte {
	b, err := json.Marshal(v)
	if err != nil {
		panic("output: " + err.Error())
	}
	return b
}
