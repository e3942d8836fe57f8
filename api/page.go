package api

import (
	"log/slog"
	"net/http"
	"strings"

	"github.com/labstack/echo/v4"

	"jointledger/api/pages"
	"jointledger/service"
)

// mountPages adds the pages for people. They find out who asks by the session
// of a browser, and show problems as pages.
func (v *server) mountPages(e *echo.Echo) {
	p := pages.New(v.service, pages.Options{
		Admit: v.admit, OpenAPI: v.options.OpenAPI,
		Explain: func(err error) (int, string) {
			kind := kindOf(problemOf(err).Code)
			return kind.status, kind.title
		},
		Report: func(r *http.Request, w http.ResponseWriter, err error) {
			v.options.Log.LogAttrs(r.Context(), slog.LevelError, "request failed",
				append(traceOf(r.Header).attributes(w.Header().Get(requestIDHeader)), slog.String("error", err.Error()))...)
		},
	})
	handler := echo.WrapHandler(p)
	braces := strings.NewReplacer("{", ":", "}", "")
	for _, pattern := range p.Patterns() {
		method, path, _ := strings.Cut(pattern, " ")
		e.Add(method, braces.Replace(path), handler)
	}
}

// admit finds out who visits a page.
func (v *server) admit(w http.ResponseWriter, r *http.Request, session string) (service.Caller, error) {
	caller := local
	if mode, _ := r.Context().Value(modeKey{}).(mode); !mode.open {
		if mode.err != nil {
			return service.Caller{}, mode.err // perhaps nobody need sign in
		}
		var err error
		if caller, err = v.service.CallerOf(r.Context(), session); err != nil {
			return service.Caller{}, err
		}
	}
	return caller, v.limiter.take(caller, w.Header())
}
