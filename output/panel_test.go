package output

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"strings"
	"sync"
	"testing"
)

// generated is a small panel of made-up households, by household and age, and
// cut into units the way a simulation hands them over.
type generated struct {
	o     PanelOptions
	ages  int32
	units []Rows
}

func testOptions(households int64) PanelOptions {
	return PanelOptions{To: households, Unit: 64, Block: 256, Groups: []string{"dockers", "clerks"},
		Currency: "crown", Provenance: map[string]string{"seed": "7", "scenario_sha256": "abc"}, Workers: 1}
}

// generate makes units whose rows are in order of age; household id dies at an
// age that depends on id alone.
func generate(o PanelOptions) *generated {
	g := &generated{o: o, ages: 12}
	for first := o.From; first < o.To; first += int64(o.Unit) {
		g.units = append(g.units, g.unit(first))
	}
	return g
}

func (g *generated) years(id int64) int32 { return 1 + int32(id*7%int64(g.ages)) }

func (g *generated) unit(first int64) Rows {
	r := Rows{First: first, Households: int(min(int64(g.o.Unit), g.o.To-first))}
	starts := make([]int32, r.Households+1)
	for h := range r.Households {
		starts[h+1] = starts[h] + g.years(first+int64(h))
	}
	for t := range g.ages {
		for group := range g.o.Groups { // rows of an age are sorted by group
			s := Span{Age: 25 + t, Group: group, From: r.N}
			for h := range r.Households {
				id := first + int64(h)
				if int(id)%len(g.o.Groups) != group || t >= g.years(id) {
					continue
				}
				g.append(&r, id, t)
				r.Position = append(r.Position, starts[h]+t)
			}
			s.To = r.N
			r.Spans = append(r.Spans, s)
		}
	}
	return r
}

func (g *generated) append(r *Rows, id int64, t int32) {
	rng := rand.New(rand.NewPCG(uint64(id), uint64(t)))
	r.N++
	r.Household = append(r.Household, id)
	r.Persistent = append(r.Persistent, float64(rng.IntN(7))*0.31-0.93)
	r.Transitory = append(r.Transitory, rng.NormFloat64())
	r.Employed = append(r.Employed, rng.Float64() > 0.1)
	for i, c := range []*[]float64{&r.Earnings, &r.Pension, &r.Taxes, &r.Income, &r.CashOnHand, &r.Consumption, &r.Assets} {
		*c = append(*c, math.Exp(float64(i)+rng.NormFloat64()))
	}
	r.Died = append(r.Died, t == g.years(id)-1)
}

// write writes the units from o.From on with the workers of o, committing in
// order, and returns the error of the first call that fails.
func write(dir string, o PanelOptions, units []Rows) error {
	p, err := NewPanel(dir, o)
	if err != nil {
		return err
	}
	type result struct {
		commit func() error
		err    error
	}
	results := make([]chan result, len(units))
	for i := range results {
		results[i] = make(chan result, 1)
	}
	var wg sync.WaitGroup
	defer wg.Wait()
	for w := range o.Workers {
		wg.Go(func() {
			for i := w; i < len(units); i += o.Workers {
				commit, err := p.Encode(w, units[i])
				results[i] <- result{commit, err}
			}
		})
	}
	for _, c := range results {
		r := <-c
		if r.err == nil {
			r.err = r.commit()
		}
		if r.err != nil {
			return errors.Join(r.err, p.Abort())
		}
	}
	return p.Close()
}

// files returns the contents of the files in dir, by name.
func files(t *testing.T, dir string) map[string][]byte {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	m := map[string][]byte{}
	for _, e := range entries {
		if m[e.Name()], err = os.ReadFile(filepath.Join(dir, e.Name())); err != nil {
			t.Fatal(err)
		}
	}
	return m
}

var panelNames = []string{"household", "group", "age", "persistent", "transitory", "employed", "earnings", "pension",
	"taxes", "income", "cash_on_hand", "consumption", "assets", "died"}

// TestPanelReadsBack writes a panel and reads every value of it.
func TestPanelReadsBack(t *testing.T) {
	for _, precision := range []Precision{Double, Single} {
		t.Run(precision.String(), func(t *testing.T) {
			o := testOptions(300)
			o.Precision = precision
			g, dir := generate(o), t.TempDir()
			if err := write(dir, o, g.units); err != nil {
				t.Fatal(err)
			}
			unit := 0
			err := ReadPanel(dir, panelNames, func(got *Table) error {
				checkUnit(t, got, &g.units[unit], o)
				unit++
				return nil
			})
			if err != nil || unit != len(g.units) {
				t.Errorf("read %d units of %d: %v", unit, len(g.units), err)
			}
		})
	}
}

// checkUnit compares a unit read from a file with the rows it was made from, in
// the order household, age that Position says.
func checkUnit(t *testing.T, got *Table, r *Rows, o PanelOptions) {
	t.Helper()
	if got.Len() != r.N {
		t.Fatalf("%d rows, want %d", got.Len(), r.N)
	}
	flag := map[bool]int64{true: 1}
	for _, s := range r.Spans {
		for k := s.From; k < s.To; k++ {
			i := r.Position[k]
			for j, want := range []any{r.Household[k], o.Groups[s.Group], int64(s.Age), r.Persistent[k], r.Transitory[k],
				flag[r.Employed[k]], r.Earnings[k], r.Pension[k], r.Taxes[k], r.Income[k], r.CashOnHand[k],
				r.Consumption[k], r.Assets[k], flag[r.Died[k]]} {
				c := got.Columns[j]
				var v any
				switch c.Kind {
				case String:
					v = c.Strings[i]
				case Int:
					v = c.Ints[i]
				case Float:
					v = c.Floats[i]
					if o.Precision == Single {
						want = float64(float32(want.(float64)))
					}
				}
				if v != want {
					t.Fatalf("unit from %d, row %d: %s = %v, want %v", r.First, i, c.Name, v, want)
				}
			}
		}
	}
}

// TestPanelBytes checks the invariant of the package: neither the number of
// workers nor an interruption shows in the bytes.
func TestPanelBytes(t *testing.T) {
	o := testOptions(1000)
	g := generate(o)
	var want map[string][]byte
	for _, workers := range []int{1, 2, 5} {
		o.Workers = workers
		dir := t.TempDir()
		if err := write(dir, o, g.units); err != nil {
			t.Fatal(err)
		}
		got := files(t, dir)
		if want == nil {
			want = got
			if len(want) != 4 {
				t.Errorf("%d files, want 4 (derived: 1000 households in blocks of 256)", len(want))
			}
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("%d workers write other bytes than 1", workers)
		}
	}
	// Interrupted after 9 of 16 units, that is within the third part.
	dir := t.TempDir()
	if err := write(dir, o, g.units[:9]); err == nil || !strings.Contains(err.Error(), "576") {
		t.Errorf("closing with 576 households of 1000 gives %v", err)
	}
	if names := files(t, dir); len(names) != 2 || names[PartName(0)] == nil || names[PartName(1)] == nil {
		t.Errorf("interrupted: %d files, want the two whole parts", len(names))
	}
	from, err := o.Resume(dir)
	if err != nil || from != 512 {
		t.Fatalf("resumes from %d (%v), want 512", from, err)
	}
	o.From = from
	if err := write(dir, o, g.units[8:]); err != nil {
		t.Fatal(err)
	}
	if got := files(t, dir); !reflect.DeepEqual(got, want) {
		t.Error("continued panel has other bytes than one written at once")
	}
	o.From = 0
	if from, err := o.Resume(dir); err != nil || from != 1000 {
		t.Errorf("a whole panel resumes from %d (%v), want 1000", from, err)
	}
	o.From = 1000
	if err := write(dir, o, nil); err != nil {
		t.Errorf("nothing left to do: %v", err)
	}
	o.From, o.Provenance = 0, map[string]string{"seed": "8", "scenario_sha256": "abc"}
	if _, err := o.Resume(dir); err == nil || !strings.Contains(err.Error(), "seed differs") {
		t.Errorf("resuming over another seed's parts gives %v", err)
	}
}

func TestPanelMetadata(t *testing.T) {
	o := testOptions(300)
	dir := t.TempDir()
	if err := write(dir, o, generate(o).units); err != nil {
		t.Fatal(err)
	}
	parts, err := Finished(dir)
	if err != nil || len(parts) != 2 {
		t.Fatalf("%d parts (%v), want 2", len(parts), err)
	}
	last := parts[1]
	if last.Index != 1 || last.First != 256 || last.Households != 44 {
		t.Errorf("last part is %d with %d households from %d, want 1, 44, 256", last.Index, last.Households, last.First)
	}
	for k, want := range map[string]string{"seed": "7", "scenario_sha256": "abc", "column.assets.unit": "crown",
		"column.income.unit": "crown a year", "column.age.unit": "year", "panel.block": "256", "panel.precision": "double"} {
		if got := last.Metadata[k]; got != want {
			t.Errorf("footer says %s = %q, want %q", k, got, want)
		}
	}
	for _, name := range panelNames {
		if last.Metadata["column."+name+".meaning"] == "" {
			t.Errorf("column %s has no meaning in the footer", name)
		}
	}
	s, err := OpenParquet(last.Path)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	if !reflect.DeepEqual(s.Names(), panelNames) {
		t.Errorf("columns are %v, want %v", s.Names(), panelNames)
	}
}

// TestPanelRefuses checks that values and rows which would spoil a file are
// refused, that the error names the place, and that no part file appears.
func TestPanelRefuses(t *testing.T) {
	k := func(r *Rows, id int64, age int32) int { // row of a household and age
		for _, s := range r.Spans {
			for k := s.From; k < s.To; k++ {
				if s.Age == age && r.Household[k] == id {
					return k
				}
			}
		}
		panic("no such row")
	}
	tests := []struct {
		name      string
		precision Precision
		spoil     func(r *Rows)
		want      string
	}{
		{"NaN", Double, func(r *Rows) { r.Assets[k(r, 131, 27)] = math.NaN() }, "assets of household 131 at age 27 is NaN"},
		{"infinite", Double, func(r *Rows) { r.Taxes[k(r, 129, 25)] = math.Inf(-1) }, "taxes of household 129 at age 25 is -Inf"},
		{"NaN in single precision", Single, func(r *Rows) { r.Income[k(r, 131, 26)] = math.NaN() }, "income of household 131 at age 26 is NaN"},
		{"too large for single precision", Single, func(r *Rows) { r.Income[k(r, 131, 26)] = 1e39 }, "income of household 131 at age 26 is 1e+39"},
		{"first of two in household order", Double, func(r *Rows) {
			r.Assets[k(r, 140, 25)], r.Assets[k(r, 131, 28)] = math.NaN(), math.NaN()
		}, "assets of household 131 at age 28"},
		{"short column", Double, func(r *Rows) { r.Consumption = r.Consumption[:r.N-1] }, "column consumption has"},
		{"place taken twice", Double, func(r *Rows) { r.Position[5] = r.Position[6] }, "want consecutive years and households"},
		{"place beyond the end", Double, func(r *Rows) { r.Position[5] = int32(r.N) }, "has place"},
		{"swapped households", Double, func(r *Rows) { r.Household[0], r.Household[1] = r.Household[1], r.Household[0] }, "want consecutive"},
		{"gap in ages", Double, func(r *Rows) { r.Spans[len(r.Spans)-1].Age++; r.Spans[len(r.Spans)-2].Age++ }, "want consecutive"},
		{"unknown group", Double, func(r *Rows) { r.Spans[0].Group = 2 }, "group 2 of 2"},
		{"spans leave a gap", Double, func(r *Rows) { r.Spans[1].From++ }, "span of rows"},
		{"last span is absent", Double, func(r *Rows) { r.Spans = r.Spans[:len(r.Spans)-1] }, "spans cover"},
		{"too few households", Double, func(r *Rows) { r.Households-- }, "63 households, want 64"},
		{"first household off the unit", Double, func(r *Rows) { r.First++ }, "want a start at a multiple of 64"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			o := testOptions(300)
			o.Precision = tt.precision
			g, dir := generate(o), t.TempDir()
			tt.spoil(&g.units[2]) // households 128 to 191
			err := write(dir, o, g.units)
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if left := files(t, dir); len(left) != 0 {
				t.Errorf("%d files left behind", len(left))
			}
		})
	}
}

func TestPanelCommitOrder(t *testing.T) {
	o, dir := testOptions(300), t.TempDir()
	g := generate(o)
	p, err := NewPanel(dir, o)
	if err != nil {
		t.Fatal(err)
	}
	commits := make([]func() error, 3)
	for i := range commits {
		if commits[i], err = p.Encode(0, g.units[i]); err != nil {
			t.Fatal(err)
		}
	}
	if err := commits[0](); err != nil {
		t.Fatal(err)
	}
	if err := commits[2](); err == nil || !strings.Contains(err.Error(), "households from 128 committed where 64 were due") {
		t.Errorf("commit out of order gives %v", err)
	}
	if err := commits[1](); err == nil {
		t.Error("a panel goes on after an error")
	}
	if err := p.Close(); err == nil {
		t.Error("a failed panel closes without an error")
	}
	if left := files(t, dir); len(left) != 0 {
		t.Errorf("%d files left behind", len(left))
	}
}

// TestPanelMemory writes 60 parts: what the panel holds on to after the last is
// no more than after the tenth, give or take a part's buffers.
func TestPanelMemory(t *testing.T) {
	o := testOptions(60 * 64)
	o.Block = 64
	g := generate(o)
	p, err := NewPanel(t.TempDir(), o)
	if err != nil {
		t.Fatal(err)
	}
	held := func() int64 {
		var m runtime.MemStats
		runtime.GC()
		runtime.ReadMemStats(&m)
		return int64(m.HeapAlloc)
	}
	var early int64
	for i, u := range g.units {
		commit, err := p.Encode(0, u)
		if err == nil {
			err = commit()
		}
		if err != nil {
			t.Fatal(err)
		}
		if i == 9 {
			early = held()
		}
	}
	if late := held(); late-early > 8<<20 {
		t.Errorf("holds %d bytes after 10 parts and %d after 60", early, late)
	}
	if err := p.Close(); err != nil {
		t.Fatal(err)
	}
}

// TestFinishedParts checks what counts as a whole part when the folder is not as
// a run left it.
func TestFinishedParts(t *testing.T) {
	o, dir := testOptions(1000), t.TempDir()
	if err := write(dir, o, generate(o).units); err != nil {
		t.Fatal(err)
	}
	part := func(k int64) string { return filepath.Join(dir, PartName(k)) }
	for _, name := range []string{"part-1.parquet", "part-00001.csv", "parts.parquet", ".part-00009.parquet.1-0.partial"} {
		if err := os.WriteFile(filepath.Join(dir, name), nil, 0o666); err != nil {
			t.Fatal(err)
		}
	}
	if parts, err := Finished(dir); err != nil || len(parts) != 4 {
		t.Errorf("%d parts (%v), want 4", len(parts), err)
	}
	if err := os.Remove(part(1)); err != nil {
		t.Fatal(err)
	}
	if from, err := o.Resume(dir); err != nil || from != 256 {
		t.Errorf("with the second part gone, resumes from %d (%v), want 256", from, err)
	}
	if err := os.Rename(part(2), part(1)); err != nil {
		t.Fatal(err)
	}
	if _, err := Finished(dir); err == nil || !strings.Contains(err.Error(), "holds 256 households from 512") {
		t.Errorf("a renamed part gives %v", err)
	}
	if err := os.Truncate(part(1), 1000); err != nil {
		t.Fatal(err)
	}
	if _, err := Finished(dir); err == nil || !strings.Contains(err.Error(), PartName(1)) {
		t.Errorf("a part cut short gives %v", err)
	}
	if parts, err := Finished(filepath.Join(dir, "absent")); err != nil || len(parts) != 0 {
		t.Errorf("an absent folder gives %v, %v", parts, err)
	}
}

// TestReadDamaged flips bits in a part: reading it may succeed or fail, but
// never takes the program down, and never returns too few values.
func TestReadDamaged(t *testing.T) {
	o, dir := testOptions(64), t.TempDir()
	g := generate(o)
	if err := write(dir, o, g.units); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(dir, PartName(0))
	whole, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	damage := func(at int, bits byte) {
		damaged := append([]byte(nil), whole...)
		damaged[at] ^= bits
		if err := os.WriteFile(path, damaged, 0o666); err != nil {
			t.Fatal(err)
		}
	}
	footer := len(whole) - 8 - int(binary.LittleEndian.Uint32(whole[len(whole)-8:]))
	failed := 0
	for at := 4; at < footer; at += 97 {
		damage(at, 0xff)
		err := ReadPanel(dir, panelNames, func(u *Table) error {
			for _, c := range u.Columns {
				if c.Len() != g.units[0].N {
					t.Errorf("byte %d damaged: column %s has %d values, want %d", at, c.Name, c.Len(), g.units[0].N)
				}
			}
			return nil
		})
		if err != nil {
			failed++
		}
	}
	if failed == 0 {
		t.Error("no damage to the pages was noticed")
	}
	if testing.Short() {
		return
	}
	panicked := 0
	for at := footer; at < len(whole); at++ {
		damage(at, 1)
		s, err := OpenParquet(path)
		if err == nil {
			err = s.Close()
		}
		if err != nil && strings.Contains(err.Error(), "damaged: runtime error") {
			panicked++
		}
	}
	if panicked == 0 {
		t.Error("the library no longer panics on a damaged footer: rescue may go")
	}
}

// TestPanelAbort interrupts a part half-way: its temporary file exists before
// and nothing after.
func TestPanelAbort(t *testing.T) {
	o, dir := testOptions(300), t.TempDir()
	g := generate(o)
	p, err := NewPanel(dir, o)
	if err != nil {
		t.Fatal(err)
	}
	commit, err := p.Encode(0, g.units[0])
	if err == nil {
		err = commit()
	}
	if err != nil {
		t.Fatal(err)
	}
	for name := range files(t, dir) {
		if !isTemporary(name) {
			t.Errorf("file %s appears before it is whole", name)
		}
	}
	if parts, err := Finished(dir); err != nil || len(parts) != 0 {
		t.Errorf("an unfinished part counts as finished: %v %v", parts, err)
	}
	if err := p.Abort(); err != nil {
		t.Fatal(err)
	}
	if left := files(t, dir); len(left) != 0 {
		t.Errorf("%d files left behind", len(left))
	}
	if _, err := p.Encode(0, g.units[1]); err == nil {
		t.Error("a panel given up takes rows")
	}
}

func TestPanelOptionsValidate(t *testing.T) {
	tests := []struct {
		name   string
		change func(o *PanelOptions)
		want   string
	}{
		{"block not a multiple of the unit", func(o *PanelOptions) { o.Block = 100 }, "block is 100 households, want a positive multiple of 64"},
		{"block zero", func(o *PanelOptions) { o.Block = 0 }, "block is 0"},
		{"start within a block", func(o *PanelOptions) { o.From = 64 }, "first household is 64, want a multiple of the block, 256"},
		{"ends before it starts", func(o *PanelOptions) { o.From = 512 }, "households end at 300"},
		{"too many row groups", func(o *PanelOptions) { o.Block = 64 * 32768 }, "32767 row groups"},
		{"no groups", func(o *PanelOptions) { o.Groups = nil }, "no groups"},
		{"no workers", func(o *PanelOptions) { o.Workers = 0 }, "workers is 0"},
		{"precision", func(o *PanelOptions) { o.Precision = 2 }, "precision is 2"},
		{"provenance hides a unit", func(o *PanelOptions) { o.Provenance = map[string]string{"column.age.unit": "x"} }, `"column.age.unit" is empty or taken`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			o := testOptions(300)
			tt.change(&o)
			if _, err := NewPanel(t.TempDir(), o); err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
		})
	}
	o := testOptions(300)
	o.Block, o.Workers = 65, 0
	if err := o.Validate(); err == nil || len(strings.Split(err.Error(), "\n")) != 2 {
		t.Errorf("two faults give %v", err)
	}
	if got := fmt.Sprint(PartName(7), " ", PartName(123456)); got != "part-00007.parquet part-123456.parquet" {
		t.Errorf("part names are %s", got)
	}
}
