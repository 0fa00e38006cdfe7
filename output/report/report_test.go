package report

import (
	"bytes"
	"crypto/sha256"
	"encoding/base64"
	"encoding/json"
	"encoding/xml"
	"errors"
	"fmt"
	"html"
	"image/png"
	"io"
	"math"
	"regexp"
	"strings"
	"testing"

	"cistern/output"
)

// figures makes a summary table of two groups and all together over some ages.
func figures(ages int, more func(add func(group string, age int, variable, statistic string, level, estimate, se float64))) *output.Table {
	t := output.NewTable("summary")
	group, age := t.AddString("group", "", ""), t.AddInt("age", "", "")
	variable, statistic := t.AddString("variable", "", ""), t.AddString("statistic", "", "")
	level, estimate, se := t.AddFloat("level", "", ""), t.AddFloat("estimate", "", ""), t.AddFloat("standard_error", "", "")
	lower, upper, count := t.AddFloat("lower", "", ""), t.AddFloat("upper", "", ""), t.AddInt("households", "", "")
	add := func(g string, a int, v, s string, l, e, error float64) {
		group.AppendString(g)
		if a < 0 {
			age.AppendMissing()
		} else {
			age.AppendInt(int64(a))
		}
		variable.AppendString(v)
		statistic.AppendString(s)
		if math.IsNaN(l) {
			level.AppendMissing()
		} else {
			level.AppendFloat(l)
		}
		estimate.AppendFloat(e)
		se.AppendFloat(error)
		lower.AppendFloat(e - 2*error)
		upper.AppendFloat(e + 2*error)
		count.AppendInt(100)
	}
	for _, g := range []string{"dockers", "clerks", output.Everyone} {
		for a := range ages {
			x := 1000 * float64(a) * float64(ages-a)
			add(g, 30+a, "assets", "mean", nan, x, 20)
			add(g, 30+a, "income", "mean", nan, 20000, 5)
			add(g, 30+a, "consumption", "mean", nan, 19000, 5)
			for _, p := range []float64{10, 25, 50, 75, 90} {
				add(g, 30+a, "assets", "percentile", p, x*p/50, 30)
			}
			add(g, 30+a, "precautionary_assets", "mean", nan, x/4, 4)
			add(g, 30+a, "precautionary_assets", "share_of_mean_assets", nan, 0.25, 0.004)
		}
	}
	if more != nil {
		more(add)
	}
	return t
}

func newRun() *Run {
	return &Run{Name: "port", Title: "Port", Currency: "crown", Households: 100, Summary: figures(40, nil), Caution: "No advice.",
		Assumptions: []Assumption{{"saving.return", "0.03", "a year"}}, Provenance: [][2]string{{"seed", "7"}}}
}

func write(t *testing.T, runs ...*Run) string {
	t.Helper()
	p, err := Compare(runs)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := p.Write(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// The page's own words come from the numbers: derived by hand from figures.
func TestLead(t *testing.T) {
	got := strings.Join(Lead(newRun()), "\n")
	want := "Mean wealth is highest at age 50, at 400,000 crown (95 % interval 399,960 to 400,040); the household in the middle holds 400,000.\n" +
		"Of that mean, 25.0 % is held because income is risky: 100,000 crown (95 % interval 99,992 to 100,008) that the same households would not hold if every income came at its mean.\n" +
		"The intervals say how far these figures would move with other draws of luck. Whether the model is right they do not say."
	if got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

// Running text has fewer digits than a table: its last is worth twice the error or more.
func TestBriefly(t *testing.T) {
	for _, tt := range []struct{ got, want string }{
		{briefly(201394.2, 1120), "201,000"}, {briefly(201394.2, 70), "201,400"}, {briefly(-5.57, 0.3), "−5.6"},
		{share(0.19987, 0.0009), "20.0"}, {share(0.35166, 0.003), "35.2"}, {share(0.5, nan), "50.0"}, {share(0.35166, 0.03), "35"},
	} {
		if tt.got != tt.want {
			t.Errorf("got %s, want %s", tt.got, tt.want)
		}
	}
}

// The policy of the page allows its own script and style, by their hashes, and
// nothing else.
func TestContentSecurityPolicy(t *testing.T) {
	text := write(t, newRun())
	policy := html.UnescapeString(regexp.MustCompile(`http-equiv="Content-Security-Policy" content="([^"]*)"`).FindStringSubmatch(text)[1])
	if !strings.HasPrefix(policy, "default-src 'none'; ") {
		t.Errorf("policy %s", policy)
	}
	for _, tag := range []string{"style", "script"} {
		all := regexp.MustCompile(`(?s)<`+tag+`>(.*?)</`+tag+`>`).FindAllStringSubmatch(text, -1)
		if len(all) != 1 {
			t.Fatalf("%d elements <%s>, want 1", len(all), tag)
		}
		h := sha256.Sum256([]byte(all[0][1]))
		if want := fmt.Sprintf("%s-src 'sha256-%s'", tag, base64.StdEncoding.EncodeToString(h[:])); !strings.Contains(policy, want) {
			t.Errorf("the policy does not allow the page's own %s: want %s in %s", tag, want, policy)
		}
	}
	if m := regexp.MustCompile(`\s(style|on[a-z]+|src)\s*=|https?://|url\(`).FindString(strings.ReplaceAll(text, `"http://www.w3.org/2000/svg"`, "")); m != "" {
		t.Errorf("the page has %q", m)
	}
}

const hostile = `</script><script>alert(1)</script><img src=x onerror=alert(2)>"'&{{.}}<!--`

// Text from a scenario stays text, wherever it stands.
func TestHostileText(t *testing.T) {
	r := newRun()
	r.Title, r.Currency, r.Name = hostile, hostile, hostile
	r.Warnings = []string{hostile}
	r.Assumptions = []Assumption{{hostile, hostile, hostile}}
	r.Provenance = [][2]string{{hostile, hostile}}
	group := r.Summary.Column("group")
	for i, g := range group.Strings {
		if g == "dockers" {
			group.Strings[i] = hostile
		}
	}
	r.Policy = output.PolicyTable("crown", false, false)
	for _, c := range r.Policy.Columns {
		for k := range 3 {
			switch c.Kind {
			case output.String:
				c.AppendString(hostile)
			case output.Int:
				c.AppendInt(35)
			default:
				c.AppendFloat(float64(k) * 100)
			}
		}
	}
	for _, runs := range [][]*Run{{r}, {r, newRun()}} {
		if len(runs) == 2 {
			runs[1].Currency = hostile
		}
		text := write(t, runs...)
		if n := strings.Count(text, "<script"); n != 2 {
			t.Errorf("%d script elements, want 2", n)
		}
		if strings.Contains(text, "<img") || strings.Contains(text, "alert(1)</script>") {
			t.Error("text became markup")
		}
		data := regexp.MustCompile(`(?s)<script type="application/json" id="data">(.*?)</script>`).FindStringSubmatch(text)[1]
		var charts []struct{ Views []struct{ Group string } }
		if err := json.Unmarshal([]byte(data), &charts); err != nil {
			t.Fatalf("the data are no JSON: %v", err)
		}
		found := false
		for _, c := range charts {
			for _, v := range c.Views {
				found = found || v.Group == hostile
			}
		}
		if !found {
			t.Error("the group's name did not survive")
		}
	}
}

// Every picture is well-formed.
func TestPictures(t *testing.T) {
	text := write(t, newRun())
	pictures := regexp.MustCompile(`(?s)<svg.*?</svg>`).FindAllString(text, -1)
	if len(pictures) < 9 {
		t.Fatalf("%d pictures, want some for every group", len(pictures))
	}
	for _, p := range pictures {
		d := xml.NewDecoder(strings.NewReader(p))
		for {
			if _, err := d.Token(); err == io.EOF {
				break
			} else if err != nil {
				t.Fatalf("%v in %.200s", err, p)
			}
		}
		if strings.Contains(p, "NaN") || strings.Contains(p, "Inf") {
			t.Errorf("a place is no number in %.300s", p)
		}
	}
}

// What a run does not have leaves no trace, and what there is comes in order.
func TestSections(t *testing.T) {
	ids := func(r *Run) string {
		var list []string
		for _, s := range Sections(r) {
			list = append(list, s.ID)
		}
		return strings.Join(list, " ")
	}
	if got, want := ids(newRun()), "wealth precaution flows percentiles accuracy assumptions provenance"; got != want {
		t.Errorf("sections %s, want %s", got, want)
	}
	if got := ids(&Run{Title: "nothing"}); got != "" {
		t.Errorf("sections %s of nothing", got)
	}
	r := newRun()
	r.Summary = figures(40, func(add func(string, int, string, string, float64, float64, float64)) {
		add(output.Everyone, -1, "assets", "lorenz", 50, 0.1, 0.01)
		add(output.Everyone, 40, "runway_months", "share_below", 3, 0.2, 0.01)
		add(output.Everyone, 40, "consumption_change", "share_below", -0.05, 0.2, 0.01)
		add(output.Everyone, -1, "propensity_by_wealth", "mean", 1, 0.5, 0.01)
	})
	r.Extra = []Section{{ID: "extra", Title: "Extra", Words: []string{"more"}}}
	if got, want := ids(r), "wealth precaution flows concentration percentiles runway falls propensity extra accuracy assumptions provenance"; got != want {
		t.Errorf("sections %s, want %s", got, want)
	}
	if text := write(t, &Run{Title: "nothing", Caution: "No advice."}); !strings.Contains(text, "No advice.") {
		t.Error("an empty page lacks the caution")
	}
}

// The same content gives the same bytes, and many groups do not make a large page.
func TestPageSize(t *testing.T) {
	if once, twice := write(t, newRun()), write(t, newRun()); once != twice {
		t.Error("the same run gives two pages")
	}
	r := newRun()
	r.Summary = figures(70, func(add func(string, int, string, string, float64, float64, float64)) {
		for k := range 60 {
			for a := range 70 {
				for _, p := range []float64{10, 25, 50, 75, 90} {
					for _, v := range []string{"assets", "consumption", "income"} {
						add(fmt.Sprintf("quay %d", k), 30+a, v, "percentile", p, 1000.123456789*float64(a)*p, 3)
					}
				}
			}
		}
	})
	text := write(t, r)
	if len(text) > MostBytes {
		t.Errorf("the page takes %d bytes", len(text))
	}
	if !strings.Contains(text, "The charts leave out the last") {
		t.Error("groups are left out without a word")
	}
}

// Several runs stand in one chart; what differs between them is listed.
func TestCompare(t *testing.T) {
	a, b := newRun(), newRun()
	b.Name = "port-67"
	b.Assumptions[0].Value = "0.04"
	p, err := Compare([]*Run{a, b})
	if err != nil {
		t.Fatal(err)
	}
	section := func(id string) Section {
		t.Helper()
		for _, s := range p.Sections {
			if s.ID == id {
				return s
			}
		}
		t.Fatalf("no section %s", id)
		return Section{}
	}
	series := section("side-by-side").Charts[0].Views[0].Series
	if len(series) != 2 || series[0].Name != "port" || series[1].Name != "port-67" {
		t.Errorf("series %+v", series)
	}
	if rows := section("differences").Tables[0].Rows; len(rows) != 1 || rows[0][1] != "0.03" || rows[0][2] != "0.04" {
		t.Errorf("differences %v", rows)
	}
	// By hand from figures: 1000·20·20 at age 50, a quarter of it precautionary.
	var key []string
	for _, row := range section("key-figures").Tables[0].Rows {
		key = append(key, strings.Join(row, " | "))
	}
	want := "age of the highest mean wealth | 50 | 50\nmean wealth at that age, crown | 400,000 ± 20 | 400,000 ± 20\n" +
		"median wealth at that age, crown | 400,000 ± 30 | 400,000 ± 30\nprecautionary part at that age, crown | 100,000 ± 4 | 100,000 ± 4\n" +
		"share of it in mean wealth | 25.0 % ± 0.4 % | 25.0 % ± 0.4 %"
	if got := strings.Join(key, "\n"); got != want {
		t.Errorf("key figures\n%s\nwant\n%s", got, want)
	}
	b.Currency = "shilling"
	if _, err := Compare([]*Run{a, b}); err == nil {
		t.Error("two currencies stand in one chart")
	}
	if _, err := Compare(nil); err == nil {
		t.Error("a page about nothing")
	}
}

// Numbers are written with the digits that their errors warrant.
func TestRounded(t *testing.T) {
	for _, tt := range []struct {
		x, se float64
		want  string
	}{{201394.2, 1120, "201,400"}, {201394.2, 0.4, "201,394.2"}, {-5.5, 0.3, "−5.5"}, {0.01234, 0.001, "0.0123"}, {0, 0, "0"}, {1234567, nan, "1,235,000"}, {nan, 1, "–"}, {-0.0001, 1, "0.0"}} {
		if got := rounded(tt.x, tt.se); got != tt.want {
			t.Errorf("%v with error %v is written %s, want %s", tt.x, tt.se, got, tt.want)
		}
	}
}

// Ticks are round and hold the values between them.
func TestScale(t *testing.T) {
	for _, tt := range []struct {
		low, high float64
		a         Axis
		want      string
	}{
		{0, 412000, Axis{Zero: true}, "0|100,000|200,000|300,000|400,000|500,000"},
		{25, 100, Axis{Integer: true}, "40|60|80|100"},
		{0, 0.98, Axis{Share: true, Zero: true}, "0 %|20 %|40 %|60 %|80 %|100 %"},
		{0, 1.01, Axis{Share: true, Zero: true}, "0 %|25 %|50 %|75 %|100 %"},
		{1, 5, Axis{Integer: true}, "1|2|3|4|5"},
		{-12, 30, Axis{Zero: true}, "−20|−10|0|10|20|30"},
		{7, 7, Axis{}, "6.0|6.5|7.0|7.5|8.0"},
	} {
		s := newScale(tt.low, tt.high, tt.a, 5)
		var got []string
		for _, x := range s.ticks {
			got = append(got, s.tick(x, tt.a))
		}
		if strings.Join(got, "|") != tt.want {
			t.Errorf("%v to %v: %s, want %s", tt.low, tt.high, strings.Join(got, "|"), tt.want)
		}
	}
}

// Every chart is there as SVG and PNG, well-formed and the same every time.
func TestFigures(t *testing.T) {
	r := newRun()
	r.Currency = hostile
	figures := Figures(Sections(r))
	if len(figures) < 8 {
		t.Fatalf("%d files", len(figures))
	}
	for _, f := range figures {
		var a, b bytes.Buffer
		if err := errors.Join(f.Write(&a), f.Write(&b)); err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(a.Bytes(), b.Bytes()) {
			t.Errorf("%s differs from time to time", f.Name)
		}
		if strings.HasSuffix(f.Name, ".svg") {
			d := xml.NewDecoder(&a)
			for {
				if _, err := d.Token(); err == io.EOF {
					break
				} else if err != nil {
					t.Fatalf("%s: %v", f.Name, err)
				}
			}
			continue
		}
		picture, err := png.Decode(&a)
		if err != nil {
			t.Fatalf("%s: %v", f.Name, err)
		}
		if size := picture.Bounds().Size(); size.X < 900 || size.Y < 600 {
			t.Errorf("%s is %v pixels large", f.Name, size)
		}
		inked := 0
		for y := range picture.Bounds().Dy() {
			for x := range picture.Bounds().Dx() {
				if r, _, b, _ := picture.At(x, y).RGBA(); b > r+0x3000 {
					inked++ // the first line is blue
				}
			}
		}
		if inked < 500 {
			t.Errorf("%s has %d pixels of its line", f.Name, inked)
		}
	}
}

// The page about a stress shows both worlds, year by year, and their difference.
func TestStressPage(t *testing.T) {
	table := output.NewTable("stress")
	year, world := table.AddInt("year", "", ""), table.AddString("world", "", "")
	group, ages := table.AddString("group", "", ""), table.AddString("ages", "", "")
	variable, statistic, level := table.AddString("variable", "", ""), table.AddString("statistic", "", ""), table.AddFloat("level", "", "")
	var numbers []*output.Column
	for _, name := range []string{"estimate", "standard_error", "lower", "upper"} {
		numbers = append(numbers, table.AddFloat(name, "", ""))
	}
	for y := -1; y <= 3; y++ {
		for k, w := range []string{"baseline", "stress", "difference"} {
			year.AppendInt(int64(y))
			world.AppendString(w)
			group.AppendString(hostile)
			ages.AppendString("25-34")
			variable.AppendString("dry")
			statistic.AppendString("share")
			level.AppendMissing()
			for _, c := range numbers {
				c.AppendFloat(0.01 * float64(k+y+2))
			}
		}
	}
	page := StressPage(&StressRun{Title: hostile, Words: []string{"Run dry: more."}, Currency: "crown", Table: table, Event: []Assumption{{"event.lasts", "2", "years"}}, Caution: "No advice."})
	if len(page.Sections) != 2 || page.Sections[0].ID != "dry" || page.Sections[1].ID != "event" {
		t.Fatalf("sections %+v", page.Sections)
	}
	charts := page.Sections[0].Charts
	if len(charts) != 2 || len(charts[0].Views[0].Series) != 2 || len(charts[0].Views[0].Series[1].X) != 5 || charts[1].Views[0].Series[0].Y[0] != 0.03 {
		t.Errorf("charts %+v", charts)
	}
	var b bytes.Buffer
	if err := page.Write(&b); err != nil || strings.Count(b.String(), "<script") != 2 {
		t.Errorf("%v, %d scripts", err, strings.Count(b.String(), "<script"))
	}
}

// A line's name stands clear of every other line, nearest to its own; where lines lie
// on each other there is none.
func TestBesideLines(t *testing.T) {
	line := func(name string, f func(x float64) float64) Series {
		s := Series{Name: name, Label: name}
		for x := 0.0; x <= 100; x += 4 {
			s.X, s.Y = append(s.X, x), append(s.Y, f(x))
		}
		return s
	}
	b := box{x: scale{low: 0, high: 100, from: 50, to: 380}, y: scale{low: 0, high: 100, from: 230, to: 26}}
	steep := View{Series: []Series{line("dockers", func(x float64) float64 { return x }), line("clerks", func(x float64) float64 { return 100 - x }), line("pilots", func(float64) float64 { return 50 })}}
	names := besideLines(&steep, &b)
	if len(names) != 3 {
		t.Fatalf("%d names", len(names))
	}
	for i, n := range names {
		nearest, at := math.Inf(1), -1
		for k := range steep.Series {
			for _, p := range trailOf(&steep.Series[k], &b) {
				if d := n.distance(p); d < nearest {
					nearest, at = d, k
				}
				if d := n.distance(p); k != i && d < clear {
					t.Fatalf("%s is %.1f from %s", n.text, d, steep.Series[k].Name)
				}
			}
		}
		if n.text != steep.Series[i].Label || at != i || nearest > 2*off || nearest < near {
			t.Errorf("%s stands %.1f from %s", n.text, nearest, steep.Series[at].Name)
		}
		if n.left < b.x.from || n.right > width || n.top < b.y.to || n.bottom > b.y.from {
			t.Errorf("%s lies outside the picture: %+v", n.text, n)
		}
	}
	same := View{Series: []Series{line("dockers", math.Sqrt), line("clerks", math.Sqrt)}}
	if names := besideLines(&same, &b); names != nil {
		t.Errorf("names %+v beside lines that are one", names)
	}
}

// The table of percentiles is that of the age chosen; the page shows the first.
func TestTableChoice(t *testing.T) {
	text := write(t, newRun())
	tables := regexp.MustCompile(`<div class="table" data-group="all" data-option="age ([0-9]+)"( hidden)?>`).FindAllStringSubmatch(text, -1)
	if len(tables) != 4 || tables[0][1] != "30" || tables[0][2] != "" || tables[1][2] != " hidden" {
		t.Errorf("tables %v", tables)
	}
}

// The caption under a share of falls is about falls: levels below nothing alone.
func TestFalls(t *testing.T) {
	r := newRun()
	r.Summary = figures(40, func(add func(string, int, string, string, float64, float64, float64)) {
		for _, l := range []float64{-0.2, -0.05, 0, 0.1} {
			for _, age := range []float64{40, 41} {
				add(output.Everyone, int(age), "consumption_change", "share_below", l, 0.5+l, 0.01)
			}
		}
	})
	section := falls(r, readSummary(r.Summary))
	if len(section.Charts) != 1 || len(section.Charts[0].Views) != 1 {
		t.Fatalf("charts %+v", section.Charts)
	}
	series := section.Charts[0].Views[0].Series
	if len(series) != 2 || series[0].Name != "by over 5 %" || series[0].Y[1] != 0.45 || series[1].Name != "by over 20 %" || series[1].Y[0] != 0.3 {
		t.Errorf("series %+v", series)
	}
}
