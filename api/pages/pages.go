// Package pages shows the ledger to people: HTML made on the server, drawings
// to scale, a sheet to print. Nothing here needs a script to be read, and every
// fact shown is also an answer of the API.
package pages

import (
	"bytes"
	"crypto/sha256"
	"embed"
	"errors"
	"fmt"
	"html/template"
	"net/http"
	"strings"
	"sync"
	"time"

	"jointledger/service"
)

//go:embed templates
var templateFiles embed.FS

//go:embed static/style.css
var style []byte

//go:embed static/form.js
var script []byte

// Options are what the pages are told at start.
type Options struct {
	// Admit finds out who asks, by the token of a session (empty for none),
	// and may refuse, such as who asks too often.
	Admit func(w http.ResponseWriter, r *http.Request, session string) (service.Caller, error)
	// Explain turns an error into a status and a title.
	Explain func(err error) (status int, title string)
	// Report tells the operator of a failure of the server.
	Report func(r *http.Request, w http.ResponseWriter, err error)
	// OpenAPI is the document that describes the API.
	OpenAPI []byte
}

// Pages answers the addresses that people use.
type Pages struct {
	service   *service.Service
	options   Options
	mux       *http.ServeMux
	patterns  []string
	templates map[string]*template.Template
	origin    *http.CrossOriginProtection
	reference func() (*reference, error)
}

// New makes the pages of a service.
func New(s *service.Service, options Options) *Pages {
	p := &Pages{
		service: s, options: options, mux: http.NewServeMux(), templates: templates(), origin: http.NewCrossOriginProtection(),
		reference: sync.OnceValues(func() (*reference, error) { return readReference(options.OpenAPI) }),
	}
	p.page("GET /{$}", p.home)
	p.page("GET /records/{id}", p.record)
	p.page("GET /records/{id}/sheet.css", p.sheet)
	p.page("GET /records/{id}/record.json", p.recordJSON)
	p.page("GET /records/{id}/entry.json", p.entryJSON)
	p.page("GET /records/{id}/proof.txt", p.proofText)
	p.page("POST /records/{id}/verify", p.verify)
	p.page("POST /records/{id}/replay", p.replay)
	p.page("GET /parts", p.part)
	p.page("GET /materials", p.materials)
	p.page("GET /fastener-types", p.fastenerTypes)
	p.page("GET /methods", p.methods)
	p.page("GET /rules", p.rules)
	p.page("GET /curve-sets", p.curveSets)
	p.page("GET /curve-sets/{name}", p.curveSet)
	p.page("GET /try/{kind}", p.tryForm)
	p.page("POST /try/{kind}", p.tryAnswer)
	p.page("POST /sign-out", p.signOut)
	p.open("GET /sign-in", p.signInForm)
	p.open("POST /sign-in", p.signIn)
	p.open("GET /api", p.document)
	p.file("GET /static/style.css", "text/css; charset=utf-8", style)
	p.file("GET /static/form.js", "text/javascript; charset=utf-8", script)
	return p
}

// file answers a file of this program.
func (p *Pages) file(pattern, media string, data []byte) {
	tag := fmt.Sprintf("%q", fmt.Sprintf("%x", sha256.Sum256(data)))
	p.handle(pattern, func(w http.ResponseWriter, r *http.Request) {
		header := w.Header()
		header.Set("Content-Type", media)
		header.Set("Cache-Control", "no-cache")
		header.Set("ETag", tag)
		http.ServeContent(w, r, "", time.Time{}, bytes.NewReader(data))
	})
}

// Patterns are the methods and paths that the pages answer, as of net/http.
func (p *Pages) Patterns() []string { return p.patterns }

// ServeHTTP implements http.Handler.
func (p *Pages) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	header := w.Header()
	header.Set("Content-Security-Policy", "default-src 'none'; style-src 'self'; script-src 'self'; connect-src 'self'; img-src 'self'; form-action 'self'; base-uri 'none'; frame-ancestors 'none'")
	header.Set("X-Content-Type-Options", "nosniff")
	header.Set("Referrer-Policy", "same-origin")
	header.Set("Cross-Origin-Opener-Policy", "same-origin")
	header.Set("Cross-Origin-Resource-Policy", "same-origin")
	p.mux.ServeHTTP(w, r)
}

func (p *Pages) handle(pattern string, do http.HandlerFunc) {
	p.patterns = append(p.patterns, strings.Replace(pattern, "{$}", "", 1))
	p.mux.HandleFunc(pattern, do)
}

// visit is one request for a page.
type visit struct {
	w      http.ResponseWriter
	r      *http.Request
	caller service.Caller // without a name where nobody is signed in
	cookie string         // of this browser; its forms are tied to it
}

// page answers those who are signed in.
func (p *Pages) page(pattern string, do func(*visit) error) {
	p.handle(pattern, p.visited(true, do))
}

// open answers everybody.
func (p *Pages) open(pattern string, do func(*visit) error) {
	p.handle(pattern, p.visited(false, do))
}

// mostForm is how large a form may be.
const mostForm = 1 << 20

func (p *Pages) visited(closed bool, do func(*visit) error) http.HandlerFunc {
	return func(w http.ResponseWriter, r *http.Request) {
		v := &visit{w: w, r: r, cookie: cookieOf(r)}
		// What is shown depends on who asks and on the ledger of now.
		w.Header().Set("Cache-Control", "no-store")
		err := p.admit(v, closed)
		if err == nil {
			err = p.formOf(v)
		}
		if err == nil {
			err = do(v)
		}
		if err != nil {
			p.fail(v, err)
		}
	}
}

// admit finds out who visits.
func (p *Pages) admit(v *visit, closed bool) (err error) {
	v.caller, err = p.options.Admit(v.w, v.r, v.cookie)
	var problem *service.Problem
	if !closed && errors.As(err, &problem) && problem.Code == service.Unauthenticated {
		return nil
	}
	return err
}

// fail shows an error; whoever is not signed in is asked to.
func (p *Pages) fail(v *visit, err error) {
	var problem *service.Problem
	if !errors.As(err, &problem) {
		problem = &service.Problem{Code: service.Internal, Detail: "The server failed; its log has the cause under the request id."}
	}
	if problem.Code == service.Unauthenticated && v.r.Method == http.MethodGet {
		http.Redirect(v.w, v.r, "/sign-in?"+backTo(v.r), http.StatusSeeOther)
		return
	}
	status, title := p.options.Explain(err)
	if status >= http.StatusInternalServerError {
		p.options.Report(v.r, v.w, err)
	}
	p.show(v, status, "problem", title, problem)
}

// view is what every page has.
type view struct {
	Title   string
	Caller  service.Caller
	Signed  bool // in by a session, thus able to sign out
	Here    string
	Token   string // for forms
	Printed string // the address of the sheet's stylesheet
	Script  bool
	Content any
}

// show writes a page.
func (p *Pages) show(v *visit, status int, name, title string, content any) {
	shown := view{
		Title: title, Caller: v.caller, Signed: v.caller.Name != "" && v.caller.Role != service.Local,
		Here: v.r.URL.Path, Token: formToken(p.browser(v)), Content: content, Script: name == "try",
	}
	if name == "record" {
		shown.Printed = "/records/" + v.r.PathValue("id") + "/sheet.css"
	}
	var b bytes.Buffer
	if err := p.templates[name].ExecuteTemplate(&b, "page", shown); err != nil {
		// A page that cannot be made is a defect; nothing of it was sent.
		p.options.Report(v.r, v.w, err)
		http.Error(v.w, "The page could not be made.", http.StatusInternalServerError)
		return
	}
	v.w.Header().Set("Content-Type", "text/html; charset=utf-8")
	v.w.WriteHeader(status)
	_, _ = v.w.Write(b.Bytes()) // the reader has gone; nothing is lost
}

func templates() map[string]*template.Template {
	functions := template.FuncMap{
		"number": number, "margin": margin, "value": value, "unit": unit, "words": words, "symbol": symbol, "equation": equation,
		"day": day, "moment": moment, "length": length, "deref": deref, "short": shortDigest, "sign": verdictSign, "recordLink": recordLink,
		"add": func(a, b int) int { return a + b }, "kindName": kindName, "optional": optional, "placeIn": placeIn, "json": jsonCell, "split": strings.Fields,
		"choose": func(chosen string, options ...string) choice { return choice{options, chosen} },
		"stock":  func(items []service.MaterialItem, chosen, empty string) stock { return stock{items, chosen, empty} },
	}
	base := template.Must(template.New("").Funcs(functions).ParseFS(templateFiles, "templates/page.html", "templates/parts.html"))
	all := map[string]*template.Template{}
	for _, name := range []string{"home", "record", "part", "materials", "fastener-types", "methods", "rules", "curve-sets", "curve-set", "try", "sign-in", "document", "problem"} {
		all[name] = template.Must(template.Must(base.Clone()).ParseFS(templateFiles, "templates/"+name+".html"))
	}
	return all
}
