package configs

import (
	"embed"
	"fmt"
	"slices"
	"strings"
)

//go:embed scenarios stresses data
var shipped embed.FS

// Default is the scenario of a run that names none.
const Default = "quayside"

// Names returns the built-in scenarios, the default first.
func Names() []string {
	names := shippedNames("scenarios")
	slices.SortFunc(names, func(a, b string) int {
		if (a == Default) != (b == Default) {
			if a == Default {
				return -1
			}
			return 1
		}
		return strings.Compare(a, b)
	})
	return names
}

// Source returns a built-in scenario as it is written, comments and all.
func Source(name string) ([]byte, error) {
	data, err := shipped.ReadFile("scenarios/" + name + ".yaml")
	if err != nil {
		return nil, &PosError{File: name, Message: fmt.Sprintf("is not a built-in scenario; there are %s%s", strings.Join(Names(), ", "), suggest(name, Names()))}
	}
	return data, nil
}

// shippedPrefix marks the name of a table that ships with the program, wherever
// the scenario is.
const shippedPrefix = "builtin:"

func isShipped(name string) bool { return strings.HasPrefix(name, shippedPrefix) }

// shippedTable reads a table that ships with the program.
func shippedTable(name string) (data []byte, shown string, err error) {
	base, ok := strings.CutPrefix(name, shippedPrefix)
	if !ok {
		return nil, name, fmt.Errorf("this scenario is in no folder; only tables named %s… can be read", shippedPrefix)
	}
	data, err = shipped.ReadFile("data/" + base)
	if err != nil {
		return nil, name, fmt.Errorf("no table of that name ships with the program")
	}
	return data, name, nil
}
