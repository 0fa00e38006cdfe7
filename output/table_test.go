package output

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// sample is a small table with everything that is hard about one.
func sample() *Table {
	t := NewTable("summary")
	t.Provenance = map[string]string{"seed": "7"}
	t.Notes = []string{"the grid's top binds"}
	group := t.AddString("group", "", "who")
	age := t.AddInt("age", "year", "when")
	level := t.AddFloat("level", "", "percentile")
	estimate := t.AddFloat("estimate", "crown", "the number")
	for i, g := range []string{"dockers", "a \"b\", c", "", "two\r\nlines\n", " pad ", "=1+2"} {
		group.AppendString(g)
		age.AppendInt(int64(25 + i))
		level.AppendFloat(float64(i) / 100)
		if i == 2 {
			estimate.AppendMissing()
		} else {
			estimate.AppendFloat([]float64{1234567.891, math.NaN(), 0, math.Inf(-1), math.Copysign(0, -1), 1e-300}[i])
		}
	}
	group.AppendMissing()
	age.AppendMissing()
	level.AppendMissing()
	estimate.AppendFloat(math.MaxFloat64)
	return t
}

// sameColumns compares values bit by bit, missing ones as missing.
func sameColumns(t interface{ Fatalf(string, ...any) }, got, want *Table) {
	if len(got.Columns) != len(want.Columns) || got.Len() != want.Len() {
		t.Fatalf("%d columns of %d rows, want %d of %d", len(got.Columns), got.Len(), len(want.Columns), want.Len())
	}
	for j, w := range want.Columns {
		g := got.Columns[j]
		if g.Name != w.Name || g.Kind != w.Kind || g.Unit != w.Unit || g.Meaning != w.Meaning {
			t.Fatalf("column %d is %s %s, want %s %s", j, g.Kind, g.Name, w.Kind, w.Name)
		}
		for i := range w.Len() {
			if g.IsMissing(i) != w.IsMissing(i) {
				t.Fatalf("%s row %d missing: %v, want %v", w.Name, i, g.IsMissing(i), w.IsMissing(i))
			}
			if w.IsMissing(i) {
				continue
			}
			switch w.Kind {
			case String:
				if g.Strings[i] != w.Strings[i] {
					t.Fatalf("%s row %d is %q, want %q", w.Name, i, g.Strings[i], w.Strings[i])
				}
			case Int:
				if g.Ints[i] != w.Ints[i] {
					t.Fatalf("%s row %d is %d, want %d", w.Name, i, g.Ints[i], w.Ints[i])
				}
			case Float:
				a, b := g.Floats[i], w.Floats[i]
				if math.Float64bits(a) != math.Float64bits(b) && !(math.IsNaN(a) && math.IsNaN(b)) {
					t.Fatalf("%s row %d is %v, want %v", w.Name, i, a, b)
				}
			}
		}
	}
}

func TestTableText(t *testing.T) {
	var b strings.Builder
	if err := sample().WriteText(&b); err != nil {
		t.Fatal(err)
	}
	// derived: by hand from WriteText's rules
	want := strings.Join([]string{
		`group            age  level      estimate`,
		`                year                crown`,
		`dockers           25      0       1234570`,
		`a "b", c          26   0.01           NaN`,
		`                  27   0.02             -`,
		`two\r\nlines\n    28   0.03          -Inf`,
		` pad              29   0.04            -0`,
		`=1+2              30   0.05        1e-300`,
		`-                  -      -  1.79769e+308`,
		`note: the grid's top binds`, ``}, "\n")
	if got := b.String(); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

func TestRoundedText(t *testing.T) {
	for _, tt := range []struct {
		v      float64
		digits int
		want   string
	}{
		{25000, 6, "25000"}, {25000.04, 6, "25000"}, {25000.06, 6, "25000.1"}, {0.0004, 3, "0.0004"},
		{999999.6, 6, "1000000"}, {-1.5, 1, "-2"}, {1e15, 6, "1e+15"}, {999e12, 3, "999000000000000"},
		{1e-5, 6, "0.00001"}, {9.9e-6, 6, "9.9e-06"}, {0, 6, "0"}, {math.Inf(1), 6, "Inf"},
	} {
		if got := roundedText(tt.v, tt.digits); got != tt.want {
			t.Errorf("%v to %d digits is %s, want %s", tt.v, tt.digits, got, tt.want)
		}
	}
}

func TestPrintable(t *testing.T) {
	for in, want := range map[string]string{
		"Größe \"x\"": "Größe \"x\"", "a\tb": `a\tb`, "\x1b[31mred": `\x1b[31mred`, "bad \xff": `bad \xff`, `back\slash`: `back\slash`,
	} {
		if got := printable(in); got != want {
			t.Errorf("printable(%q) = %q, want %q", in, got, want)
		}
	}
}

func TestTableCSV(t *testing.T) {
	var b bytes.Buffer
	table := sample()
	if err := table.WriteCSV(&b); err != nil {
		t.Fatal(err)
	}
	// derived: by hand from RFC 4180, section 2, with bare line feeds
	want := "group,age,level,estimate\n" +
		"dockers,25,0,1234567.891\n" +
		"\"a \"\"b\"\", c\",26,0.01,NaN\n" +
		"\"\",27,0.02,\n" +
		"\"two\r\nlines\n\",28,0.03,-Inf\n" +
		"\" pad \",29,0.04,-0\n" +
		"=1+2,30,0.05,1e-300\n" +
		",,,1.7976931348623157e+308\n"
	if b.String() != want {
		t.Errorf("got\n%q\nwant\n%q", b.String(), want)
	}
	records, err := csv.NewReader(bytes.NewReader(b.Bytes())).ReadAll()
	if err != nil || len(records) != table.Len()+1 || records[2][0] != `a "b", c` {
		t.Errorf("the standard library reads %q (%v)", records, err)
	}
	back, err := ReadCSV(&b, table)
	if err != nil {
		t.Fatal(err)
	}
	sameColumns(t, back, table)
}

func TestReadCSVErrors(t *testing.T) {
	like := NewTable("x")
	like.AddInt("a", "", "")
	like.AddString("b", "", "")
	for _, tt := range []struct{ name, text, want string }{
		{"wrong name", "a,c\n", `line 1: column 2 is "c", want "b"`},
		{"too few cells", "a,b\n1,x\n2\n", "line 3: want 2 cells"},
		{"too many cells", "a,b\n1,x,y\n", "line 2: want 2 cells"},
		{"not a number", "a,b\n1,\"x\ny\"\nz,q\n", "line 4: column a: strconv.ParseInt"},
		{"open quote", "a,b\n1,\"x\n", "line 2: a quote is never closed"},
		{"text after a quote", "a,b\n1,\"x\"y\n", "line 2: a quote or carriage return"},
		{"quote within text", "a,b\n1,x\"y\n", "line 2: a quote or carriage return"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := ReadCSV(strings.NewReader(tt.text), like); err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
		})
	}
	got, err := ReadCSV(strings.NewReader("a,b\r\n1,x\r\n,"), like) // as a spreadsheet might save it
	if err != nil || got.Len() != 2 || got.Columns[1].Strings[0] != "x" || !got.Columns[1].IsMissing(1) {
		t.Errorf("line ends of two characters: %v", err)
	}
}

// anyTable draws a table with hostile names, strings, floats and gaps.
func anyTable(t *rapid.T) *Table {
	text := rapid.OneOf(rapid.String(), rapid.StringOf(rapid.SampledFrom([]rune("\",\r\n '\t\x00;=ä"))))
	float := rapid.OneOf(rapid.Float64(), rapid.SampledFrom([]float64{math.NaN(), math.Inf(1), math.Inf(-1), math.Copysign(0, -1), math.SmallestNonzeroFloat64, math.MaxFloat64, 0.1, 1e15, 1e-5}))
	table := NewTable("any")
	rows := rapid.IntRange(0, 20).Draw(t, "rows")
	for j := range rapid.IntRange(1, 5).Draw(t, "columns") {
		c := table.add(fmt.Sprintf("%s%d", text.Draw(t, "name"), j), "", "", Kind(rapid.IntRange(0, 2).Draw(t, "kind")))
		for range rows {
			switch {
			case rapid.IntRange(0, 4).Draw(t, "missing") == 0:
				c.AppendMissing()
			case c.Kind == String:
				c.AppendString(text.Draw(t, "string"))
			case c.Kind == Int:
				c.AppendInt(rapid.Int64().Draw(t, "int"))
			default:
				c.AppendFloat(float.Draw(t, "float"))
			}
		}
	}
	return table
}

func TestTableCSVRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		table := anyTable(t)
		var b bytes.Buffer
		if err := table.WriteCSV(&b); err != nil {
			t.Fatal(err)
		}
		back, err := ReadCSV(&b, table)
		if err != nil {
			t.Fatal(err)
		}
		sameColumns(t, back, table)
	})
}

func TestTableParquetRoundTrip(t *testing.T) {
	path := filepath.Join(t.TempDir(), "t.parquet")
	rapid.Check(t, func(t *rapid.T) {
		table := anyTable(t)
		if err := WriteFile(path, table.WriteParquet); err != nil {
			t.Fatal(err)
		}
		back, err := ReadTable(path)
		if err != nil {
			t.Fatal(err)
		}
		sameColumns(t, back, table)
	})
}

// TestTableParquet checks the footer and a table of several row groups.
func TestTableParquet(t *testing.T) {
	path := filepath.Join(t.TempDir(), "t.parquet")
	table := sample()
	if err := WriteFile(path, table.WriteParquet); err != nil {
		t.Fatal(err)
	}
	back, err := ReadTable(path)
	if err != nil {
		t.Fatal(err)
	}
	sameColumns(t, back, table)
	if back.Name != "summary" || !reflect.DeepEqual(back.Notes, table.Notes) || !reflect.DeepEqual(back.Provenance, table.Provenance) {
		t.Errorf("read back %s, notes %q, provenance %v", back.Name, back.Notes, back.Provenance)
	}
	large := PolicyTable("crown", false, false)
	for i := range tableRowGroup + 5 {
		for _, c := range large.Columns {
			switch c.Kind {
			case String:
				c.AppendString([]string{"dockers", "clerks"}[i%2])
			case Int:
				c.AppendInt(int64(i))
			case Float:
				c.AppendFloat(math.Sqrt(float64(i)))
			}
		}
	}
	var first, second bytes.Buffer
	if err := large.WriteParquet(&first); err != nil {
		t.Fatal(err)
	}
	if err := large.WriteParquet(&second); err != nil || !bytes.Equal(first.Bytes(), second.Bytes()) {
		t.Errorf("the same table twice gives other bytes (%v)", err)
	}
	if err := os.WriteFile(path, first.Bytes(), 0o666); err != nil {
		t.Fatal(err)
	}
	if back, err = ReadTable(path); err != nil {
		t.Fatal(err)
	}
	sameColumns(t, back, large)
}

func TestTableJSON(t *testing.T) {
	var b bytes.Buffer
	if err := sample().WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var got struct {
		Name    string
		Notes   []string
		Columns []struct{ Name, Kind, Unit, Meaning string }
		Rows    []map[string]any
	}
	if err := json.Unmarshal(b.Bytes(), &got); err != nil {
		t.Fatalf("%v in\n%s", err, b.String())
	}
	if got.Name != "summary" || len(got.Notes) != 1 || len(got.Columns) != 4 || len(got.Rows) != 7 {
		t.Errorf("got %+v", got)
	}
	if c := got.Columns[3]; c.Name != "estimate" || c.Kind != "float" || c.Unit != "crown" || c.Meaning != "the number" {
		t.Errorf("column is %+v", c)
	}
	for i, want := range []any{1234567.891, "NaN", nil, "-Inf", math.Copysign(0, -1), 1e-300, math.MaxFloat64} {
		if v := got.Rows[i]["estimate"]; v != want {
			t.Errorf("row %d: estimate is %v, want %v", i, v, want)
		}
	}
	if got.Rows[3]["group"] != "two\r\nlines\n" || got.Rows[6]["age"] != nil || got.Rows[5]["age"] != 30.0 {
		t.Errorf("rows are %v", got.Rows)
	}
}

func TestTableValidate(t *testing.T) {
	table := sample()
	table.Columns[1].Ints = table.Columns[1].Ints[1:]
	table.Columns[3].Name = "group"
	err := table.Validate()
	if err == nil || !strings.Contains(err.Error(), "column age has 6 rows") || !strings.Contains(err.Error(), `name "group" is empty or taken`) ||
		!strings.Contains(err.Error(), "column age has 7 marks") {
		t.Errorf("error is %v, want all faults", err)
	}
	var b bytes.Buffer
	for _, write := range []error{table.WriteText(&b), table.WriteCSV(&b), table.WriteJSON(&b), table.WriteParquet(&b)} {
		if write == nil || b.Len() != 0 {
			t.Errorf("a renderer takes the table: %v, %d bytes", write, b.Len())
		}
	}
	if err := NewTable("none").Validate(); err == nil {
		t.Error("a table without columns is valid")
	}
	defer func() {
		if recover() == nil {
			t.Error("a string column takes a number")
		}
	}()
	sample().Column("group").AppendFloat(1)
}
