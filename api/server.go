// Package api is the HTTP face of the service: routes, authentication,
// limits, problems and metrics. It is the only importer of Echo; every
// handler is a plain function of a Request.
package api

import (
	"context"
	"errors"
	"io"
	"log/slog"
	"mime"
	"net/http"
	"net/url"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/labstack/echo/v4"
	"github.com/labstack/echo/v4/middleware"

	"jointledger/service"
)

// Limits of a request.
const (
	MostBody   = 16 << 20
	mostHeader = 64 << 10
	mostURL    = 8 << 10
	// largeBody is where a body becomes large, and mostLarge how many of those
	// are in memory at once.
	largeBody = 1 << 20
	mostLarge = 8
	// MostConnections are open at once, idle ones too; more wait to be accepted.
	MostConnections = 4096
)

// Options are what the server is told at start.
type Options struct {
	Log     *slog.Logger
	Metrics *Metrics
	// RateLimit is how many requests a second a caller may make, 0 for any.
	RateLimit float64
	// CORSOrigins are the web origins whose pages may call; none by default.
	CORSOrigins []string
	// StreamIdle is how long a stream may stand still, 30 s when 0.
	StreamIdle time.Duration
	// OpenAPI is the document that describes all of this.
	OpenAPI []byte
}

// Request is what a handler is given.
type Request struct {
	ID     string // of the request, in logs and problems
	Caller service.Caller
	Param  func(name string) string
	Query  url.Values
	Body   []byte
	Stream io.ReadCloser // in the place of Body, where the route reads a stream
	Header http.Header
	Path   string
}

// Response is what a handler gives back: encoded whole before the status line,
// written by Stream, or by a Handler of another library.
type Response struct {
	Status      int // 200 when 0
	ContentType string
	Body        []byte
	Header      map[string]string
	Stream      func(ctx context.Context, w io.Writer) error
	Duplex      bool // Stream reads the request's Stream meanwhile
	Handler     http.Handler
}

// route is one operation of the contract.
type route struct {
	method, path string
	least        service.Role // empty: nobody needs to say who they are
	query        []string     // the parameters it knows
	media        string       // of the body, empty for none
	handle       func(context.Context, *Request) (*Response, error)
}

// server holds what the handlers share.
type server struct {
	service *service.Service
	options Options
	metrics *Metrics
	limiter *limiter
	large   chan struct{} // one for each large body in memory
}

// New returns the handler of all routes.
func New(s *service.Service, options Options) http.Handler {
	v := &server{service: s, options: options, metrics: options.Metrics, limiter: newLimiter(options.RateLimit), large: make(chan struct{}, mostLarge)}
	e := echo.New()
	e.HideBanner, e.HidePort = true, true
	e.IPExtractor = echo.ExtractIPDirect()
	e.HTTPErrorHandler = func(err error, c echo.Context) { v.fail(c, err) }
	// Outermost first; also what no route answers goes through here.
	e.Use(v.observe, v.recover, v.shield)
	if len(options.CORSOrigins) > 0 {
		e.Use(middleware.CORSWithConfig(middleware.CORSConfig{
			AllowOrigins:  options.CORSOrigins,
			AllowMethods:  []string{http.MethodGet, http.MethodPost},
			AllowHeaders:  []string{echo.HeaderAuthorization, echo.HeaderContentType, "Idempotency-Key", "If-None-Match"},
			ExposeHeaders: []string{"ETag", "Link", echo.HeaderLocation, "Idempotency-Replayed", requestIDHeader, "RateLimit", "RateLimit-Policy", echo.HeaderRetryAfter},
			MaxAge:        600,
		}))
	}
	for _, r := range v.routes() {
		e.Add(r.method, r.path, v.adapt(r))
	}
	v.mountPages(e)
	return e
}

// Serve makes the HTTP server around a handler, with a deadline for everything
// that a slow or idle caller could hold open.
func Serve(handler http.Handler, errorLog *slog.Logger) *http.Server {
	return &http.Server{
		Handler:           handler,
		ReadHeaderTimeout: 5 * time.Second,
		ReadTimeout:       60 * time.Second,
		WriteTimeout:      120 * time.Second,
		IdleTimeout:       90 * time.Second,
		MaxHeaderBytes:    mostHeader,
		ErrorLog:          slog.NewLogLogger(errorLog.Handler(), slog.LevelWarn),
	}
}

// adapt runs a route's handler behind Echo.
func (v *server) adapt(r route) echo.HandlerFunc {
	return func(c echo.Context) error {
		ctx := c.Request().Context()
		request := &Request{
			ID: c.Response().Header().Get(requestIDHeader), Param: func(name string) string { return param(c, name) },
			Header: c.Request().Header, Path: c.Request().URL.Path,
		}
		var err error
		if r.least != "" {
			if request.Caller, err = v.authenticate(ctx, c.Request()); err != nil {
				return err
			}
			if !request.Caller.Role.May(r.least) {
				return forbidden(request.Caller, r.least)
			}
			if err := v.limiter.take(request.Caller, c.Response().Header()); err != nil {
				return err
			}
		}
		if request.Query, err = queryOf(c.Request().URL, r.query); err != nil {
			return err
		}
		switch r.media {
		case "":
		case ndjsonMedia:
			if request.Stream, err = v.incoming(c); err != nil {
				return err
			}
		default:
			var done func()
			if request.Body, done, err = v.body(c, r.media); err != nil {
				return err
			}
			defer done()
		}
		response, err := r.handle(ctx, request)
		if err != nil {
			return err
		}
		return v.write(c, response)
	}
}

// param is a parameter of the path as the caller meant it: Echo leaves it
// escaped where the path was written with escapes that it did not need.
func param(c echo.Context, name string) string {
	value := c.Param(name)
	if c.Request().URL.RawPath == "" {
		return value
	}
	plain, err := url.PathUnescape(value)
	if err != nil {
		return value
	}
	return plain
}

// queryOf reads the query and refuses parameters that the route does not know.
func queryOf(u *url.URL, known []string) (url.Values, error) {
	values, err := url.ParseQuery(u.RawQuery)
	if err != nil {
		return nil, &service.Problem{Code: service.Malformed, Detail: "The query cannot be read: " + err.Error() + "."}
	}
	var found []service.FieldError
	for name, given := range values {
		switch {
		case !slices.Contains(known, name):
			detail := "there is no query parameter of this name; there are none here"
			if len(known) > 0 {
				detail = "there is no query parameter of this name; there are " + strings.Join(known, ", ")
			}
			found = append(found, service.QueryFault(name, detail))
		case given[0] == "":
			found = append(found, service.QueryFault(name, "is empty; give it a value or leave it out"))
		case len(given) > 1:
			found = append(found, service.QueryFault(name, "is given twice"))
		}
	}
	if found != nil {
		slices.SortFunc(found, func(a, b service.FieldError) int { return strings.Compare(a.Pointer, b.Pointer) })
		return nil, service.MalformedQuery(found...)
	}
	return values, nil
}

// body reads a body of one media type, up to the limit, and returns what is to
// be called when it is not needed any more.
func (v *server) body(c echo.Context, media string) (data []byte, done func(), err error) {
	request := c.Request()
	if err := hasMedia(request, media); err != nil {
		return nil, nil, err
	}
	done = func() {}
	defer func() {
		if err != nil {
			done()
		}
	}()
	if data, err = io.ReadAll(io.LimitReader(request.Body, largeBody)); err == nil && len(data) == largeBody {
		if done, err = v.takeLarge(request.Context()); err != nil {
			return nil, done, err
		}
		var rest []byte
		rest, err = io.ReadAll(io.LimitReader(request.Body, MostBody+1-largeBody))
		data = append(data, rest...)
	}
	if err != nil {
		return nil, done, &service.Problem{Code: service.Malformed, Detail: "The body could not be read to its end."}
	}
	if len(data) > MostBody {
		// Many clients send all before they read: without this they would
		// see a broken connection and not the reason.
		if _, err := io.CopyN(io.Discard, request.Body, MostBody); err != nil && !errors.Is(err, io.EOF) {
			v.options.Log.LogAttrs(request.Context(), slog.LevelDebug, "caller has gone", slog.String("error", err.Error()))
		}
		return nil, done, &service.Problem{Code: service.TooLarge, Detail: "The body is larger than 16 MiB."}
	}
	v.metrics.bodies.Observe(float64(len(data)))
	return data, done, nil
}

// takeLarge waits for a large body's turn, and returns what ends it.
func (v *server) takeLarge(ctx context.Context) (done func(), _ error) {
	wait := time.NewTimer(largeWait)
	defer wait.Stop()
	select {
	case v.large <- struct{}{}:
		return func() { <-v.large }, nil
	case <-ctx.Done():
	case <-wait.C:
	}
	return func() {}, &service.Problem{Code: service.Unavailable, Detail: "The server is busy with other large bodies; try again after Retry-After."}
}

func hasMedia(request *http.Request, media string) error {
	given, _, err := mime.ParseMediaType(request.Header.Get(echo.HeaderContentType))
	if err != nil || given != media {
		return &service.Problem{Code: service.UnsupportedMediaType, Detail: "The body must come as Content-Type: " + media + "."}
	}
	return nil
}

// incoming is a body that is read while the answer is written. It ends when
// nothing has moved on either side for a while.
type incoming struct {
	body    io.Reader
	control *http.ResponseController
	idle    time.Duration
}

func (v *server) incoming(c echo.Context) (*incoming, error) {
	if err := hasMedia(c.Request(), ndjsonMedia); err != nil {
		return nil, err
	}
	control := http.NewResponseController(c.Response())
	if err := control.EnableFullDuplex(); err != nil {
		return nil, err
	}
	return &incoming{c.Request().Body, control, v.idle()}, nil
}

func (i *incoming) Read(data []byte) (int, error) {
	if err := i.control.SetReadDeadline(time.Now().Add(i.idle)); err != nil {
		return 0, err
	}
	return i.body.Read(data)
}

// Close makes a Read that waits return.
func (i *incoming) Close() error { return i.control.SetReadDeadline(time.Unix(1, 0)) }

// write sends a response.
func (v *server) write(c echo.Context, r *Response) error {
	if r.Handler != nil {
		r.Handler.ServeHTTP(c.Response(), c.Request())
		return nil
	}
	header := c.Response().Header()
	for name, value := range r.Header {
		header.Set(name, value)
	}
	if r.Status == 0 {
		r.Status = http.StatusOK
	}
	if r.Status == http.StatusNotModified {
		return c.NoContent(r.Status)
	}
	if r.Stream == nil {
		header.Set(echo.HeaderContentLength, strconv.Itoa(len(r.Body)))
		return c.Blob(r.Status, r.ContentType, r.Body)
	}
	header.Set(echo.HeaderContentType, r.ContentType)
	c.Response().WriteHeader(r.Status)
	return r.Stream(c.Request().Context(), &progress{c.Response(), http.NewResponseController(c.Response()), v.idle(), r.Duplex})
}

// progress moves the deadlines of a stream on with every write.
type progress struct {
	w       io.Writer
	control *http.ResponseController
	idle    time.Duration
	duplex  bool // the caller may still be sending
}

// Deadlines that a test shortens: of a stream whose reader takes nothing, and of
// a large body that waits for its turn.
var (
	streamIdle = 30 * time.Second
	largeWait  = 10 * time.Second
)

// idle is how long a stream may stand still.
func (v *server) idle() time.Duration {
	if v.options.StreamIdle > 0 {
		return v.options.StreamIdle
	}
	return streamIdle
}

func (p *progress) Write(data []byte) (int, error) {
	end := time.Now().Add(p.idle)
	if err := p.control.SetWriteDeadline(end); err != nil {
		return 0, err
	}
	if p.duplex {
		if err := p.control.SetReadDeadline(end); err != nil {
			return 0, err
		}
	}
	return p.w.Write(data)
}

// Flush sends what was written.
func (p *progress) Flush() error { return p.control.Flush() }

const requestIDHeader = "X-Request-Id"
