package api

import (
	"errors"
	"html/template"
	"log/slog"
	"net/http"
	"slices"
	"strings"

	"github.com/labstack/echo/v4"

	"jointledger/service"
	"jointledger/service/strictjson"
)

// problemKind is what every problem of a type has in common.
type problemKind struct {
	code    service.Code
	status  int
	title   string
	explain string
}

// problemKinds maps the codes of the application to HTTP, here and nowhere
// else.
var problemKinds = []problemKind{
	{service.Malformed, 400, "Malformed request", "The bytes are not the JSON, or the query not the parameters, that this operation takes: bad syntax, an unknown or duplicate member, a wrong type, a required member that is missing, or a word outside a fixed set. Correct the request; sending it again as it is cannot succeed."},
	{service.Unauthenticated, 401, "Who are you?", "The operation needs an API key, sent as Authorization: Bearer KEY, and there was none or one that is not known or was revoked."},
	{service.Forbidden, 403, "Not allowed", "The caller's role does not include this operation, or the request came through a proxy to a server that is open only to its own machine."},
	{service.SeparationOfDuties, 403, "Somebody else must do this", "Nobody checks or approves their own record, and nobody approves what they checked."},
	{service.NotFound, 404, "Not found", "There is nothing under this address."},
	{service.MethodNotAllowed, 405, "Method not allowed", "The address exists and does not take this method; the Allow header names those that it takes."},
	{service.Conflict, 409, "Conflict", "What is asked contradicts what the ledger already says."},
	{service.IdempotencyMismatch, 409, "Idempotency key used before", "The Idempotency-Key was sent before with another body. Use a new key for a new request."},
	{service.TooLarge, 413, "Too large", "The body is larger than this operation takes."},
	{service.UnsupportedMediaType, 415, "Unsupported media type", "The body must be of the media type that the problem names."},
	{service.Misdirected, 421, "Misdirected request", "A server without keys answers only under a loopback name, so that no web page elsewhere can use it through a browser."},
	{service.Invalid, 422, "Values that cannot be used", "The request can be read, and some of its values cannot be used. Every one of them is listed with a pointer to it."},
	{service.RateLimited, 429, "Too many requests", "The caller has used up its rate; Retry-After says when to come back."},
	{service.Internal, 500, "A defect of the server", "Something failed that should not have. The server's log has it under the request id."},
	{service.Unavailable, 503, "Not available now", "The ledger cannot be reached. Nothing that was acknowledged is lost; try again after Retry-After with the same Idempotency-Key."},
}

func kindOf(code service.Code) problemKind {
	i := slices.IndexFunc(problemKinds, func(k problemKind) bool { return k.code == code })
	if i < 0 {
		return kindOf(service.Internal)
	}
	return problemKinds[i]
}

// problemDocument is the body of RFC 9457.
type problemDocument struct {
	Type     string               `json:"type"`
	Title    string               `json:"title"`
	Status   int                  `json:"status"`
	Detail   string               `json:"detail"`
	Instance string               `json:"instance"`
	Errors   []service.FieldError `json:"errors"`
}

func document(p *service.Problem, requestID string) problemDocument {
	kind := kindOf(p.Code)
	return problemDocument{
		Type: "/problems/" + string(kind.code), Title: kind.title, Status: kind.status,
		Detail: p.Detail, Instance: requestID, Errors: p.Errors,
	}
}

// problemOf finds the problem in an error, Internal for a defect.
func problemOf(err error) *service.Problem {
	var p *service.Problem
	if errors.As(err, &p) {
		return p
	}
	var h *echo.HTTPError
	if errors.As(err, &h) {
		switch h.Code {
		case http.StatusNotFound:
			return &service.Problem{Code: service.NotFound, Detail: "There is nothing under this address."}
		case http.StatusMethodNotAllowed:
			return &service.Problem{Code: service.MethodNotAllowed, Detail: "This address does not take this method."}
		}
	}
	return &service.Problem{Code: service.Internal, Detail: "The server failed; its log has the cause under the request id."}
}

// EncodeProblem writes an error as the body of a problem.
func EncodeProblem(err error, requestID string) []byte {
	body, encodeErr := strictjson.Encode(document(problemOf(err), requestID))
	if encodeErr != nil {
		return []byte("{}")
	}
	return body
}

// fail answers an error, once.
func (v *server) fail(c echo.Context, err error) {
	p := problemOf(err)
	kind := kindOf(p.Code)
	header := c.Response().Header()
	id := header.Get(requestIDHeader)
	// A stream that has begun can only be cut; the log says why.
	if kind.status >= 500 || c.Response().Committed {
		v.options.Log.LogAttrs(c.Request().Context(), slog.LevelError, "request failed",
			append(traceOf(c.Request().Header).attributes(id), slog.String("error", err.Error()))...)
	}
	if c.Response().Committed {
		return
	}
	switch kind.status {
	case http.StatusServiceUnavailable:
		header.Set(echo.HeaderRetryAfter, "2")
	case http.StatusUnauthorized:
		header.Set(echo.HeaderWWWAuthenticate, "Bearer")
	}
	header.Set(echo.HeaderCacheControl, "no-store")
	if sendErr := c.Blob(kind.status, "application/problem+json", EncodeProblem(err, id)); sendErr != nil {
		v.options.Log.LogAttrs(c.Request().Context(), slog.LevelDebug, "caller has gone", slog.String("request", id))
	}
}

var problemPage = template.Must(template.New("problem").Parse(`<!doctype html>
<html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width, initial-scale=1"><title>{{.Title}}</title></head>
<body><h1>{{.Title}}</h1><p>Status {{.Status}}, type <code>/problems/{{.Code}}</code></p><p>{{.Explain}}</p></body></html>
`))

// explainProblem is the page that a problem's type leads to.
func explainProblem(code string) (*Response, error) {
	i := slices.IndexFunc(problemKinds, func(k problemKind) bool { return string(k.code) == code })
	if i < 0 {
		return nil, &service.Problem{Code: service.NotFound, Detail: "There is no problem of this type."}
	}
	k := problemKinds[i]
	var b strings.Builder
	err := problemPage.Execute(&b, struct {
		Title, Explain, Code string
		Status               int
	}{k.title, k.explain, string(k.code), k.status})
	return &Response{ContentType: "text/html; charset=utf-8", Body: []byte(b.String())}, err
}
