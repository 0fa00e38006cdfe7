package configs

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
)

// Load reads the scenario in a file, with the overrides in place, and the tables
// it names. All faults are reported at once, each as a *PosError.
func Load(file string, overrides []Override) (*Scenario, error) {
	data, err := readBounded(file, maxScenarioBytes)
	if err != nil {
		return nil, &PosError{File: file, Message: fmt.Sprintf("cannot be read: %v", unwrapped(err))}
	}
	dir := filepath.Dir(file)
	in := newFiles(func(name string) ([]byte, string, error) {
		if isShipped(name) {
			return shippedTable(name)
		}
		if !filepath.IsAbs(name) {
			name = filepath.Join(dir, name)
		}
		data, err := readBounded(name, maxTableBytes)
		return data, name, err
	})
	name := strings.TrimSuffix(filepath.Base(file), filepath.Ext(file))
	return resolve(name, file, data, overrides, in)
}

// readBounded reads a regular file of at most a number of bytes, and a byte more
// of a longer one.
func readBounded(name string, most int) ([]byte, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, err
	}
	if info.IsDir() {
		return nil, fmt.Errorf("is a folder")
	}
	data := make([]byte, 0, min(int(info.Size())+1, most+1))
	buf := make([]byte, 32<<10)
	for len(data) <= most {
		n, err := f.Read(buf)
		data = append(data, buf[:n]...)
		if err != nil {
			break
		}
		if n == 0 {
			break
		}
	}
	return data, nil
}

// Builtin reads a scenario that ships with the program.
func Builtin(name string, overrides []Override) (*Scenario, error) {
	data, err := Source(name)
	if err != nil {
		return nil, err
	}
	in := newFiles(shippedTable)
	return resolve(name, name+".yaml", data, overrides, in)
}

// Parse reads a scenario from memory; source stands for it in errors. It can name
// no tables but those that ship with the program.
func Parse(source string, data []byte, overrides []Override) (*Scenario, error) {
	return resolve(source, source, data, overrides, newFiles(shippedTable))
}

func resolve(name, source string, data []byte, overrides []Override, in *files) (*Scenario, error) {
	root, faults := parse(source, data)
	if root == nil {
		return nil, faults.err()
	}
	if root.kind != mapping {
		faults.add(&PosError{File: source, Line: root.line, Column: root.column, Message: "is " + root.show() + ", want a scenario: keys and values, beginning with cistern: 1"})
		return nil, faults.err()
	}
	for _, o := range overrides {
		root = o.apply(root, faults)
	}
	out := new(tree)
	sc := describe(&section{w: &walk{faults: faults}, n: root, out: out}, in)
	if err := faults.err(); err != nil {
		return nil, err
	}
	sc.Name, sc.Inputs, sc.resolved = name, in.inputs, out
	return sc, nil
}

// YAML returns the scenario as resolved, every default written out. Loading it,
// with Inputs beside it, gives the same scenario.
func (sc *Scenario) YAML() []byte {
	var b strings.Builder
	b.WriteString("# The scenario as resolved: every default is written out.\n")
	sc.resolved.write(&b, "")
	return []byte(b.String())
}
