// Package client calls a jointledger server from Go.
//
//	c, err := client.New("http://127.0.0.1:8080", client.Options{Key: os.Getenv("JOINTLEDGER_KEY")})
//	result, err := c.Calculate(ctx, client.Lug, input, client.View{})
//
// Every method takes a context and ends with it. A request that met a busy
// server, 503 or 429, or a broken connection is sent again with growing pauses,
// and an appending one under the same Idempotency-Key, so that it is appended
// once however often it was sent. An answer that is a problem comes back as a
// *Problem. A Client may be used from many goroutines.
package client

import (
	"bytes"
	"context"
	"crypto/rand"
	"errors"
	"fmt"
	"io"
	"math"
	randv2 "math/rand/v2"
	"mime"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"

	"jointledger/service/strictjson"
)

// Options say how to call. The zero value calls without a key, four times at
// most.
type Options struct {
	// Key is the API key; empty for a server that has none.
	Key string
	// Attempts is how often one request is sent at most, 4 when 0.
	Attempts int
	// Pause is what is waited before the second attempt, 200 ms when 0. It
	// doubles with each further one up to 5 s, and varies by half at random. A
	// longer Retry-After of the server is obeyed.
	Pause time.Duration
	// HTTP carries the requests; by default one that follows no redirects.
	HTTP *http.Client
}

// Limits of waiting and of what is read of an answer.
const (
	mostPause      = 5 * time.Second
	mostRetryAfter = time.Minute
	mostAnswer     = 256 << 20
)

// Client calls one server.
type Client struct {
	base    *url.URL
	options Options
}

// New makes a client of the server under a URL such as
// https://ledger.example:8443.
func New(server string, options Options) (*Client, error) {
	base, err := url.Parse(server)
	if err != nil {
		return nil, fmt.Errorf("the server's address: %w", err)
	}
	if base.Scheme != "http" && base.Scheme != "https" || base.Host == "" || base.RawQuery != "" || base.Fragment != "" || base.User != nil {
		return nil, fmt.Errorf("the server's address must be like http://host:port, not %q", server)
	}
	base.Path = strings.TrimSuffix(base.Path, "/")
	if options.Attempts == 0 {
		options.Attempts = 4
	}
	if options.Pause == 0 {
		options.Pause = 200 * time.Millisecond
	}
	if options.HTTP == nil {
		// A redirect would carry a part's data to an address that nobody
		// chose; the server never sends one.
		options.HTTP = &http.Client{CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse }}
	}
	return &Client{base, options}, nil
}

// Problem is an answer other than the one hoped for: the body of RFC 9457.
type Problem struct {
	Type     string       `json:"type"` // such as /problems/invalid
	Title    string       `json:"title"`
	Status   int          `json:"status"`
	Detail   string       `json:"detail"`
	Instance string       `json:"instance"` // the request id, for the server's log
	Errors   []FieldError `json:"errors"`
}

// FieldError says what is wrong with one member of the body.
type FieldError struct {
	Pointer string `json:"pointer"` // RFC 6901
	Detail  string `json:"detail"`
}

func (p *Problem) Error() string {
	text := fmt.Sprintf("%d %s: %s", p.Status, p.Title, p.Detail)
	for _, e := range p.Errors {
		text += fmt.Sprintf(" [%s %s]", e.Pointer, e.Detail)
	}
	return text
}

// Code is the last part of the problem's type, such as invalid.
func (p *Problem) Code() string { return p.Type[strings.LastIndexByte(p.Type, '/')+1:] }

// call is one request.
type call struct {
	method, path string
	query        url.Values
	body         []byte
	media        string // of the body, empty for none
	accept       string
	key          string // Idempotency-Key, empty for none
}

// newIdempotencyKey makes one for a request that appends.
func newIdempotencyKey() string { return rand.Text() }

// do sends a request until it is answered, and returns the answer's body.
func (c *Client) do(ctx context.Context, r call) ([]byte, error) {
	var last error
	for attempt := range c.options.Attempts {
		if attempt > 0 {
			if err := c.wait(ctx, attempt, last); err != nil {
				return nil, err
			}
		}
		body, err := c.once(ctx, r)
		if err == nil || !retryable(err) || ctx.Err() != nil {
			return body, err
		}
		last = err
	}
	return nil, last
}

// busy is a problem that says when to come back.
type busy struct {
	*Problem
	after time.Duration
}

func (b *busy) Unwrap() error { return b.Problem }

// broken is a connection that failed.
type broken struct{ error }

func (b broken) Unwrap() error { return b.error }

func retryable(err error) bool {
	var b *busy
	var lost broken
	return errors.As(err, &b) || errors.As(err, &lost)
}

// wait pauses before an attempt, unless the context ends first or would.
func (c *Client) wait(ctx context.Context, attempt int, last error) error {
	pause := time.Duration(math.Min(float64(c.options.Pause)*math.Pow(2, float64(attempt-1)), float64(mostPause)))
	pause = pause/2 + randv2.N(pause)
	var b *busy
	if errors.As(last, &b) {
		pause = max(pause, min(b.after, mostRetryAfter))
	}
	if deadline, ok := ctx.Deadline(); ok && time.Until(deadline) < pause {
		return last
	}
	timer := time.NewTimer(pause)
	defer timer.Stop()
	select {
	case <-timer.C:
		return nil
	case <-ctx.Done():
		return fmt.Errorf("%w (before that: %w)", ctx.Err(), last)
	}
}

// request makes what is sent.
func (c *Client) request(ctx context.Context, r call, body io.Reader) (*http.Request, error) {
	target := *c.base
	target.RawPath = target.EscapedPath() + r.path
	path, err := url.PathUnescape(target.RawPath)
	if err != nil {
		return nil, err
	}
	target.Path, target.RawQuery = path, r.query.Encode()
	request, err := http.NewRequestWithContext(ctx, r.method, target.String(), body)
	if err != nil {
		return nil, err
	}
	if r.media != "" {
		request.Header.Set("Content-Type", r.media)
	}
	if r.accept != "" {
		request.Header.Set("Accept", r.accept)
	}
	if c.options.Key != "" {
		request.Header.Set("Authorization", "Bearer "+c.options.Key)
	}
	if r.key != "" {
		request.Header.Set("Idempotency-Key", r.key)
	}
	return request, nil
}

// once sends a request and reads the answer.
func (c *Client) once(ctx context.Context, r call) ([]byte, error) {
	request, err := c.request(ctx, r, bytes.NewReader(r.body))
	if err != nil {
		return nil, err
	}
	response, err := c.options.HTTP.Do(request)
	if err != nil {
		return nil, broken{err}
	}
	body, err := io.ReadAll(io.LimitReader(response.Body, mostAnswer+1))
	_ = response.Body.Close() // it was read
	switch {
	case err != nil:
		return nil, broken{fmt.Errorf("the answer ended too early: %w", err)}
	case len(body) > mostAnswer:
		return nil, fmt.Errorf("the answer is larger than %d MiB", mostAnswer>>20)
	case response.StatusCode/100 == 2:
		return body, nil
	}
	return nil, problemOf(response, body)
}

// problemOf turns an answer that is no success into an error.
func problemOf(response *http.Response, body []byte) error {
	p := &Problem{}
	media, _, _ := mime.ParseMediaType(response.Header.Get("Content-Type"))
	if media != "application/problem+json" || strictjson.DecodeLoosely(body, p) != nil {
		*p = Problem{Title: http.StatusText(response.StatusCode), Detail: "the answer is not one of a jointledger server"}
	}
	p.Status = response.StatusCode
	if p.Status != http.StatusServiceUnavailable && p.Status != http.StatusTooManyRequests {
		return p
	}
	seconds, err := strconv.Atoi(response.Header.Get("Retry-After"))
	if err != nil || seconds < 0 {
		seconds = 0
	}
	return &busy{p, min(time.Duration(seconds)*time.Second, mostRetryAfter)}
}

// get asks for a JSON answer.
func get[T any](ctx context.Context, c *Client, path string, query url.Values) (*T, error) {
	return answer[T](c.do(ctx, call{method: http.MethodGet, path: path, query: query}))
}

// post sends a JSON body and gets a JSON answer. What appends has a key.
func post[T any](ctx context.Context, c *Client, path string, query url.Values, body any, key string) (*T, error) {
	encoded, err := strictjson.Encode(body)
	if err != nil {
		return nil, fmt.Errorf("the request cannot be written as JSON: %w", err)
	}
	return answer[T](c.do(ctx, call{method: http.MethodPost, path: path, query: query, body: encoded, media: "application/json", key: key}))
}

// answer reads a JSON answer; members that this client does not know are
// passed over, so that it goes on working with a later server.
func answer[T any](body []byte, err error) (*T, error) {
	if err != nil {
		return nil, err
	}
	into := new(T)
	if err := strictjson.DecodeLoosely(body, into); err != nil {
		return nil, fmt.Errorf("the answer cannot be read: %w", err)
	}
	return into, nil
}
