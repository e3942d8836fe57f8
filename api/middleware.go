package api

import (
	"context"
	"crypto/rand"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"net/netip"
	"runtime/debug"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/labstack/echo/v4"

	"jointledger/service"
)

// observe gives every request its id, and counts and logs it.
func (v *server) observe(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		start := time.Now()
		id := rand.Text() // our own: a caller's is not taken over
		header := c.Response().Header()
		header.Set(requestIDHeader, id)
		header.Set(echo.HeaderXContentTypeOptions, "nosniff")
		v.metrics.inFlight.Inc()
		defer v.metrics.inFlight.Dec()
		cut := false
		if err := next(c); err != nil {
			cut = c.Response().Committed
			v.fail(c, err)
		}
		took := time.Since(start)
		status := c.Response().Status
		template := c.Path()
		if template == "" {
			template = "none"
		}
		// A label must not be what callers choose.
		method := c.Request().Method
		if !slices.Contains(methods, method) {
			method = "other"
		}
		v.metrics.requests.WithLabelValues(method, template, strconv.Itoa(status)).Observe(took.Seconds())
		v.options.Log.LogAttrs(c.Request().Context(), slog.LevelInfo, "request", append(traceOf(c.Request().Header).attributes(id),
			slog.String("method", c.Request().Method), slog.String("route", template),
			slog.Int("status", status), slog.Int64("bytes", c.Response().Size), slog.Duration("took", took))...)
		if cut {
			// Without its last chunk nobody takes the answer for a whole one.
			panic(http.ErrAbortHandler)
		}
		return nil
	}
}

// methods are those of HTTP that have a use here or are asked for by mistake.
var methods = []string{http.MethodGet, http.MethodPost, http.MethodHead, http.MethodOptions, http.MethodPut, http.MethodPatch, http.MethodDelete}

// recover turns a panic, a defect, into a problem and a log with its stack.
func (v *server) recover(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) (err error) {
		defer func() {
			if r := recover(); r != nil {
				if r == http.ErrAbortHandler {
					panic(r)
				}
				v.metrics.panics.Inc()
				err = fmt.Errorf("panic: %v\n%s", r, debug.Stack())
			}
		}()
		return next(c)
	}
}

// shield refuses what no route should see.
func (v *server) shield(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		if len(c.Request().RequestURI) > mostURL {
			return &service.Problem{Code: service.TooLarge, Detail: "The address is longer than 8 KiB."}
		}
		open, err := v.service.Open(c.Request().Context())
		c.SetRequest(c.Request().WithContext(context.WithValue(c.Request().Context(), modeKey{}, mode{open, err})))
		if !open {
			return next(c)
		}
		// Without keys whoever reaches the port may do everything, so only
		// this machine's own programs may reach it: no name that a web page
		// could rebind to loopback, no proxy that forwards strangers.
		if !loopbackName(c.Request().Host) {
			return &service.Problem{Code: service.Misdirected, Detail: "This server has no keys and answers only under a loopback name such as localhost. Make keys to open it to others: jointledger key add NAME --role ROLE."}
		}
		for name := range c.Request().Header {
			if name == "Forwarded" || strings.HasPrefix(name, "X-Forwarded-") {
				return &service.Problem{Code: service.Forbidden, Detail: "This server has no keys and answers no forwarded requests. Make keys to put it behind a proxy: jointledger key add NAME --role ROLE."}
			}
		}
		return next(c)
	}
}

// mode is what a request's context keeps under modeKey: whether the server is
// without keys, or why that cannot be told.
type mode struct {
	open bool
	err  error
}

type modeKey struct{}

// loopbackName reports whether a Host header names this machine itself.
func loopbackName(host string) bool {
	if name, _, err := net.SplitHostPort(host); err == nil {
		host = name
	}
	host = strings.TrimSuffix(strings.TrimPrefix(host, "["), "]")
	if strings.EqualFold(host, "localhost") {
		return true
	}
	address, err := netip.ParseAddr(host)
	return err == nil && address.IsLoopback()
}
