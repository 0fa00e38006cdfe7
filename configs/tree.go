package configs

import "strings"

// tree is the resolved scenario as it is written: keys in the format's order.
type tree struct {
	keys     []string
	values   []string // a scalar, or "" where branches has the key
	branches map[string]*tree
	items    []*tree // of a list
}

func (t *tree) put(key, value string) {
	if t != nil {
		t.keys, t.values = append(t.keys, key), append(t.values, value)
	}
}

// branch returns the mapping under a new key.
func (t *tree) branch(key string) *tree {
	if t == nil {
		return nil
	}
	t.put(key, "")
	if t.branches == nil {
		t.branches = map[string]*tree{}
	}
	sub := new(tree)
	t.branches[key] = sub
	return sub
}

// write appends the tree as YAML.
func (t *tree) write(b *strings.Builder, indent string) {
	for i, k := range t.keys {
		sub := t.branches[k]
		b.WriteString(indent + k + ":")
		switch {
		case sub == nil:
			b.WriteString(" " + t.values[i] + "\n")
		case len(sub.items) > 0:
			b.WriteString("\n")
			for _, item := range sub.items {
				var e strings.Builder
				item.write(&e, indent+"    ")
				b.WriteString(indent + "  - " + strings.TrimPrefix(e.String(), indent+"    "))
			}
		case len(sub.keys) == 0:
			b.WriteString(" {}\n")
		default:
			b.WriteString("\n")
			sub.write(b, indent+"  ")
		}
	}
}
