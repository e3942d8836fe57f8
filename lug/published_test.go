package lug_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// A published case is a file of testdata/published: where it comes from, a
// request in its wire form, and what its source prints. A printed number is a
// text, and holds within half a unit of its last digit; "93.4e3" is 93.4 kips
// printed, in pounds.
type publishedCase struct {
	ID       string            `json:"id"`
	Title    string            `json:"title"`
	Source   string            `json:"source"`
	Mark     string            `json:"mark"`
	Notes    []string          `json:"notes"`
	Steps    []string          `json:"steps"`
	Input    json.RawMessage   `json:"input"`
	Verdict  string            `json:"verdict"`
	Expect   []expectedCheck   `json:"expect"`
	Workings []expectedWorking `json:"workings"`
	Findings []string          `json:"findings"`
}

type expectedCheck struct {
	LoadCase  string `json:"load_case"`
	Member    string `json:"member"`
	Mode      string `json:"mode"`
	Level     string `json:"level"`
	Method    string `json:"method"`
	Status    string `json:"status"`
	Demand    string `json:"demand"`
	Allowable string `json:"allowable"`
	Margin    string `json:"margin"`
}

type expectedWorking struct {
	LoadCase string `json:"load_case"`
	Member   string `json:"member"` // of the check
	Mode     string `json:"mode"`
	Level    string `json:"level"`
	Method   string `json:"method"`
	Symbol   string `json:"symbol"`
	Value    string `json:"value"`
}

// printed reads a printed number and half a unit of its last digit.
func printed(t *testing.T, s string) (value, tolerance float64) {
	t.Helper()
	value, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatalf("printed number %q: %v", s, err)
	}
	mantissa, exponent, _ := strings.Cut(s, "e")
	_, decimals, _ := strings.Cut(mantissa, ".")
	e, _ := strconv.Atoi(exponent)
	return value, 0.5 * math.Pow(10, float64(e-len(decimals))) * (1 + 1e-9)
}

func matches(t *testing.T, what, want string, got float64) {
	t.Helper()
	if want == "" {
		return
	}
	value, tolerance := printed(t, want)
	if !(math.Abs(got-value) <= tolerance) {
		t.Errorf("%s is %.10g, printed %s", what, got, want)
	}
}

func render(m strength.Message) string {
	return m.Render(func(q strength.Quantity) string { return fmt.Sprintf("%.6g", q.Value) })
}

func TestPublishedCases(t *testing.T) {
	files := publishedFiles(t)
	for _, name := range sortedKeys(files) {
		t.Run(strings.TrimSuffix(name, ".json"), func(t *testing.T) {
			var c publishedCase
			d := json.NewDecoder(bytes.NewReader(files[name]))
			d.DisallowUnknownFields()
			if err := d.Decode(&c); err != nil {
				t.Fatal(err)
			}
			if c.Source == "" || c.Mark == "" || len(c.Expect)+len(c.Workings) == 0 {
				t.Fatal("a case needs its source, its mark and what it expects")
			}
			c.run(t)
		})
	}
}

func (c *publishedCase) run(t *testing.T) {
	r := decodeRequest(t, c.Input)
	p := r.prepare(t)
	out := make([]strength.Margin, len(p.Checks()))
	for _, e := range c.Expect {
		i, k := find(t, p, r, e.LoadCase, e.Member, e.Mode, e.Level, e.Method)
		p.Margins(i, out)
		m, check := out[k], p.Checks()[k]
		what := strings.Join([]string{e.LoadCase, e.Member, e.Mode, e.Level}, " ")
		if e.Status != "" && m.Status.String() != e.Status {
			t.Errorf("%s is %s, expected %s", what, m.Status, e.Status)
		}
		if e.Margin+e.Allowable+e.Demand == "" {
			continue
		}
		if m.Status != strength.Adequate && m.Status != strength.Inadequate {
			why := ""
			if m.Why != nil {
				why = render(*m.Why)
			}
			t.Errorf("%s has no margin: %s", what, why)
			continue
		}
		unit := r.units.of(check.Unit)
		matches(t, what+": demand", e.Demand, m.Demand/unit)
		matches(t, what+": allowable", e.Allowable, m.Allowable/unit)
		matches(t, what+": margin", e.Margin, m.Margin)
	}
	for _, e := range c.Workings {
		i, k := find(t, p, r, e.LoadCase, e.Member, e.Mode, e.Level, e.Method)
		w, ok := working(p.CaseWorkings(i, k, p.Workings(k, nil)), e.Symbol)
		if !ok {
			t.Errorf("no working %s of %s %s %s", e.Symbol, e.Member, e.Mode, e.Level)
			continue
		}
		matches(t, e.Member+" "+e.Mode+" "+e.Symbol, e.Value, w.Value/r.units.of(w.Unit))
	}
	if c.Verdict != "" {
		if got := verdict(p, len(r.cases)).String(); got != c.Verdict {
			t.Errorf("the verdict is %s, expected %s", got, c.Verdict)
		}
	}
	for _, code := range c.Findings {
		if !hasFinding(p, code) {
			t.Errorf("no finding %s", code)
		}
	}
}

func find(t *testing.T, p *lug.Prepared, r request, loadCase, member, mode, level, method string) (i, k int) {
	t.Helper()
	i, k = -1, -1
	for n := range r.cases {
		if r.cases[n].ID == loadCase || loadCase == "" {
			i = n
		}
	}
	for n, c := range p.Checks() {
		if c.Member == member && c.Mode.String() == mode && c.Level.String() == level && (method == "" || c.Method == method) {
			k = n
			break
		}
	}
	if i < 0 || k < 0 {
		t.Fatalf("no check %s %s %s %s %s", loadCase, member, mode, level, method)
	}
	return i, k
}

func working(steps []strength.Working, symbol string) (strength.Working, bool) {
	for _, w := range steps {
		if w.Symbol == symbol {
			return w, true
		}
	}
	return strength.Working{}, false
}

// verdict is the worst status of any check that is not compared.
func verdict(p *lug.Prepared, cases int) strength.Status {
	worst := strength.NotExercised
	out := make([]strength.Margin, len(p.Checks()))
	for i := range cases {
		p.Margins(i, out)
		for k, m := range out {
			if !p.Checks()[k].Compared {
				worst = max(worst, m.Status)
			}
		}
	}
	return worst
}

func hasFinding(p *lug.Prepared, code string) bool {
	for _, f := range p.Findings() {
		if f.Code == code {
			return true
		}
	}
	return false
}
