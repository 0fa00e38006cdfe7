package interop

import (
	"database/sql"
	"fmt"
	"math"
	"math/rand/v2"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"cistern/output"

	_ "github.com/duckdb/duckdb-go/v2"
)

// row is one household and year, as it should stand in the panel.
type row struct {
	household      int64
	group          string
	age            int32
	numbers        [9]float64 // in the order of numberNames
	employed, died bool
}

var numberNames = []string{"persistent", "transitory", "earnings", "pension", "taxes", "income", "cash_on_hand", "consumption", "assets"}

var groups = []string{"dockers", "clerks", "pilots"}

const (
	households = 1000
	unit       = 128
	block      = 384 // three parts, the last one short: 384, 384, 232
	firstAge   = 25
)

// generate makes the panel's rows in the order household, age. Assets have a
// mass at zero, as they do where borrowing is limited.
func generate() []row {
	rng := rand.New(rand.NewPCG(3, 4))
	var rows []row
	for id := range int64(households) {
		years := 1 + rng.IntN(40)
		for t := range years {
			r := row{household: id, group: groups[id%3], age: firstAge + int32(t), employed: rng.IntN(20) > 0, died: t == years-1}
			for i := range r.numbers {
				r.numbers[i] = math.Exp(float64(i) + rng.NormFloat64())
			}
			r.numbers[0] = 0.4 * float64(rng.IntN(7)-3)
			r.numbers[1] = rng.NormFloat64()
			if rng.IntN(7) == 0 {
				r.numbers[8] = 0
			}
			rows = append(rows, r)
		}
	}
	return rows
}

// units hands the rows over the way a simulation does: by age, with the place
// of each in the order household, age.
func units(rows []row) []output.Rows {
	var all []output.Rows
	for lo := 0; lo < len(rows); {
		first := rows[lo].household
		hi := lo
		for hi < len(rows) && rows[hi].household < first+unit {
			hi++
		}
		u := output.Rows{First: first, Households: int(min(unit, households-first))}
		for age := int32(firstAge); age < firstAge+40; age++ {
			for g, name := range groups {
				from := u.N
				for i, r := range rows[lo:hi] {
					if r.age == age && r.group == name {
						add(&u, &r, int32(i))
					}
				}
				u.Spans = append(u.Spans, output.Span{Age: age, Group: g, From: from, To: u.N})
			}
		}
		all = append(all, u)
		lo = hi
	}
	return all
}

func add(u *output.Rows, r *row, place int32) {
	u.N++
	u.Position = append(u.Position, place)
	u.Household = append(u.Household, r.household)
	for i, c := range []*[]float64{&u.Persistent, &u.Transitory, &u.Earnings, &u.Pension, &u.Taxes, &u.Income, &u.CashOnHand, &u.Consumption, &u.Assets} {
		*c = append(*c, r.numbers[i])
	}
	u.Employed = append(u.Employed, r.employed)
	u.Died = append(u.Died, r.died)
}

// writePanel writes the rows to a new folder and returns the glob of its parts.
func writePanel(t *testing.T, rows []row, precision output.Precision) string {
	t.Helper()
	dir := t.TempDir()
	p, err := output.NewPanel(dir, output.PanelOptions{To: households, Unit: unit, Block: block, Precision: precision,
		Groups: groups, Currency: "crown", Workers: 1, Provenance: map[string]string{"seed": "7", "title": `it's "quoted"`}})
	if err != nil {
		t.Fatal(err)
	}
	for _, u := range units(rows) {
		commit, err := p.Encode(0, u)
		if err == nil {
			err = commit()
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := p.Close(); err != nil {
		t.Fatal(err)
	}
	return filepath.Join(dir, "part-*.parquet")
}

// open returns a DuckDB in memory.
func open(t *testing.T) *sql.DB {
	t.Helper()
	db, err := sql.Open("duckdb", "")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = db.Close() })
	return db
}

func query(t *testing.T, db *sql.DB, q string, args ...any) *sql.Rows {
	t.Helper()
	rows, err := db.Query(q, args...)
	if err != nil {
		t.Fatalf("%s: %v", q, err)
	}
	t.Cleanup(func() { _ = rows.Close() })
	return rows
}

// scalar returns the one value of a query.
func scalar[T any](t *testing.T, db *sql.DB, q string, args ...any) T {
	t.Helper()
	var v T
	if err := db.QueryRow(q, args...).Scan(&v); err != nil {
		t.Fatalf("%s: %v", q, err)
	}
	return v
}

// TestPanelRows reads every row in the order of the files: same rows, same
// order, same bits.
func TestPanelRows(t *testing.T) {
	for _, precision := range []output.Precision{output.Double, output.Single} {
		t.Run(precision.String(), func(t *testing.T) {
			want := generate()
			glob := writePanel(t, want, precision)
			db := open(t)
			columns := `household, "group", age, employed, died`
			for _, name := range numberNames {
				columns += ", " + name + "::DOUBLE"
			}
			got := query(t, db, "SELECT "+columns+" FROM read_parquet(?) ORDER BY filename, file_row_number", glob)
			n := 0
			for ; got.Next(); n++ {
				var r row
				dst := []any{&r.household, &r.group, &r.age, &r.employed, &r.died}
				for i := range r.numbers {
					dst = append(dst, &r.numbers[i])
				}
				if err := got.Scan(dst...); err != nil {
					t.Fatal(err)
				}
				w := want[n]
				if precision == output.Single {
					for i, v := range w.numbers {
						w.numbers[i] = float64(float32(v))
					}
				}
				if r != w {
					t.Fatalf("row %d is %+v, want %+v", n, r, w)
				}
			}
			if err := got.Err(); err != nil || n != len(want) {
				t.Errorf("%d rows, want %d (%v)", n, len(want), err)
			}
		})
	}
}

// TestPanelTypes checks names, order and types of the columns, and that none
// can be null.
func TestPanelTypes(t *testing.T) {
	glob := writePanel(t, generate(), output.Double)
	db := open(t)
	var got []string
	rows := query(t, db, "SELECT column_name, column_type FROM (DESCRIBE SELECT * FROM read_parquet(?))", glob)
	for rows.Next() {
		var name, kind string
		if err := rows.Scan(&name, &kind); err != nil {
			t.Fatal(err)
		}
		got = append(got, name+" "+kind)
	}
	want := []string{"household BIGINT", "group VARCHAR", "age INTEGER", "persistent DOUBLE", "transitory DOUBLE", "employed BOOLEAN",
		"earnings DOUBLE", "pension DOUBLE", "taxes DOUBLE", "income DOUBLE", "cash_on_hand DOUBLE", "consumption DOUBLE",
		"assets DOUBLE", "died BOOLEAN"}
	if !slices.Equal(got, want) {
		t.Errorf("columns are %q, want %q", got, want)
	}
	optional := scalar[int](t, db, "SELECT count(*) FROM parquet_schema(?) WHERE num_children IS NULL AND repetition_type <> 'REQUIRED'", glob)
	if optional != 0 {
		t.Errorf("%d columns can be null", optional)
	}
}

// TestPanelRowGroups checks the layout: one row group a unit, each column named
// in every row group, bounds that let a reader skip.
func TestPanelRowGroups(t *testing.T) {
	want := generate()
	glob := writePanel(t, want, output.Double)
	db := open(t)
	// derived: 384 households are 3 units of 128, 232 are 2
	perFile := scalar[string](t, db, `SELECT string_agg(n::VARCHAR, ' ' ORDER BY file_name) FROM
		(SELECT file_name, count(DISTINCT row_group_id) AS n FROM parquet_metadata(?) GROUP BY file_name)`, glob)
	if perFile != "3 3 2" {
		t.Errorf("row groups a file: %s, want 3 3 2", perFile)
	}
	unnamed := scalar[int](t, db, "SELECT count(*) FROM parquet_metadata(?) WHERE path_in_schema = ''", glob)
	if unnamed != 0 {
		t.Errorf("%d column chunks have no name", unnamed)
	}
	skipped := scalar[int64](t, db, "SELECT count(*) FROM read_parquet(?) WHERE household >= 500 AND assets = 0 AND age < 40", glob)
	var direct int64
	for _, r := range want {
		if r.household >= 500 && r.numbers[8] == 0 && r.age < 40 {
			direct++
		}
	}
	if skipped != direct || direct == 0 {
		t.Errorf("a filter finds %d rows, want %d", skipped, direct)
	}
}

// TestPanelMetadata reads the footers: units, meanings, provenance, households.
func TestPanelMetadata(t *testing.T) {
	glob := writePanel(t, generate(), output.Double)
	db := open(t)
	get := func(part int, key string) string {
		t.Helper()
		return scalar[string](t, db, "SELECT decode(value) FROM parquet_kv_metadata(?) WHERE decode(key) = ?",
			strings.ReplaceAll(glob, "part-*", fmt.Sprintf("part-%05d", part)), key)
	}
	for _, tt := range []struct {
		part      int
		key, want string
	}{
		{0, "seed", "7"}, {1, "title", `it's "quoted"`}, {2, "column.assets.unit", "crown"}, {0, "column.age.unit", "year"},
		{0, "column.died.meaning", "true if the year was the household's last"},
		{0, "panel.first_household", "0"}, {1, "panel.first_household", "384"}, {2, "panel.first_household", "768"},
		{1, "panel.households", "384"}, {2, "panel.households", "232"}, {2, "panel.precision", "double"},
	} {
		if got := get(tt.part, tt.key); got != tt.want {
			t.Errorf("part %d: %s = %q, want %q", tt.part, tt.key, got, tt.want)
		}
	}
	keys := query(t, db, "SELECT decode(key) FROM parquet_kv_metadata(?)", strings.ReplaceAll(glob, "*", "00001"))
	var order []string
	for keys.Next() {
		var k string
		if err := keys.Scan(&k); err != nil {
			t.Fatal(err)
		}
		order = append(order, k)
	}
	if !slices.IsSorted(order) || len(order) != 2*14+4+2 {
		t.Errorf("%d keys, want 34 in order: %q", len(order), order)
	}
}
