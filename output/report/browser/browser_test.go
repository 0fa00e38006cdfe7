// Package browser reads the pages of package report in a real browser, as their
// readers do. It is a module of its own: the program needs none of it.
package browser

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/browser"
	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"

	"cistern/output"
	"cistern/output/report"
)

// window is a page in a browser, with what the browser had to say about it.
type window struct {
	t   *testing.T
	ctx context.Context

	mu       sync.Mutex
	said     []string // console, exceptions, dialogs
	requests []string
}

// open opens a file in a browser window of the given width.
func open(t *testing.T, path string, width int) *window {
	t.Helper()
	program := ""
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if found, err := exec.LookPath(name); err == nil {
			program = found
			break
		}
	}
	if program == "" {
		if os.Getenv("CI") != "" {
			t.Fatal("no Chromium is installed (Debian: chromium)")
		}
		t.Skip("no Chromium is installed (Debian: chromium)")
	}
	options := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(program), chromedp.NoSandbox, chromedp.DisableGPU,
		chromedp.WindowSize(width, 900), chromedp.UserDataDir(t.TempDir()))
	for _, flag := range []string{"disable-quic", "no-first-run", "disable-background-networking", "disable-component-update", "disable-sync"} {
		options = append(options, chromedp.Flag(flag, true))
	}
	ctx, cancel := context.WithTimeout(context.Background(), 2*time.Minute)
	t.Cleanup(cancel)
	ctx, cancel = chromedp.NewExecAllocator(ctx, options...)
	t.Cleanup(cancel)
	ctx, cancel = chromedp.NewContext(ctx)
	t.Cleanup(cancel)
	w := &window{t: t, ctx: ctx}
	if err := chromedp.Do(ctx, chromedp.EmulateViewport(int64(width), 900)); err != nil {
		t.Fatal(err)
	}
	if err := chromedp.Listen(ctx, w.listen); err != nil {
		t.Fatal(err)
	}
	if _, err := chromedp.Call(ctx, network.Enable, network.EnableParams{}); err != nil {
		t.Fatal(err)
	}
	if _, err := chromedp.Call(ctx, emulation.SetFocusEmulationEnabled, emulation.SetFocusEmulationEnabledParams{Enabled: true}); err != nil {
		t.Fatal(err)
	}
	if err := chromedp.Do(ctx, chromedp.Navigate("file://"+path)); err != nil {
		t.Fatal(err)
	}
	return w
}

// listen notes what a page must not do: speak up, and ask for anything.
func (w *window) listen(ev any) {
	w.mu.Lock()
	defer w.mu.Unlock()
	name := reflect.TypeOf(ev).String()
	switch {
	case strings.Contains(name, "ConsoleAPICalled"), strings.Contains(name, "ExceptionThrown"), strings.Contains(name, "log.EventEntryAdded"), strings.Contains(name, "DialogOpening"):
		text, _ := json.Marshal(ev)
		w.said = append(w.said, name+" "+string(text))
	case strings.Contains(name, "RequestWillBeSent") && !strings.Contains(name, "Extra"):
		v := reflect.Indirect(reflect.ValueOf(ev)).FieldByName("Request")
		w.requests = append(w.requests, reflect.Indirect(v).FieldByName("URL").String())
	}
}

// quiet checks that the page said nothing and asked for nothing but itself.
func (w *window) quiet() {
	w.t.Helper()
	w.mu.Lock()
	defer w.mu.Unlock()
	if len(w.said) > 0 {
		w.t.Errorf("the page says %.600s", strings.Join(w.said, "\n"))
	}
	if len(w.requests) != 1 {
		w.t.Errorf("the page asks for %v, want itself alone", w.requests)
	}
}

// eval evaluates an expression in the page.
func eval[T any](w *window, expression string) T {
	w.t.Helper()
	v, err := chromedp.Run(w.ctx, chromedp.Evaluate[T](expression))
	if err != nil {
		w.t.Fatalf("%s: %v", expression, err)
	}
	return v
}

func (w *window) do(action chromedp.Action[chromedp.Void]) {
	w.t.Helper()
	if err := chromedp.Do(w.ctx, action); err != nil {
		w.t.Fatal(err)
	}
}

// choose picks an option as a reader would.
func (w *window) choose(id, value string) {
	w.t.Helper()
	eval[bool](w, fmt.Sprintf(`(() => { const e = document.getElementById(%q); e.value = %q; e.dispatchEvent(new Event("change")); return e.value === %q; })()`, id, value, value))
}

// runs simulates the built-in scenario, once for all tests.
var runs = sync.OnceValues(func() (string, error) {
	dir, err := os.MkdirTemp("", "runs")
	if err != nil {
		return "", err
	}
	program := filepath.Join(dir, "cistern")
	build := exec.Command("go", "build", "-o", program, "./cmd/cistern")
	build.Dir = filepath.Join("..", "..", "..")
	if out, err := build.CombinedOutput(); err != nil {
		return "", fmt.Errorf("%w: %s", err, out)
	}
	for _, args := range [][]string{{"simulate", "quayside", "--households", "4000", "--out", "now"},
		{"simulate", "quayside", "--households", "4000", "--set", "public.pension.claim_age=67", "--out", "later"}, {"report", "now", "later", "--out", "both.html"},
		{"stress", "quayside", "harbour-closure", "--households", "4000", "--out", "stress"}} {
		cmd := exec.Command(program, append(args, "--quiet")...)
		cmd.Dir = dir
		if out, err := cmd.CombinedOutput(); err != nil {
			return "", fmt.Errorf("%v: %w: %s", args, err, out)
		}
	}
	return dir, nil
})

func TestMain(m *testing.M) {
	status := m.Run()
	if dir, err := runs(); err == nil {
		_ = os.RemoveAll(dir)
	}
	os.Exit(status)
}

func simulated(t *testing.T) string {
	t.Helper()
	dir, err := runs()
	if err != nil {
		t.Fatal(err)
	}
	return dir
}

// figures reads the estimates of a statistic by age.
func figures(t *testing.T, path, group, variable, statistic string, level float64) map[float64]float64 {
	t.Helper()
	table, err := output.ReadTable(path)
	if err != nil {
		t.Fatal(err)
	}
	out := map[float64]float64{}
	for i := range table.Len() {
		l := table.Column("level")
		if table.Column("group").Strings[i] == group && table.Column("variable").Strings[i] == variable && table.Column("statistic").Strings[i] == statistic &&
			!table.Column("age").IsMissing(i) && (level == 0 || !l.IsMissing(i) && l.Floats[i] == level) {
			out[float64(table.Column("age").Ints[i])] = table.Column("estimate").Floats[i]
		}
	}
	if len(out) < 50 {
		t.Fatalf("%d figures %s %s of %s", len(out), variable, statistic, group)
	}
	return out
}

type series struct {
	Name string
	X, Y []float64
}

// shown returns the series of the view that a chart shows.
func (w *window) shown(chart string) []series {
	return eval[[]series](w, fmt.Sprintf(`(() => {
		const c = JSON.parse(document.getElementById("data").textContent).find(c => c.id === %q);
		const k = [...document.getElementById(%q).querySelectorAll(".view")].findIndex(v => !v.hidden);
		return c.views[k].series.map(s => ({Name: s.name, X: s.x || c.views[k].series[0].x, Y: s.y || []}));
	})()`, chart, chart))
}

// What the other tests rely on not to happen is noticed when it happens.
func TestWatch(t *testing.T) {
	path := filepath.Join(t.TempDir(), "loud.html")
	if err := os.WriteFile(path, []byte(`<img src="nowhere.png"><script>console.warn("loud")</script>`), 0o666); err != nil {
		t.Fatal(err)
	}
	w := open(t, path, 500)
	w.do(chromedp.Sleep(300 * time.Millisecond))
	w.mu.Lock()
	defer w.mu.Unlock()
	if !strings.Contains(strings.Join(w.said, ""), "loud") || len(w.requests) != 2 {
		t.Errorf("heard %v, saw requests for %v", w.said, w.requests)
	}
}

// The page loads in silence, its charts carry the numbers of the summary, and a
// reader's choices show others.
func TestNumbersAndChoices(t *testing.T) {
	dir := simulated(t)
	w := open(t, filepath.Join(dir, "now", "report.html"), 1200)
	summary := filepath.Join(dir, "now", "summary.parquet")
	check := func(group, variable, statistic, name string, level float64) {
		t.Helper()
		want := figures(t, summary, group, variable, statistic, level)
		for _, s := range w.shown("wealth-by-age") {
			if s.Name != name {
				continue
			}
			if len(s.X) != len(want) {
				t.Errorf("%s %s of %s: %d values, want %d", variable, name, group, len(s.X), len(want))
			}
			for i, x := range s.X {
				if math.Abs(s.Y[i]-want[x]) > 1e-8*math.Abs(want[x]) {
					t.Fatalf("%s %s of %s at age %v: %v, want %v", variable, name, group, x, s.Y[i], want[x])
				}
			}
			return
		}
		t.Errorf("no series %s", name)
	}
	check("all", "assets", "percentile", "median", 50)
	check("all", "assets", "mean", "mean", 0)
	w.choose("group", "pilots")
	check("pilots", "assets", "percentile", "median", 50)
	w.choose("wealth-by-age-option", "consumption")
	check("pilots", "consumption", "percentile", "median", 50)
	if n := eval[int](w, `[...document.querySelectorAll("#percentiles .table")].filter(e => !e.hidden).length`); n != 1 {
		t.Errorf("%d tables of percentiles are shown, want that of the group", n)
	}
	w.choose("percentiles-option", "age 50")
	median := figures(t, summary, "pilots", "assets", "percentile", 50)[50]
	cell := eval[string](w, `[...document.querySelectorAll("#percentiles .table:not([hidden]) tr")].find(r => r.cells[0].textContent === "50th").cells[1].textContent.split("\n")[0]`)
	if shown, err := strconv.ParseFloat(strings.ReplaceAll(cell, ",", ""), 64); err != nil || math.Abs(shown-median) > 0.01*median {
		t.Errorf("the median of pilots at 50 is shown as %s, want about %.0f", cell, median)
	}
	if n := eval[int](w, `[...document.querySelectorAll("figure")].filter(f => !f.hidden && [...f.querySelectorAll(".view")].filter(v => !v.hidden).length !== 1).length`); n != 0 {
		t.Errorf("%d charts show no view or several", n)
	}
	w.quiet()
}

// Values are read by pointing and by keyboard.
func TestReading(t *testing.T) {
	dir := simulated(t)
	w := open(t, filepath.Join(dir, "now", "report.html"), 1200)
	read := func() string {
		return eval[string](w, `document.querySelector("#wealth-by-age .read").textContent`)
	}
	spoken := func() string {
		return eval[string](w, `document.querySelector("#wealth-by-age .plot").getAttribute("aria-valuetext") || ""`)
	}
	if got := read(); got != "" {
		t.Errorf("before anything is read: %q", got)
	}
	w.do(chromedp.Focus("#wealth-by-age .plot"))
	if got := read(); !strings.HasPrefix(got, "age 25: ") || got != spoken() {
		t.Errorf("with the keyboard on the chart: %q, spoken %q", got, spoken())
	}
	for range 3 {
		w.do(chromedp.KeyEvent(kb.ArrowRight))
	}
	if got := read(); !strings.HasPrefix(got, "age 28: ") || !strings.Contains(got, "median ") {
		t.Errorf("three steps to the right: %q", got)
	}
	for key, want := range map[string]string{"End": "age 100: ", "Home": "age 25: "} {
		eval[bool](w, fmt.Sprintf(`document.querySelector("#wealth-by-age .plot").dispatchEvent(new KeyboardEvent("keydown", {key: %q}))`, key))
		if got := spoken(); !strings.HasPrefix(got, want) {
			t.Errorf("%s: %q", key, got)
		}
	}
	w.do(chromedp.ScrollIntoView("#precautionary .plot"))
	box := eval[[4]float64](w, `(() => { const r = document.querySelector("#precautionary .view:not([hidden]) svg").getBoundingClientRect(); return [r.left, r.top, r.width, r.height]; })()`)
	w.do(chromedp.MouseEvent("mouseMoved", box[0]+0.5*box[2], box[1]+0.5*box[3]))
	text := eval[string](w, `document.querySelector("#precautionary .read").textContent`)
	if !strings.Contains(text, "with risk ") || !strings.Contains(text, "95 % interval") {
		t.Errorf("pointing at the middle: %q", text)
	}
	if n := eval[int](w, `document.querySelectorAll("#precautionary .cursor circle").length`); n != 2 {
		t.Errorf("%d points are marked, want 2", n)
	}
	w.quiet()
}

// The numbers behind a chart are a table on the page and a CSV file.
func TestTableAndFile(t *testing.T) {
	dir := simulated(t)
	w := open(t, filepath.Join(dir, "now", "report.html"), 1200)
	down := t.TempDir()
	if _, err := chromedp.CallBrowser(w.ctx, browser.SetDownloadBehavior, browser.SetDownloadBehaviorParams{Behavior: "allow", DownloadPath: down}); err != nil {
		t.Fatal(err)
	}
	w.choose("group", "clerks")
	eval[bool](w, `(document.querySelector("#precautionary details").open = true)`)
	w.do(chromedp.Sleep(200 * time.Millisecond))
	want := figures(t, filepath.Join(dir, "now", "summary.parquet"), "clerks", "assets", "mean", 0)
	rows := eval[[][]string](w, `[...document.querySelectorAll("#precautionary table tr")].map(r => [...r.cells].map(c => c.textContent))`)
	if len(rows) != len(want)+1 || rows[0][0] != "age" || rows[0][1] != "with risk" {
		t.Errorf("a table of %d rows that begins with %v", len(rows), rows[0])
	}
	w.do(chromedp.Click("#precautionary .csv"))
	file := filepath.Join(down, "precautionary-clerks.csv")
	var text []byte
	for range 100 {
		var err error
		if text, err = os.ReadFile(file); err == nil && len(text) > 0 {
			break
		}
		time.Sleep(50 * time.Millisecond)
	}
	records, err := csv.NewReader(bytes.NewReader(text)).ReadAll()
	if err != nil || len(records) != len(want)+1 {
		t.Fatalf("a file of %d records, %v", len(records), err)
	}
	for _, r := range records[1:] {
		age, _ := strconv.ParseFloat(r[0], 64)
		if value, _ := strconv.ParseFloat(r[1], 64); math.Abs(value-want[age]) > 1e-8*math.Abs(want[age]) {
			t.Fatalf("age %v: %v in the file, want %v", age, value, want[age])
		}
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	if len(w.said) > 0 {
		t.Errorf("the page says %.600s", strings.Join(w.said, "\n"))
	}
}

// Nothing reaches beyond the window, narrow or wide, and text stands out from its
// ground by 4.5 to 1 (WCAG 2.2, criterion 1.4.3), light and dark.
func TestLayout(t *testing.T) {
	dir := simulated(t)
	for _, page := range []string{"now/report.html", "both.html", "stress/report.html"} {
		for _, width := range []int{360, 1400} {
			w := open(t, filepath.Join(dir, page), width)
			eval[int](w, `document.querySelectorAll("details").forEach(d => d.open = true)`+`, 0`)
			if got := eval[int](w, `document.documentElement.scrollWidth`); got > width {
				t.Errorf("%s at %d pixels is %d wide; too wide are %v", page, width, got,
					eval[[]string](w, fmt.Sprintf(`[...document.querySelectorAll("body *")].filter(e => e.getBoundingClientRect().right > %d && !e.closest(".scroll, nav")).map(e => e.tagName + "." + e.className).slice(0, 5)`, width)))
			}
			for _, theme := range []string{"light", "dark"} {
				_, err := chromedp.Call(w.ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: theme}}})
				if err != nil {
					t.Fatal(err)
				}
				if faint := eval[[]string](w, contrast); len(faint) > 0 {
					t.Errorf("%s, %s: too faint are %v", page, theme, faint)
				}
			}
			w.quiet()
		}
	}
}

// contrast lists texts whose contrast with the ground is below 4.5.
const contrast = `(() => {
	const lum = c => { const [r, g, b] = c.match(/[\d.]+/g).map(Number).map(v => { v /= 255; return v <= 0.04045 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4; }); return 0.2126 * r + 0.7152 * g + 0.0722 * b; };
	const ground = lum(getComputedStyle(document.body).backgroundColor);
	const faint = new Set();
	for (const e of document.querySelectorAll("h1, h2, h3, p, a, th, td, caption, summary, label, select, .read, svg text")) {
		if (!e.textContent.trim()) continue;
		const s = getComputedStyle(e), l = lum(e.closest("svg") ? s.fill : s.color);
		const ratio = (Math.max(l, ground) + 0.05) / (Math.min(l, ground) + 0.05);
		if (!(ratio >= 4.5)) faint.add(e.tagName + "." + (e.getAttribute("class") || "") + " " + ratio.toFixed(2));
	}
	return [...faint];
})()`

// Printed, no chart is cut, and controls stay away.
func TestPrint(t *testing.T) {
	dir := simulated(t)
	w := open(t, filepath.Join(dir, "now", "report.html"), 800)
	pdf, err := chromedp.Run(w.ctx, chromedp.PrintToPDF(chromedp.PDFPaper(chromedp.PaperA4)))
	if err != nil {
		t.Fatal(err)
	}
	if pages := bytes.Count(pdf, []byte("/Type /Page\n")) + bytes.Count(pdf, []byte("/Type/Page/")) + bytes.Count(pdf, []byte("/Type /Page ")); !bytes.HasPrefix(pdf, []byte("%PDF")) || len(pdf) < 50_000 || pages > 40 {
		t.Errorf("a file of %d bytes and %d pages", len(pdf), pages)
	}
	if _, err := chromedp.Call(w.ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Media: "print"}); err != nil {
		t.Fatal(err)
	}
	if got := eval[[]string](w, `[...document.querySelectorAll("nav, .up, .read, .csv, details")].filter(e => e.getClientRects().length).map(e => e.className)`); len(got) > 0 {
		t.Errorf("printed are %v", got)
	}
	if got := eval[[]string](w, `[...document.querySelectorAll("select")].filter(e => !e.getClientRects().length || getComputedStyle(e).appearance !== "none").map(e => e.id)`); len(got) > 0 {
		t.Errorf("the choices %v are no words on paper", got)
	}
	if got := eval[[]string](w, `[...document.querySelectorAll("figure")].filter(f => !f.hidden && getComputedStyle(f).breakInside !== "avoid").map(f => f.id)`); len(got) > 0 {
		t.Errorf("may be cut: %v", got)
	}
}

const hostile = `</script><script>window.taken=1</script><img src=x onerror="window.taken=2"><svg onload="window.taken=3">"'&{{.}}`

// A hostile scenario cannot run script, wherever its texts stand.
func TestHostileScenario(t *testing.T) {
	dir := simulated(t)
	summary, err := output.ReadTable(filepath.Join(dir, "now", "summary.parquet"))
	if err != nil {
		t.Fatal(err)
	}
	for i, g := range summary.Column("group").Strings {
		if g == "pilots" {
			summary.Column("group").Strings[i] = hostile
		}
	}
	run := &report.Run{Name: hostile, Title: hostile, Currency: hostile, Households: 4000, Summary: summary, Warnings: []string{hostile}, Caution: hostile,
		Assumptions: []report.Assumption{{Key: hostile, Value: hostile, Meaning: hostile}}, Provenance: [][2]string{{hostile, hostile}}}
	page, err := report.Compare([]*report.Run{run})
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "hostile.html")
	if err := output.WriteFile(path, page.Write); err != nil {
		t.Fatal(err)
	}
	w := open(t, path, 1000)
	w.choose("group", hostile)
	w.do(chromedp.Focus("#wealth-by-age .plot"))
	eval[bool](w, `(document.querySelector("#wealth-by-age details").open = true)`)
	w.do(chromedp.Sleep(300 * time.Millisecond))
	if got := eval[int](w, `window.taken || 0`); got != 0 {
		t.Errorf("the scenario's text ran as script (%d)", got)
	}
	if got := eval[string](w, `document.title`); got != hostile {
		t.Errorf("the title is %q", got)
	}
	if n := eval[int](w, `document.images.length`); n != 0 {
		t.Errorf("%d images", n)
	}
	w.quiet()
}

// Runs side by side stand in one chart.
func TestSideBySide(t *testing.T) {
	dir := simulated(t)
	w := open(t, filepath.Join(dir, "both.html"), 1200)
	w.choose("group", "dockers")
	lines := w.shown("mean-assets")
	if len(lines) != 2 || lines[0].Name != "now" || lines[1].Name != "later" {
		t.Fatalf("series %+v", lines)
	}
	for _, s := range lines {
		want := figures(t, filepath.Join(dir, s.Name, "summary.parquet"), "dockers", "assets", "mean", 0)
		for i, x := range s.X {
			if math.Abs(s.Y[i]-want[x]) > 1e-8*math.Abs(want[x]) {
				t.Fatalf("%s at age %v: %v, want %v", s.Name, x, s.Y[i], want[x])
			}
		}
	}
	if got := eval[string](w, `document.getElementById("differences-table").textContent`); !strings.Contains(got, "public.pension.claim_age") {
		t.Errorf("differences %q", got)
	}
	w.quiet()
}
