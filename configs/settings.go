package configs

import (
	"fmt"
	"strings"
)

// Setting is one key of a resolved scenario.
type Setting struct {
	Key     string // dotted; groups by name, as groups.dockers.income.profile
	Value   string // as the scenario file writes it
	Meaning string // with its unit
}

// Settings lists every key of the scenario with its value, defaults included, in
// the order of the format.
func (sc *Scenario) Settings() []Setting {
	doc := new(schema)
	describe(&section{w: &walk{faults: new(faults)}, doc: doc}, nil)
	var list []Setting
	sc.resolved.settings("", []map[string]any{doc.object()}, &list)
	return list
}

// Settings lists every key of the stress, as Scenario.Settings does.
func (st *Stress) Settings() []Setting {
	doc := new(schema)
	describeStress(&section{w: &walk{faults: new(faults)}, doc: doc}, nil)
	var list []Setting
	st.resolved.settings("", []map[string]any{doc.object()}, &list)
	return list
}

// settings appends the keys of a tree; shapes are the schemas that describe it, one
// of them the right one.
func (t *tree) settings(path string, shapes []map[string]any, list *[]Setting) {
	for i, k := range t.keys {
		sub := t.branches[k]
		inside, meaning := describing(shapes, k)
		switch {
		case sub == nil:
			*list = append(*list, Setting{join(path, k), t.values[i], meaning})
		case len(sub.items) > 0:
			for n, item := range sub.items {
				item.settings(join(path, k)+"."+item.name(n), inside, list)
			}
		case len(sub.keys) == 0:
			*list = append(*list, Setting{join(path, k), "{}", meaning})
		default:
			sub.settings(join(path, k), inside, list)
		}
	}
}

// name is the name of item n of a list: its key name, or its number.
func (t *tree) name(n int) string {
	for i, k := range t.keys {
		if k == "name" {
			return strings.Trim(t.values[i], `"'`)
		}
	}
	return fmt.Sprint(n + 1)
}

// describing returns the schemas of what stands under a key, and its meaning.
func describing(shapes []map[string]any, key string) (inside []map[string]any, meaning string) {
	for _, s := range shapes {
		properties, _ := s["properties"].(map[string]any)
		p, ok := properties[key].(map[string]any)
		if !ok {
			continue
		}
		if text, ok := p["description"].(string); ok && meaning == "" {
			meaning = text
		}
		inside = append(inside, p)
		if items, ok := p["items"].(map[string]any); ok {
			inside = append(inside, items)
		}
		forms, _ := p["anyOf"].([]any)
		for _, f := range forms {
			if form, ok := f.(map[string]any); ok {
				inside = append(inside, form)
			}
		}
	}
	return inside, meaning
}
