package configs

import "slices"

// discriminators are keys that say which of several forms a mapping has. An
// override that names one replaces the mapping as a whole; otherwise mappings are
// merged key by key.
var discriminators = []string{"table", "gompertz", "polynomial", "constant", "median", "mean", "family"}

// merge returns base with the settings of over in place of its own. Neither is
// changed; places in the file are kept.
func merge(base, over *node) *node {
	if over == nil {
		return base
	}
	if base == nil || base.kind != mapping || over.kind != mapping {
		return over
	}
	for _, k := range over.keys {
		if slices.Contains(discriminators, k.text) {
			return over
		}
	}
	m := *base
	m.keys, m.values = slices.Clone(base.keys), slices.Clone(base.values)
	for i, k := range over.keys {
		m.set(k, merge(base.get(k.text), over.values[i]))
	}
	return &m
}

// set puts a value under a key.
func (n *node) set(key, value *node) {
	for i, k := range n.keys {
		if k.text == key.text {
			n.keys[i], n.values[i] = key, value
			return
		}
	}
	n.keys, n.values = append(n.keys, key), append(n.values, value)
}
