package interop

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"cistern/output"
)

// port is a scenario with every part of income, two groups and several blocks.
const port = `cistern: 1
seed: 11
households: 9000
life: {first_age: 30, last_age: 80, survival: {gompertz: {modal_age: 70, dispersion: 9}}}
preferences:
  utility: {family: crra, relative_risk_aversion: 2}
  discount_factor: 0.95
income:
  profile: {constant: 30000}
  persistent: {autocorrelation: 0.9, innovation_sd: 0.1, points: 5}
  transitory: {sd: 0.2}
  job_loss: {probability: 0.05, benefit_rate: 0.5}
saving: {return: 0.02, borrowing_limit: 1000}
public: {pension: {claim_age: 60, final_earnings: {rate: 0.3}, flat: 8000}}
groups:
  - {name: dockers, share: 0.7}
  - {name: pilots, share: 0.3, income: {profile: {constant: 60000}}}
start: {assets: {constant: 500}}
panel: {block: 4096}
`

// simulated builds the program, runs it on port and returns the run folder.
func simulated(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	program, scenario, run := filepath.Join(dir, "cistern"), filepath.Join(dir, "port.yaml"), filepath.Join(dir, "run")
	if err := os.WriteFile(scenario, []byte(port), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, args := range [][]string{{"go", "build", "-o", program, "./cmd/cistern"}, {program, "simulate", scenario, "--out", run}} {
		cmd := exec.Command(args[0], args[1:]...)
		cmd.Dir = filepath.Join("..", "..")
		if text, err := cmd.CombinedOutput(); err != nil {
			t.Fatalf("%v: %v\n%s", args, err, text)
		}
	}
	return run
}

// The program's own run, judged by another engine: as many rows as run.json says,
// in order, every row obeying the household's accounting, and the summary's
// figures those that the engine computes from the panel.
func TestSimulatedRun(t *testing.T) {
	dir := simulated(t)
	run, err := output.ReadRun(dir)
	if err != nil {
		t.Fatal(err)
	}
	db := open(t)
	panel := fmt.Sprintf("read_parquet('%s')", filepath.Join(dir, "panel", "part-*.parquet"))
	if n := scalar[int64](t, db, "select count(*) from "+panel); n != run.Counts["household_years"] || n < 9000*20 {
		t.Errorf("%d rows, run.json says %d", n, run.Counts["household_years"])
	}
	if n := scalar[int64](t, db, "select count(distinct household) from "+panel); n != 9000 {
		t.Errorf("%d households, want 9000", n)
	}
	for name, broken := range map[string]string{
		"assets are cash-on-hand less consumption": "abs(cash_on_hand - consumption - assets) > 1e-9",
		"assets respect the limit":                 "assets < -1000 - 1e-9",
		"income is earnings plus pension":          "income <> earnings + pension - taxes",
		"consumption is positive":                  "consumption <= 0",
		"nobody earns and draws a pension":         "earnings > 0 and pension > 0",
		"no shock without work":                    "not employed and transitory <> 0",
	} {
		if n := scalar[int64](t, db, "select count(*) from "+panel+" where "+broken); n != 0 {
			t.Errorf("%s: broken in %d rows", name, n)
		}
	}
	// cash-on-hand is the return on last year's assets plus income; the first year
	// begins with 500
	n := scalar[int64](t, db, `select count(*) from (select cash_on_hand, income, age, assets,
		lag(assets, 1, 500.0) over (partition by household order by age) as before from `+panel+`) where abs(cash_on_hand - 1.02 * before - income) > 1e-9`)
	if n != 0 {
		t.Errorf("the budget of one year does not follow from the last in %d rows", n)
	}
	if n := scalar[int64](t, db, `select count(*) from (select household, max(age) as last, max(case when died then age end) as death,
		count(*) filter (died) as deaths from `+panel+` group by household) where last <> death or deaths <> 1`); n != 0 {
		t.Errorf("%d households do not die once, in their last row", n)
	}
	// the summary against the engine's own figures
	summary := fmt.Sprintf("read_parquet('%s')", filepath.Join(dir, "summary.parquet"))
	for statistic, own := range map[string]string{
		"s.statistic = 'mean'":                        "avg(p.assets)",
		"s.statistic = 'sd'":                          "stddev_samp(p.assets)",
		"s.statistic = 'percentile' and s.level = 90": "quantile_cont(p.assets, 0.9)",
		"s.statistic = 'percentile' and s.level = 50": "quantile_cont(p.assets, 0.5)",
		"s.statistic = 'share_at_limit'":              "avg(case when p.assets <= -b.bound + 1e-6 then 1.0 else 0.0 end)",
	} {
		q := fmt.Sprintf(`with own as (select p."group", p.age, %s as x, count(*) as n from %s p, (select 1000.0 as bound) b where p.age < 60 group by all)
			select count(*), coalesce(max(abs(o.x / s.estimate - 1)), 0), coalesce(max(abs(o.n - s.households)), 0) from own o join %s s
			on s."group" = o."group" and s.age = o.age where s.variable = 'assets' and s.estimate <> 0 and %s`, own, panel, summary, statistic)
		var cells, miscounted int64
		var worst float64
		if err := db.QueryRow(q).Scan(&cells, &worst, &miscounted); err != nil {
			t.Fatal(err)
		}
		if cells < 20 || worst > 1e-9 || miscounted != 0 {
			t.Errorf("%s: %d cells compared, off by up to %.1e, households by %d", statistic, cells, worst, miscounted)
		}
	}
}
