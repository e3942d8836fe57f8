package pages_test

import (
	"net/http"
	"net/http/httptest"
	"net/url"
	"strings"
	"testing"

	"golang.org/x/net/html"

	"jointledger/api/pages"
	"jointledger/service"
)

// browser keeps a cookie and the token of the last page.
type browser struct {
	site   *site
	cookie *http.Cookie
	token  string
}

func newBrowser(s *site) *browser { return &browser{site: s} }

func (b *browser) do(t *testing.T, r *http.Request) *httptest.ResponseRecorder {
	t.Helper()
	if b.cookie != nil {
		r.AddCookie(b.cookie)
	}
	w := httptest.NewRecorder()
	b.site.handler.ServeHTTP(w, r)
	for _, c := range w.Result().Cookies() {
		b.cookie = c
		if !c.HttpOnly || c.SameSite != http.SameSiteStrictMode || c.Path != "/" {
			t.Errorf("the cookie is %+v", c)
		}
	}
	if _, after, found := strings.Cut(w.Body.String(), `name="token" value="`); found {
		b.token, _, _ = strings.Cut(after, `"`)
	}
	return w
}

func (b *browser) get(t *testing.T, path string) string {
	t.Helper()
	return b.do(t, httptest.NewRequest(http.MethodGet, "http://localhost"+path, nil)).Body.String()
}

func (b *browser) post(t *testing.T, path string, form url.Values) *httptest.ResponseRecorder {
	t.Helper()
	r := httptest.NewRequest(http.MethodPost, "http://localhost"+path, strings.NewReader(form.Encode()))
	r.Header.Set("Content-Type", "application/x-www-form-urlencoded")
	return b.do(t, r)
}

// fieldsOf are the fields of the form of a page, as a browser would send them.
func fieldsOf(t *testing.T, page string) url.Values {
	t.Helper()
	root, err := html.Parse(strings.NewReader(page))
	if err != nil {
		t.Fatal(err)
	}
	values := url.Values{}
	get := func(n *html.Node, key string) (string, bool) {
		for _, a := range n.Attr {
			if a.Key == key {
				return a.Val, true
			}
		}
		return "", false
	}
	var walk func(*html.Node, string)
	walk = func(n *html.Node, in string) {
		if n.Type == html.ElementNode {
			name, _ := get(n, "name")
			value, _ := get(n, "value")
			kind, _ := get(n, "type")
			_, checked := get(n, "checked")
			_, selected := get(n, "selected")
			switch {
			case n.Data == "input" && (kind != "checkbox" || checked):
				values.Add(name, value)
			case n.Data == "textarea":
				values.Add(name, textOf(n))
			case n.Data == "select":
				in = name
			case n.Data == "option" && in != "" && (selected || !values.Has(in)):
				if _, given := get(n, "value"); !given {
					value = strings.TrimSpace(textOf(n))
				}
				values.Set(in, value)
			}
		}
		for c := n.FirstChild; c != nil; c = c.NextSibling {
			walk(c, in)
		}
	}
	walk(root, "")
	values.Del("")
	return values
}

func TestSignIn(t *testing.T) {
	s := newSite(t)
	r := s.record(t, "SM-1200", "A", "hinge", service.Lug, hingeLug)
	key, err := s.service.AddKey(t.Context(), "ada", service.Reader)
	if err != nil {
		t.Fatal(err)
	}
	b := newBrowser(s)
	record := "/records/" + r.ID
	w := b.do(t, httptest.NewRequest(http.MethodGet, "http://localhost"+record, nil))
	if w.Code != http.StatusSeeOther || w.Header().Get("Location") != "/sign-in?to="+url.QueryEscape(record) {
		t.Fatalf("without a session: %d to %s", w.Code, w.Header().Get("Location"))
	}
	if w = b.post(t, record+"/verify", url.Values{}); w.Code != http.StatusUnauthorized {
		t.Errorf("a form without a session: %d", w.Code)
	}
	b.get(t, "/sign-in?to="+url.QueryEscape(record))
	before := b.cookie.Value
	if w = b.post(t, "/sign-in", url.Values{"token": {b.token}, "to": {record}, "key": {key + "x"}}); w.Code != http.StatusUnauthorized || !strings.Contains(w.Body.String(), "not known here") {
		t.Errorf("another key: %d", w.Code)
	}
	if w = b.post(t, "/sign-in", url.Values{"token": {b.token}, "to": {record}, "key": {" " + key + "\n"}}); w.Code != http.StatusSeeOther || w.Header().Get("Location") != record {
		t.Fatalf("the key: %d to %s", w.Code, w.Header().Get("Location"))
	}
	if b.cookie.Value == before || strings.Contains(b.cookie.Value, key) {
		t.Error("the session has the token that the browser had before, or the key")
	}
	page := b.get(t, record)
	text := textOf(checkPage(t, record, page))
	if !strings.Contains(text, "ada, reader") || !strings.Contains(text, "hinge") {
		t.Errorf("signed in: %s", clip(text))
	}

	// A form of this browser is taken; one of another browser or site is not.
	if w = b.post(t, record+"/verify", url.Values{"token": {b.token}}); w.Code != http.StatusOK || !strings.Contains(w.Body.String(), "✓ Verified.") {
		t.Errorf("verify: %d", w.Code)
	}
	other := newBrowser(s)
	other.get(t, "/sign-in")
	for name, token := range map[string]string{"none": "", "another browser's": other.token, "wrong": b.token[1:]} {
		if w = b.post(t, record+"/verify", url.Values{"token": {token}}); w.Code != http.StatusForbidden {
			t.Errorf("the token is %s: %d", name, w.Code)
		}
	}
	foreign := httptest.NewRequest(http.MethodPost, "http://localhost"+record+"/verify", strings.NewReader(url.Values{"token": {b.token}}.Encode()))
	foreign.Header.Set("Content-Type", "application/x-www-form-urlencoded")
	foreign.Header.Set("Sec-Fetch-Site", "cross-site")
	if w = b.do(t, foreign); w.Code != http.StatusForbidden {
		t.Errorf("a form of another site: %d", w.Code)
	}

	session := *b.cookie
	b.get(t, "/")
	if w = b.post(t, "/sign-out", url.Values{"token": {b.token}}); w.Code != http.StatusSeeOther || b.cookie.MaxAge >= 0 {
		t.Errorf("signing out: %d, %+v", w.Code, b.cookie)
	}
	b.cookie = &session
	if w = b.do(t, httptest.NewRequest(http.MethodGet, "http://localhost/", nil)); w.Code != http.StatusSeeOther {
		t.Errorf("the session after signing out: %d", w.Code)
	}
	if strings.Contains(s.logged.String(), "error") {
		t.Errorf("the server failed: %s", s.logged)
	}
}

func TestSigningInLeadsNowhereElse(t *testing.T) {
	for to, want := range map[string]string{
		"/records/1?x=y": "/records/1?x=y", "": "/", "//evil.example/": "/", "https://evil.example/": "/", `/\evil.example`: "/",
		"javascript:alert(1)": "/", "records": "/", "/\r\nSet-Cookie: a=b": "/",
	} {
		if got := pages.SafeBack(to); got != want {
			t.Errorf("%q leads to %q, want %q", to, got, want)
		}
	}
}

func TestVerifyAndReplayAreShown(t *testing.T) {
	s := newSite(t)
	r := s.record(t, "SM-1200", "A", "hinge", service.Lug, hingeLug)
	b := newBrowser(s)
	b.get(t, "/records/"+r.ID)
	for path, want := range map[string]string{"/verify": "✓ Verified.", "/replay": "✓ Reproduced"} {
		w := b.post(t, "/records/"+r.ID+path, url.Values{"token": {b.token}})
		if text := textOf(checkPage(t, path, w.Body.String())); w.Code != http.StatusOK || !strings.Contains(text, want) {
			t.Errorf("%s: %d, %s", path, w.Code, clip(text))
		}
	}
	for path, want := range map[string]string{"/proof.txt": "c2sp.org/tlog-proof@v1", "/entry.json": `"type":"record"`, "/record.json": r.RecordDigest} {
		if got := s.get(t, "/records/"+r.ID+path, http.StatusOK); !strings.Contains(got, want) {
			t.Errorf("%s: %s", path, clip(got))
		}
	}
}
