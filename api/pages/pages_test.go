package pages_test

import (
	"fmt"
	"net/http"
	"net/http/httptest"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"golang.org/x/net/html"

	"jointledger/api/pages"
	"jointledger/service"
)

// furnished is a site with a record of each kind, signed and withdrawn ones,
// two revisions and a curve set.
func furnished(t *testing.T) (s *site, lug, pattern, splice *service.RecordDocument) {
	t.Helper()
	s = newSite(t)
	lug = s.record(t, "SM-1200", "A", "hinge-lower", service.Lug, hingeLug)
	s.record(t, "SM-1200", "B", "hinge-lower", service.Lug, strings.Replace(hingeLug, `"thickness": 12`, `"thickness": 3`, 1))
	pattern = s.record(t, "SM-305", "A", "bracket", service.FastenerGroup, bracketPattern)
	splice = s.record(t, "SM-4203", "A", "cap", service.Splice, published(t, "splice-strength", "SM-4203"))
	sign := func(id, role string, by service.Caller) {
		if _, _, err := s.service.SignOff(t.Context(), by, id, fmt.Appendf(nil, `{"role":%q,"statement":"input and geometry agree"}`, role), service.Idempotency{}); err != nil {
			t.Fatal(err)
		}
	}
	sign(lug.ID, "checked", ben)
	sign(lug.ID, "approved", service.Caller{Name: "cleo", Role: service.Approver})
	if _, _, err := s.service.Withdraw(t.Context(), ada, splice.ID, []byte(`{"reason":"wrong cap"}`), service.Idempotency{}); err != nil {
		t.Fatal(err)
	}
	set := `{"id":"read-1","version":"1","method":"affdl-tr-69-42","document":"a copy","reader":"ada","tolerance":0.02,"charts":{"K":{"figure":"9-2","along":"e/D","between":null,"curves":[{"points":[[0.6,1.4],[1.0,1.45],[1.5,1.5]]}]}}}`
	if _, _, err := s.service.RegisterCurveSet(t.Context(), service.Caller{Name: "root", Role: service.Admin}, []byte(set), service.Idempotency{}); err != nil {
		t.Fatal(err)
	}
	return s, lug, pattern, splice
}

func TestEveryPageIsSound(t *testing.T) {
	s, lug, pattern, splice := furnished(t)
	for path, texts := range map[string][]string{
		"/":                         {"hinge-lower", "SM-1200", "The ledger", "saltmarsh.example/jointledger"},
		"/?part=SM-305&latest=true": {"bracket", "Found, newest first"},
		"/?part=nothing":            {"No record matches"},
		"/records/" + lug.ID:        {"✓", "Least margin", "hinge-lower", "boom hinge, lower lug", "input and geometry agree", "cleo", lug.RecordDigest, lug.InputDigest, "AFFDL-TR-69-42", "Cautions"},
		"/records/" + pattern.ID:    {"edge-distance", "violation", "LC1"},
		"/records/" + splice.ID:     {"Withdrawn", "wrong cap", "bracket"},
		"/parts?part=SM-1200":       {"Revision B", "What changed", "/lug/thickness", "hold", "not-adequate"},
		"/parts?part=SM-1200&revision=A&from=B&to=A": {"release", "/lug/thickness"},
		"/materials":              {"7050-T7451 plate", "MIL-HDBK-5J"},
		"/fastener-types":         {"memory", "Tension"},
		"/materials?units=US":     {"psi"},
		"/methods":                {"elementary@1", "Range"},
		"/rules":                  {"common-practice@1"},
		"/curve-sets":             {"derived-1", "read-1@1"},
		"/curve-sets/derived-1@1": {"Kn@0.8", "e/D"},
		"/curve-sets/read-1@1":    {"ada", "9-2"},
		"/try/lug":                {"Width W", `"units": "SI"`, "Least margin"},
		"/try/fastener-group":     {"POST /v1/fastener-groups", "Least margin"},
		"/try/splice":             {"POST /v1/splices", "Load through each row"},
		"/api":                    {"Calculate a pin-loaded lug", "/v1/records/{id}/verification", "Problem"},
		"/sign-in":                {"API key"},
	} {
		page := s.get(t, path, http.StatusOK)
		text := textOf(checkPage(t, path, page))
		for _, want := range texts {
			if !strings.Contains(text, want) {
				t.Errorf("%s does not say %q", path, want)
			}
		}
	}
	for path, status := range map[string]int{
		"/records/01946c5e-0001-7abc-8def-000000000001": http.StatusNotFound,
		"/parts?part=SM-9":        http.StatusNotFound,
		"/parts":                  http.StatusUnprocessableEntity,
		"/try/nothing":            http.StatusNotFound,
		"/curve-sets/no@1":        http.StatusNotFound,
		"/?verdict=good":          http.StatusUnprocessableEntity,
		"/materials?units=cubits": http.StatusBadRequest,
	} {
		checkPage(t, path, s.get(t, path, status))
	}
	if s.logged.Len() > 0 {
		t.Errorf("the server failed: %s", s.logged)
	}
}

// Every published case is shown.
func TestEveryPublishedCaseIsShown(t *testing.T) {
	s := newSite(t)
	kinds := map[string]service.Kind{"lug": service.Lug, "fastener": service.FastenerGroup, "pattern": service.FastenerGroup, "splice": service.Splice}
	files, err := filepath.Glob("../../testdata/published/*.json")
	if err != nil || len(files) == 0 {
		t.Fatal("no published cases: ", err)
	}
	shown := 0
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		prefix, _, _ := strings.Cut(filepath.Base(file), "-")
		for i, input := range inputsOf(t, text) {
			body := fmt.Appendf(nil, `{"subject":{"part":"SM-1","revision":"A","joint":"%s %d"},"geometry_digest":"g","kind":%q,"input":%s}`, filepath.Base(file), i, kinds[prefix], input)
			r, _, err := s.service.Record(t.Context(), ada, body, service.Idempotency{})
			if problemCode(err) != "" {
				continue // the input of a single formula, or a case that is to be refused
			}
			if err != nil {
				t.Fatal(err)
			}
			checkPage(t, filepath.Base(file), s.get(t, "/records/"+r.ID, http.StatusOK))
			shown++
		}
	}
	if shown < 30 {
		t.Errorf("only %d cases were shown", shown)
	}
}

// hostile is what somebody may write into any text.
const hostile = `<script>alert(1)</script>"'&}*/</style><img src=x onerror=alert(2)>{{.}}]]>`

func TestHostileTextsStayTexts(t *testing.T) {
	s := newSite(t)
	h := quote(t, hostile)
	swap := func(input string, words ...string) string {
		for _, w := range words {
			if !strings.Contains(input, w) {
				t.Fatalf("the input has no %s", w)
			}
			input = strings.ReplaceAll(input, w, h)
		}
		return input
	}
	lug := swap(hingeLug, `"boom hinge, lower lug"`, `"bushing steel"`, `"invented"`, `"landing"`)
	lug = strings.Replace(lug, `"material": "alloy-steel-125-ksi"`, `"material": {"name": `+h+`, "direction": `+h+`, "basis": `+h+`, "source": `+h+`, "fsu": 500}`, 1)
	lug = strings.Replace(lug, `"fitting": 1.15`, `"fitting": 1.15, "special": [{"name": `+h+`, "value": 2, "basis": `+h+`}]`, 1)
	group := swap(bracketPattern, `"cap to bracket"`, `"SM bolt"`, `"invented"`, `"5"`, `"LC1"`, `"bracket"`)
	splice := swap(published(t, "splice-strength", "SM-4203"), `"cap"`, `"LC1"`, `"1/4 in pin, 95 ksi"`)
	post := func(kind service.Kind, input string) string {
		t.Helper()
		body := fmt.Appendf(nil, `{"subject":{"part":%s,"revision":%s,"joint":%s,"aspect":%s},"geometry_digest":%s,"kind":%q,"note":%s,"input":%s}`, h, h, h, h, h, kind, h, input)
		evil := service.Caller{Name: hostile, Role: service.Analyst}
		r, _, err := s.service.Record(t.Context(), evil, body, service.Idempotency{})
		if err != nil {
			t.Fatal(err)
		}
		if _, _, err := s.service.SignOff(t.Context(), ben, r.ID, []byte(`{"role":"checked","statement":`+h+`}`), service.Idempotency{}); err != nil {
			t.Fatal(err)
		}
		if _, _, err := s.service.Withdraw(t.Context(), evil, r.ID, []byte(`{"reason":`+h+`}`), service.Idempotency{}); err != nil {
			t.Fatal(err)
		}
		return r.ID
	}
	set := `{"id":` + h + `,"version":"1","method":"affdl-tr-69-42","document":` + h + `,"reader":` + h + `,"tolerance":0.02,"charts":{"K":{"figure":` + h + `,"along":"e/D","between":null,"curves":[{"points":[[0.6,1.4],[1.5,1.5]]}]}}}`
	if _, _, err := s.service.RegisterCurveSet(t.Context(), service.Caller{Name: hostile, Role: service.Admin}, []byte(set), service.Idempotency{}); err != nil {
		t.Fatal(err)
	}
	paths := []string{"/", "/parts?part=" + url.QueryEscape(hostile), "/curve-sets", "/curve-sets/" + url.PathEscape(hostile+"@1"), "/?part=" + url.QueryEscape(hostile), "/sign-in?to=" + url.QueryEscape(hostile)}
	for kind, input := range map[service.Kind]string{service.Lug: lug, service.FastenerGroup: group, service.Splice: splice} {
		id := post(kind, input)
		paths = append(paths, "/records/"+id)
		sheet := s.get(t, "/records/"+id+"/sheet.css", http.StatusOK)
		if strings.ContainsAny(sheet, "<>'&*") || strings.Count(sheet, `"`) != 10 {
			t.Errorf("the sheet's stylesheet is %s", sheet)
		}
	}
	for _, path := range paths {
		root := checkPage(t, path, s.get(t, path, http.StatusOK))
		if !strings.HasPrefix(path, "/sign-in") && !strings.Contains(textOf(root), hostile) {
			t.Errorf("%s does not show the text as it is", path)
		}
		count := 0
		var walk func(*html.Node)
		walk = func(n *html.Node) {
			if n.Type == html.ElementNode && (n.Data == "script" || n.Data == "img") {
				count++
			}
			for c := n.FirstChild; c != nil; c = c.NextSibling {
				walk(c)
			}
		}
		if walk(root); count > 0 {
			t.Errorf("%s: %d scripts or images", path, count)
		}
	}
	// What is typed into a form comes back as text too.
	for kind := range map[string]bool{"lug": true, "fastener-group": true, "splice": true} {
		b := newBrowser(s)
		b.get(t, "/try/"+kind)
		form := url.Values{"token": {b.token}}
		for _, name := range []string{"title", "width", "load_cases", "fasteners", "members", "rows", "material", "units", "shape", "stiffness", "compliance", "methods", "outline"} {
			form.Set(name, hostile)
		}
		w := b.post(t, "/try/"+kind, form)
		if w.Code != http.StatusOK {
			t.Fatalf("status %d", w.Code)
		}
		if root := checkPage(t, "/try/"+kind, w.Body.String()); !strings.Contains(textOf(root), hostile) {
			t.Errorf("/try/%s does not show what was typed", kind)
		}
	}
	if s.logged.Len() > 0 {
		t.Errorf("the server failed: %s", s.logged)
	}
}

func TestStringsOfCSSCannotEnd(t *testing.T) {
	for text, want := range map[string]string{
		`a"b`:  `"a\000022 b"`,
		`\`:    `"\00005c "`,
		"\n":   `"\00000a "`,
		"Ä 1":  `"\0000c4  1"`,
		"\x00": `"\00fffd "`,
		"🔩":    `"\01f529 "`,
	} {
		if got := pages.CSSString(text); got != want {
			t.Errorf("%q is written as %s, want %s", text, got, want)
		}
	}
}

func TestHeadersAreStrict(t *testing.T) {
	s := newSite(t)
	for _, path := range []string{"/", "/sign-in", "/static/style.css", "/static/form.js", "/try/lug", "/records/none", "/api"} {
		w := httptest.NewRecorder()
		s.handler.ServeHTTP(w, httptest.NewRequest(http.MethodGet, "http://localhost"+path, nil))
		csp := w.Header().Get("Content-Security-Policy")
		if !strings.HasPrefix(csp, "default-src 'none'; ") || strings.Contains(csp, "unsafe") || strings.Contains(csp, "*") || !strings.Contains(csp, "frame-ancestors 'none'") || !strings.Contains(csp, "base-uri 'none'") {
			t.Errorf("%s: policy %q", path, csp)
		}
		if w.Header().Get("X-Content-Type-Options") != "nosniff" || w.Header().Get("Cache-Control") == "" {
			t.Errorf("%s: %v", path, w.Header())
		}
	}
}

func TestNumbersAreSetToBeRead(t *testing.T) {
	for x, want := range map[float64]string{
		0: "0", 1.5: "1.5", 97400: "97\u202f400", 1234567: "1\u202f234\u202f567", -0.25: "−0.25", 2.5e-6: "2.5·10⁻⁶", 6900: "6900", 0.333333333: "0.33333", 1.96e10: "1.96·10¹⁰", 10240.4: "10\u202f240", -1234567: "−1\u202f234\u202f567",
	} {
		if got := pages.Number(x); got != want {
			t.Errorf("%v is set as %q, want %q", x, got, want)
		}
	}
	// A margin is never shown as more than it is.
	for x, want := range map[float64]string{0.1293: "+0.129", 0.12999: "+0.129", 0.13: "+0.130", 0: "+0.000", -0.0001: "−0.001", -0.25: "−0.250", 1.1588: "+1.158", 0.0725: "+0.072", 4321.5: "+4321"} {
		if got := pages.MarginText(&x); got != want {
			t.Errorf("the margin %v is set as %q, want %q", x, got, want)
		}
	}
	for text, want := range map[string]string{
		"2 t (c1 - D/2)":                         "2 t (c1 − D/2)",
		"min(P_u.LB1 / λ, P_u.LB2)":              "min(P<sub>u.LB1</sub> / λ, P<sub>u.LB2</sub>)",
		"(C / λ) (sqrt(2 P_ub m / C + g^2) - g)": "(C / λ) (√(2 P<sub>ub</sub> m / C + g<sup>2</sup>) − g)",
		"x^-0.625 <b>":                           "x<sup>−0.625</sup> &lt;b&gt;",
		"a_":                                     "a_",
	} {
		if got := string(pages.EquationText(text)); got != want {
			t.Errorf("%q is set as %q, want %q", text, got, want)
		}
	}
	for text, want := range map[string]string{"mm2": "mm²", "1": "", "N·mm": "N·mm", "1/mm": "1/mm", "lbf/in": "lbf/in"} {
		if got := pages.UnitText(text); got != want {
			t.Errorf("the unit %q is set as %q, want %q", text, got, want)
		}
	}
}

func TestFormTellsWhatIsWrong(t *testing.T) {
	s := newSite(t)
	b := newBrowser(s)
	page := b.get(t, "/try/lug")
	fields := fieldsOf(t, page)
	fields.Set("width", "20")
	w := b.post(t, "/try/lug", fields)
	text := textOf(checkPage(t, "too narrow", w.Body.String()))
	if !strings.Contains(text, "/lug/") || strings.Contains(text, "Least margin") {
		t.Errorf("a lug narrower than its hole: %s", clip(text))
	}
	fields.Set("width", "eighty")
	w = b.post(t, "/try/lug", fields)
	if text = textOf(checkPage(t, "no number", w.Body.String())); !strings.Contains(text, `must be a number, not "eighty"`) {
		t.Errorf("no number: %s", clip(text))
	}
	// Numbers copied from a page are taken.
	fields.Set("width", "8\u202f0")
	fields.Set("load_cases", "one limit 42\u202f000 −0\n")
	w = b.post(t, "/try/lug", fields)
	if text = textOf(checkPage(t, "numbers of a page", w.Body.String())); !strings.Contains(text, "Least margin") || !strings.Contains(text, `"force": 42000`) {
		t.Errorf("numbers of a page: %s", clip(text))
	}
}
