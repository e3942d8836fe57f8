//go:build e2e

package pages_test

import (
	"context"
	"fmt"
	"net/http/httptest"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/page"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"

	"jointledger/service"
)

// chromium is one browser for all tests of a run.
func chromium(t *testing.T) context.Context {
	t.Helper()
	options := append(chromedp.DefaultExecAllocatorOptions[:],
		chromedp.NoSandbox, // the tests run as root on a throwaway machine
		chromedp.Flag("disable-background-networking", true), chromedp.Flag("disable-quic", true), chromedp.Flag("disable-component-update", true),
		chromedp.WSURLReadTimeout(time.Minute),
	)
	allocator, cancelAllocator := chromedp.NewExecAllocator(t.Context(), options...)
	ctx, cancel := chromedp.NewContext(allocator)
	timed, cancelTimed := context.WithTimeout(ctx, 4*time.Minute)
	t.Cleanup(func() { cancelTimed(); cancel(); cancelAllocator() })
	// The browser lives as long as the context of its first run.
	if err := chromedp.Run(timed); err != nil {
		t.Fatalf("chromium does not start: %v", err)
	}
	return timed
}

// watched collects what the browser complains about: refusals of the content
// policy, errors of scripts, dialogs.
func watched(ctx context.Context, t *testing.T) {
	t.Helper()
	var mu sync.Mutex
	var complaints []string
	chromedp.ListenTarget(ctx, func(event any) {
		mu.Lock()
		defer mu.Unlock()
		switch e := event.(type) {
		case *log.EventEntryAdded:
			complaints = append(complaints, e.Entry.Text+" "+e.Entry.URL)
		case *runtime.EventExceptionThrown:
			complaints = append(complaints, e.ExceptionDetails.Error())
		case *page.EventJavascriptDialogOpening:
			complaints = append(complaints, "a dialog: "+e.Message)
		}
	})
	t.Cleanup(func() {
		mu.Lock()
		defer mu.Unlock()
		for _, c := range complaints {
			// A page that tells of a problem has its status.
			if !strings.Contains(c, "favicon.ico") && !strings.Contains(c, "part=nothing") {
				t.Errorf("the browser says: %s", c)
			}
		}
	})
}

// run does steps and names the one that fails.
func run(ctx context.Context, t *testing.T, what string, steps ...chromedp.Action) {
	t.Helper()
	timed, cancel := context.WithTimeout(ctx, 40*time.Second)
	defer cancel()
	if err := chromedp.Run(timed, steps...); err != nil {
		t.Fatalf("%s: %v", what, err)
	}
}

// follow does steps of which the last leads to another page, and waits for it.
func follow(ctx context.Context, t *testing.T, what string, steps ...chromedp.Action) {
	t.Helper()
	timed, cancel := context.WithTimeout(ctx, 40*time.Second)
	defer cancel()
	if _, err := chromedp.RunResponse(timed, steps...); err != nil {
		t.Fatalf("%s: %v", what, err)
	}
}

// shot keeps a screenshot to be looked at, where a folder for them is named.
func shot(ctx context.Context, t *testing.T, name string) {
	t.Helper()
	dir := os.Getenv("JOINTLEDGER_SCREENSHOTS")
	if dir == "" {
		return
	}
	var data []byte
	run(ctx, t, "a screenshot", chromedp.FullScreenshot(&data, 100))
	if err := os.WriteFile(filepath.Join(dir, name+".png"), data, 0o600); err != nil {
		t.Fatal(err)
	}
}

// browsed opens a browser on a site, and looks for what the browser complains
// of.
func browsed(t *testing.T, s *site) (context.Context, *httptest.Server) {
	t.Helper()
	server := httptest.NewServer(s.handler)
	t.Cleanup(server.Close)
	ctx := chromium(t)
	watched(ctx, t)
	return ctx, server
}

// An auditor who was never here finds the record of a joint, reads it,
// verifies it and prints it.
func TestAuditorFindsReadsVerifiesAndPrintsInBrowser(t *testing.T) {
	s, lug, _, _ := furnished(t)
	ctx, server := browsed(t, s)
	var heading, verdict, least, verified string
	run(ctx, t, "come", log.Enable(), chromedp.EmulateViewport(1100, 900), chromedp.Navigate(server.URL+"/"))
	follow(ctx, t, "search", chromedp.SendKeys(`input[name=part]`, "SM-1200"), chromedp.SendKeys(`input[name=joint]`, "hinge-lower"), chromedp.SendKeys(`input[name=revision]`, "A"),
		chromedp.Click(`form[role=search] button`))
	follow(ctx, t, "find", chromedp.WaitVisible(`//h2[contains(., "Found")]`), chromedp.Click(`//td/a[text()="hinge-lower"]`))
	run(ctx, t, "read", chromedp.WaitVisible(`#proof`), chromedp.Text(`h1`, &heading), chromedp.Text(`.outcome .verdict`, &verdict), chromedp.Text(`.least .big`, &least))
	if heading != "hinge-lower" || !strings.Contains(verdict, "adequate") || !strings.HasPrefix(least, "+") {
		t.Errorf("%q is %q with %q", heading, verdict, least)
	}
	shot(ctx, t, "record-light")
	run(ctx, t, "dark", emulation.SetEmulatedMedia().WithFeatures([]*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: "dark"}}))
	shot(ctx, t, "record-dark")
	run(ctx, t, "light", emulation.SetEmulatedMedia().WithFeatures(nil))
	follow(ctx, t, "verify", chromedp.Click(`//button[text()="Verify now"]`))
	run(ctx, t, "what is verified", chromedp.WaitVisible(`#verification`), chromedp.Text(`#verification`, &verified))
	if !strings.Contains(verified, "✓ Verified.") || !strings.Contains(verified, lug.RecordDigest) {
		t.Errorf("verification says %q", verified)
	}
	for name, size := range map[string][2]float64{"A4": {8.27, 11.69}, "Letter": {8.5, 11}} {
		var pdf []byte
		run(ctx, t, "print", chromedp.Navigate(server.URL+"/records/"+lug.ID), chromedp.WaitVisible(`#proof`), chromedp.ActionFunc(func(ctx context.Context) (err error) {
			// The margins are those of the page's own stylesheet.
			pdf, _, err = page.PrintToPDF().WithPaperWidth(size[0]).WithPaperHeight(size[1]).WithPrintBackground(true).Do(ctx)
			return err
		}))
		sheets := textOfPDF(t, pdf, name)
		for i, sheet := range sheets {
			for _, want := range []string{"Part SM-1200, revision A", "hinge-lower", lug.RecordDigest, fmt.Sprintf("Page %d of %d", i+1, len(sheets))} {
				if !strings.Contains(sheet, want) {
					t.Errorf("%s: sheet %d does not say %q", name, i+1, want)
				}
			}
		}
		all := strings.Join(sheets, "\n")
		for _, want := range []string{"Cautions", "Workings", "no fatigue, no crack growth", "input and geometry agree", "c2sp.org/tlog-proof@v1"} {
			if !strings.Contains(all, want) {
				t.Errorf("%s: the print does not say %q", name, want)
			}
		}
		if len(sheets) < 3 || strings.Contains(all, "Verify now") {
			t.Errorf("%s: %d sheets, or buttons on paper", name, len(sheets))
		}
	}
}

// textOfPDF is the text of each sheet.
func textOfPDF(t *testing.T, pdf []byte, name string) []string {
	t.Helper()
	file := filepath.Join(t.TempDir(), name+".pdf")
	if dir := os.Getenv("JOINTLEDGER_SCREENSHOTS"); dir != "" {
		file = filepath.Join(dir, name+".pdf")
	}
	if err := os.WriteFile(file, pdf, 0o600); err != nil {
		t.Fatal(err)
	}
	text, err := exec.CommandContext(t.Context(), "pdftotext", "-layout", file, "-").Output()
	if err != nil {
		t.Fatalf("pdftotext, of poppler-utils: %v", err)
	}
	return strings.Split(strings.TrimSuffix(string(text), "\f"), "\f")
}

// The form redraws as one types, and works without a script too.
func TestFormIsUsedInBrowser(t *testing.T) {
	s := newSite(t)
	ctx, server := browsed(t, s)
	edit := func(name, text string) chromedp.Action {
		return chromedp.Tasks{chromedp.Click(name), chromedp.KeyEvent("a", chromedp.KeyModifiers(2)), chromedp.KeyEvent(text)}
	}
	const radius = `document.querySelector("circle.hole").getAttribute("r")`
	run(ctx, t, "type", log.Enable(), chromedp.Navigate(server.URL+"/try/lug"), chromedp.WaitVisible(`svg circle.hole`), edit(`input[name=hole_diameter]`, "22"),
		chromedp.Poll(radius+` === "11"`, nil), chromedp.Poll(`document.querySelector("#sent ~ pre").textContent.includes('"hole_diameter": 22')`, nil))
	var notice string
	run(ctx, t, "type what cannot be", edit(`input[name=hole_diameter]`, "wide"), chromedp.WaitVisible(`#answer [role=alert]`), chromedp.Text(`#answer [role=alert]`, &notice))
	if !strings.Contains(notice, "must be a number") {
		t.Errorf("the notice says %q", notice)
	}
	var still string
	run(ctx, t, "the drawing before stays", chromedp.Evaluate(radius, &still), edit(`input[name=hole_diameter]`, "24"), chromedp.Poll(radius+` === "12"`, nil), chromedp.WaitNotPresent(`#answer [role=alert]`))
	if still != "11" {
		t.Errorf("while the number cannot be read the hole is drawn with the radius %s", still)
	}
	shot(ctx, t, "form")
	for kind, drawing := range map[string]string{"lug": "circle.hole", "fastener-group": "circle.fastener", "splice": "rect.pin"} {
		run(ctx, t, "without a script", emulation.SetScriptExecutionDisabled(true), chromedp.Navigate(server.URL+"/try/"+kind), edit(`input[name=title]`, "posted"))
		follow(ctx, t, "calculate", chromedp.Click(`//button[text()="Calculate"]`))
		var text string
		run(ctx, t, "the answer", chromedp.WaitVisible(`svg `+drawing, chromedp.ByQuery), chromedp.Text(`#sent ~ pre`, &text), emulation.SetScriptExecutionDisabled(false))
		if !strings.Contains(text, `"title": "posted"`) {
			t.Errorf("%s: the request is %s", kind, text)
		}
	}
}

// At 360 pixels nothing has to be scrolled sideways, and the keyboard reaches
// everything, in every page.
func TestNarrowAndByKeyboardInBrowser(t *testing.T) {
	s, lug, pattern, splice := furnished(t)
	ctx, server := browsed(t, s)
	run(ctx, t, "start", log.Enable(), chromedp.EmulateViewport(360, 740))
	for name, path := range map[string]string{
		"home": "/", "lug": "/records/" + lug.ID, "pattern": "/records/" + pattern.ID, "splice": "/records/" + splice.ID, "part": "/parts?part=SM-1200", "materials": "/materials", "fasteners": "/fastener-types",
		"methods": "/methods", "rules": "/rules", "curve-sets": "/curve-sets", "curve-set": "/curve-sets/derived-1@1", "try-lug": "/try/lug", "try-pattern": "/try/fastener-group", "try-splice": "/try/splice",
		"api": "/api", "sign-in": "/sign-in", "problem": "/parts?part=nothing",
	} {
		var wide string
		run(ctx, t, path, chromedp.Navigate(server.URL+path), chromedp.WaitVisible(`h1`, chromedp.ByQuery), chromedp.Evaluate(`(() => {
			const root = document.scrollingElement;
			if (root.scrollWidth <= 360) return "";
			return root.scrollWidth + ": " + [...document.querySelectorAll("body *")].filter(e => e.getBoundingClientRect().right > 361 && !e.closest(".scroll, pre, svg, .unseen, thead")).slice(0, 3).map(e => e.tagName + "." + e.className + " " + e.textContent.slice(0, 40)).join(" | ");
		})()`, &wide))
		if wide != "" {
			t.Errorf("%s is wider than 360 pixels: %s", path, wide)
		}
		shot(ctx, t, "narrow-"+name)
	}
	var count, reached int
	run(ctx, t, "by keyboard", chromedp.Navigate(server.URL+"/records/"+lug.ID), chromedp.WaitVisible(`#proof`), chromedp.Evaluate(`(() => {
		window.reached = new Set();
		document.addEventListener("focusin", e => window.reached.add(e.target));
		return [...document.querySelectorAll("a[href], button, input:not([type=hidden]), select, textarea, summary")].filter(e => e.checkVisibility({contentVisibilityAuto: true, visibilityProperty: true}) ).length;
	})()`, &count))
	for range count + 10 {
		run(ctx, t, "tab", chromedp.KeyEvent(kb.Tab))
	}
	run(ctx, t, "count", chromedp.Evaluate(`window.reached.size`, &reached))
	if reached < count {
		t.Errorf("the keyboard reaches %d of %d links, buttons and fields", reached, count)
	}
}

// What hostile texts say is read and does nothing.
func TestHostileTextsDoNothingInBrowser(t *testing.T) {
	s := newSite(t)
	r := s.record(t, hostile, hostile, hostile, service.Lug, strings.Replace(hingeLug, `"boom hinge, lower lug"`, quote(t, hostile), 1))
	ctx, server := browsed(t, s)
	var heading, margin string
	run(ctx, t, "look", log.Enable(), chromedp.Navigate(server.URL+"/records/"+r.ID), chromedp.WaitVisible(`#proof`), chromedp.Text(`h1`, &heading),
		emulation.SetEmulatedMedia().WithMedia("print"), chromedp.Evaluate(`[...document.styleSheets].find(s => s.href.endsWith("sheet.css")).cssRules[0].cssText`, &margin))
	if heading != hostile {
		t.Errorf("the heading is %q", heading)
	}
	if !strings.Contains(margin, "counter(pages)") {
		t.Errorf("the rule of the page margins is %s", margin)
	}
	run(ctx, t, "list", emulation.SetEmulatedMedia().WithMedia(""), chromedp.Navigate(server.URL+"/"), chromedp.WaitVisible(`#ledger`), chromedp.Navigate(server.URL+"/parts?part="+url.QueryEscape(hostile)), chromedp.WaitVisible(`#gate`))
}

// Somebody with a key signs in and out.
func TestSigningInBrowser(t *testing.T) {
	s := newSite(t)
	key, err := s.service.AddKey(t.Context(), "ada", service.Reader)
	if err != nil {
		t.Fatal(err)
	}
	server := httptest.NewServer(s.handler)
	t.Cleanup(server.Close)
	ctx := chromium(t)
	var who, cookie, path string
	run(ctx, t, "come", chromedp.Navigate(server.URL+"/methods"), chromedp.WaitVisible(`input[name=key]`), chromedp.SendKeys(`input[name=key]`, key))
	follow(ctx, t, "sign in", chromedp.Click(`main button`))
	run(ctx, t, "who", chromedp.WaitVisible(`form.who`), chromedp.Text(`form.who span`, &who), chromedp.Evaluate(`document.cookie`, &cookie), chromedp.Evaluate(`location.pathname`, &path))
	if who != "ada, reader" || cookie != "" || path != "/methods" {
		t.Errorf("signed in as %q at %s; scripts see the cookie %q", who, path, cookie)
	}
	follow(ctx, t, "sign out", chromedp.Click(`form.who button`))
	run(ctx, t, "signed out", chromedp.WaitVisible(`input[name=key]`), chromedp.Navigate(server.URL+"/"), chromedp.WaitVisible(`input[name=key]`))
}
