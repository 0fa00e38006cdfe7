package configs

import (
	"bytes"
	"encoding/json"
	"math"
)

// schema is a JSON Schema (draft 2020-12) in the making. A nil schema records
// nothing.
type schema struct {
	keys       []string
	properties map[string]any
	required   []string
}

func (d *schema) put(key string, required bool, property map[string]any) {
	if d == nil {
		return
	}
	if d.properties == nil {
		d.properties = map[string]any{}
	}
	if _, twice := d.properties[key]; !twice {
		d.keys = append(d.keys, key)
	}
	d.properties[key] = property
	if required {
		d.required = append(d.required, key)
	}
}

// rangeOf describes a number within its span.
func rangeOf(in span, kind string) map[string]any {
	p := map[string]any{"type": kind}
	if !math.IsInf(in.low, -1) {
		if in.lowOpen {
			p["exclusiveMinimum"] = in.low
		} else {
			p["minimum"] = in.low
		}
	}
	if !math.IsInf(in.high, 1) {
		if in.highOpen {
			p["exclusiveMaximum"] = in.high
		} else {
			p["maximum"] = in.high
		}
	}
	return p
}

func (d *schema) number(f number, kind string) {
	p := rangeOf(f.in, kind)
	p["description"] = f.meaning
	if !f.required {
		p["default"] = f.def
	}
	d.put(f.key, f.required, p)
}

func (d *schema) text(key, meaning, def string, required bool, most int) {
	p := map[string]any{"type": "string", "description": meaning, "maxLength": most}
	if !required {
		p["default"] = def
	}
	d.put(key, required, p)
}

func (d *schema) choice(key, meaning, def string, words []string) {
	p := map[string]any{"enum": words, "description": meaning}
	if def != "" {
		p["default"] = def
	}
	d.put(key, def == "", p)
}

func (d *schema) boolean(key, meaning string, def bool) {
	d.put(key, false, map[string]any{"type": "boolean", "description": meaning, "default": def})
}

func (d *schema) numbers(f number, def []float64, most int) {
	p := map[string]any{"type": "array", "items": rangeOf(f.in, "number"), "minItems": 1, "maxItems": most, "description": f.meaning}
	if !f.required {
		p["default"] = def
	}
	d.put(f.key, f.required, p)
}

func (d *schema) integers(f number, def []int, most int) {
	p := map[string]any{"type": "array", "items": rangeOf(f.in, "integer"), "minItems": 1, "maxItems": most, "description": f.meaning}
	if def != nil {
		p["default"] = def
	}
	d.put(f.key, f.required, p)
}

func (d *schema) words(key, meaning string, def, allowed []string) {
	d.put(key, false, map[string]any{"type": "array", "items": map[string]any{"enum": allowed}, "uniqueItems": true, "description": meaning, "default": def})
}

// section describes a mapping and returns the schema of its inside.
func (d *schema) section(key, meaning string, required bool) *schema {
	if d == nil {
		return nil
	}
	sub := new(schema)
	d.put(key, required, map[string]any{"description": meaning, "$inside": sub})
	return sub
}

// oneForm describes a value of several forms, each block by its own reading.
func (d *schema) oneForm(s *section, key, meaning string, def int, required bool, forms []form) {
	if d == nil {
		return
	}
	var any_ []any
	for _, f := range forms {
		switch {
		case f.word != "":
			any_ = append(any_, map[string]any{"const": f.word})
		case f.num != nil:
			any_ = append(any_, rangeOf(f.num.in, "number"))
		default:
			inside := new(schema)
			f.read(&section{w: &walk{faults: new(faults)}, path: join(s.path, key), doc: inside})
			any_ = append(any_, inside.object())
		}
	}
	p := map[string]any{"anyOf": any_, "description": meaning}
	if def >= 0 && def < len(forms) {
		if f := forms[def]; f.word != "" {
			p["default"] = f.word
		} else if f.num != nil && !required {
			p["default"] = f.num.def
		}
	}
	d.put(key, required, p)
}

// object is the schema as a JSON object. Keys that the format does not have are
// not allowed.
func (d *schema) object() map[string]any {
	properties := map[string]any{}
	for k, v := range d.properties {
		p, _ := v.(map[string]any)
		if inside, ok := p["$inside"].(*schema); ok {
			o := inside.object()
			o["description"] = p["description"]
			if items, ok := p["$items"]; ok && items == true {
				properties[k] = map[string]any{"type": "array", "items": o, "minItems": 1, "description": p["description"]}
				continue
			}
			properties[k] = o
			continue
		}
		properties[k] = p
	}
	o := map[string]any{"type": "object", "properties": properties, "additionalProperties": false}
	if len(d.required) > 0 {
		o["required"] = d.required
	}
	return o
}

// Schema returns the JSON Schema of the scenario format. It is made by the same
// description of the format that reads scenarios.
func Schema() []byte {
	return schemaOf("cistern scenario, format 1", func(s *section) { describe(s, nil) })
}

// StressSchema is Schema for stress files.
func StressSchema() []byte {
	return schemaOf("cistern stress, format 1", func(s *section) { describeStress(s, nil) })
}

func schemaOf(title string, describe func(*section)) []byte {
	doc := new(schema)
	describe(&section{w: &walk{faults: new(faults)}, doc: doc})
	o := doc.object()
	o["$schema"] = "https://json-schema.org/draft/2020-12/schema"
	o["title"] = title
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(o); err != nil {
		panic("configs: " + err.Error()) // plain maps of strings and numbers
	}
	return b.Bytes()
}
