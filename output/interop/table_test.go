package interop

import (
	"database/sql"
	"math"
	"path/filepath"
	"testing"

	"cistern/output"
)

// summary makes a tidy table with gaps, NaN and infinities.
func summary() *output.Table {
	t := output.NewTable("summary")
	t.Provenance = map[string]string{"seed": "7"}
	t.Notes = []string{"one", "two"}
	group := t.AddString("group", "", "group, missing for all together")
	age := t.AddInt("age", "year", "age")
	statistic := t.AddString("statistic", "", "statistic")
	estimate := t.AddFloat("estimate", "crown", "estimate")
	lower := t.AddFloat("lower", "crown", "lower end of the interval")
	for i := range 400 {
		if i%5 == 0 {
			group.AppendMissing()
		} else {
			group.AppendString([]string{"dockers", `"clerks", all`, "", "two\nlines"}[i%4])
		}
		age.AppendInt(int64(25 + i/4))
		statistic.AppendString([]string{"mean", "percentile"}[i%2])
		switch {
		case i == 7:
			estimate.AppendFloat(math.NaN())
		case i == 8:
			estimate.AppendFloat(math.Inf(-1))
		default:
			estimate.AppendFloat(math.Exp(float64(i)/10) / 3)
		}
		if i%2 == 0 {
			lower.AppendMissing()
		} else {
			lower.AppendFloat(-float64(i) / 7)
		}
	}
	return t
}

// check compares what a query returns with the table, row by row, bit by bit.
// emptyIsNull is for CSV, where that reader takes an empty string for a gap.
func check(t *testing.T, db *sql.DB, q, path string, want *output.Table, emptyIsNull bool) {
	t.Helper()
	rows := query(t, db, q, path)
	n := 0
	for ; rows.Next(); n++ {
		dst := make([]any, len(want.Columns))
		for j, c := range want.Columns {
			switch c.Kind {
			case output.String:
				dst[j] = new(sql.NullString)
			case output.Int:
				dst[j] = new(sql.NullInt64)
			case output.Float:
				dst[j] = new(sql.NullFloat64)
			}
		}
		if err := rows.Scan(dst...); err != nil {
			t.Fatal(err)
		}
		for j, c := range want.Columns {
			missing := c.IsMissing(n)
			var same bool
			switch v := dst[j].(type) {
			case *sql.NullString:
				missing = missing || emptyIsNull && c.Strings[n] == ""
				same = v.Valid != missing && (missing || v.String == c.Strings[n])
			case *sql.NullInt64:
				same = v.Valid != missing && (missing || v.Int64 == c.Ints[n])
			case *sql.NullFloat64:
				same = v.Valid != missing && (missing || math.Float64bits(v.Float64) == math.Float64bits(c.Floats[n]) ||
					math.IsNaN(v.Float64) && math.IsNaN(c.Floats[n]))
			}
			if !same {
				t.Fatalf("row %d: %s is %+v; missing in the table: %v", n, c.Name, dst[j], missing)
			}
		}
	}
	if err := rows.Err(); err != nil || n != want.Len() {
		t.Errorf("%d rows, want %d (%v)", n, want.Len(), err)
	}
}

func TestSummaryParquet(t *testing.T) {
	db, table := open(t), summary()
	path := filepath.Join(t.TempDir(), "summary.parquet")
	if err := output.WriteFile(path, table.WriteParquet); err != nil {
		t.Fatal(err)
	}
	check(t, db, "SELECT * FROM read_parquet(?) ORDER BY file_row_number", path, table, false)
	for key, want := range map[string]string{"seed": "7", "note.2": "two", "column.estimate.unit": "crown"} {
		got := scalar[string](t, db, "SELECT decode(value) FROM parquet_kv_metadata(?) WHERE decode(key) = ?", path, key)
		if got != want {
			t.Errorf("%s = %q, want %q", key, got, want)
		}
	}
	// A NaN is greater than every number to this reader; bounds that leave it
	// out must not make a filter lose its row.
	if n := scalar[int](t, db, "SELECT count(*) FROM read_parquet(?) WHERE isnan(estimate) AND estimate > 1e300", path); n != 1 {
		t.Errorf("a filter finds %d NaN, want 1", n)
	}
}

func TestSummaryCSV(t *testing.T) {
	db, table := open(t), summary()
	path := filepath.Join(t.TempDir(), "summary.csv")
	if err := output.WriteFile(path, table.WriteCSV); err != nil {
		t.Fatal(err)
	}
	check(t, db, `SELECT * FROM read_csv(?, header = true, delim = ',', quote = '"', escape = '"', parallel = false,
		columns = {'group': 'VARCHAR', 'age': 'BIGINT', 'statistic': 'VARCHAR', 'estimate': 'DOUBLE', 'lower': 'DOUBLE'})`, path, table, true)
}

// TestPolicyParquet reads a rule of several row groups.
func TestPolicyParquet(t *testing.T) {
	db, table := open(t), output.PolicyTable("crown", true, true)
	for i := range 200000 {
		for j, c := range table.Columns {
			switch c.Kind {
			case output.String:
				c.AppendString(groups[i/70000])
			case output.Int:
				c.AppendInt(int64(25 + i/3000))
			case output.Float:
				c.AppendFloat(math.Sqrt(float64(i + j)))
			}
		}
	}
	path := filepath.Join(t.TempDir(), "policy.parquet")
	if err := output.WriteFile(path, table.WriteParquet); err != nil {
		t.Fatal(err)
	}
	check(t, db, "SELECT * FROM read_parquet(?) ORDER BY file_row_number", path, table, false)
	if n := scalar[int](t, db, "SELECT count(DISTINCT row_group_id) FROM parquet_metadata(?)", path); n != 2 {
		t.Errorf("%d row groups, want 2 (derived: 200000 rows in groups of 131072)", n)
	}
}
