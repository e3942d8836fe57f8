// Package notice delivers notices to other systems as webhooks: one POST each,
// in the form and with the signatures of Standard Webhooks
// (https://www.standardwebhooks.com, from memory 95%), so that the libraries
// for receiving those verify it.
//
// The address of a system is looked at when the connection is made, after the
// name was resolved: a name that comes to lead to this machine or into a
// private network is not followed, nor is a redirect or a proxy of the
// environment, unless the system is said to be private.
package notice

import (
	"bytes"
	"context"
	"crypto/ed25519"
	"crypto/hmac"
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/netip"
	"net/url"
	"strconv"
	"strings"
	"syscall"
	"time"

	"jointledger/service"
	"jointledger/service/strictjson"
)

// system is one that is told, as a file names it.
type system struct {
	Name string `json:"name"`
	URL  string `json:"url"`
	// Key signs: whsec_ and base64 of a secret that is shared (HMAC-SHA256),
	// or whsk_ and base64 of a private Ed25519 key.
	Key string `json:"key"`
	// Private lets the address be one of this machine or of a private network,
	// and lets it be http.
	Private *bool `json:"private,omitzero"`
}

// target is a system that can be told.
type target struct {
	url  string
	sign func(content []byte) string
	http *http.Client
}

// Targets are the systems that are told, by name.
type Targets map[string]target

// attemptTime ends an attempt.
const attemptTime = 10 * time.Second

// Prefixes of keys, and the least bytes of a shared secret.
const (
	sharedPrefix  = "whsec_"
	privatePrefix = "whsk_"
	leastSecret   = 24
)

// NewTargets reads a file {"notify": [{"name", "url", "key", "private"}]}. The
// error names every field that cannot be used, with its line, and no key.
func NewTargets(text []byte) (Targets, error) {
	var file struct {
		Notify []system `json:"notify"`
	}
	lines := strictjson.Lines(text)
	var faults []error
	fault := func(pointer, detail string) {
		faults = append(faults, fmt.Errorf("line %d: %s %s", lines(pointer), pointer, detail))
	}
	if err := strictjson.Decode(text, &file); err != nil {
		var e *strictjson.Error
		if !errors.As(err, &e) {
			return nil, err
		}
		fault(e.Pointer, e.Detail)
	}
	targets := Targets{}
	for i, s := range file.Notify {
		at := fmt.Sprintf("/notify/%d", i)
		if _, twice := targets[s.Name]; twice || s.Name == "" || len(s.Name) > 100 {
			fault(at+"/name", "must be a name of its own, of 1 to 100 bytes")
		}
		private := s.Private != nil && *s.Private
		if u, err := url.Parse(s.URL); err != nil || u.Host == "" || u.User != nil || u.Scheme != "https" && (u.Scheme != "http" || !private) {
			fault(at+"/url", "must be like https://host/path; http only where private is true")
		}
		sign, err := signer(s.Key)
		if err != nil {
			fault(at+"/key", err.Error())
		}
		targets[s.Name] = target{s.URL, sign, newHTTP(private)}
	}
	return targets, errors.Join(faults...)
}

// Names are those of the systems.
func (t Targets) Names() []string {
	var names []string
	for name := range t {
		names = append(names, name)
	}
	return names
}

// signer makes the function that signs with a key: the scheme's version, a
// comma, and the signature in base64.
func signer(key string) (func(content []byte) string, error) {
	errKey := fmt.Errorf("must be %s and base64 of at least %d random bytes, or %s and base64 of an Ed25519 seed or private key", sharedPrefix, leastSecret, privatePrefix)
	if text, ok := strings.CutPrefix(key, sharedPrefix); ok {
		secret, err := base64.StdEncoding.DecodeString(text)
		if err != nil || len(secret) < leastSecret {
			return nil, errKey
		}
		return func(content []byte) string {
			mac := hmac.New(sha256.New, secret)
			mac.Write(content)
			return "v1," + base64.StdEncoding.EncodeToString(mac.Sum(nil))
		}, nil
	}
	text, ok := strings.CutPrefix(key, privatePrefix)
	raw, err := base64.StdEncoding.DecodeString(text)
	if !ok || err != nil {
		return nil, errKey
	}
	var private ed25519.PrivateKey
	switch len(raw) {
	case ed25519.SeedSize:
		private = ed25519.NewKeyFromSeed(raw)
	case ed25519.PrivateKeySize:
		private = ed25519.NewKeyFromSeed(raw[:ed25519.SeedSize])
		if !bytes.Equal(private, raw) {
			return nil, errKey
		}
	default:
		return nil, errKey
	}
	return func(content []byte) string {
		return "v1a," + base64.StdEncoding.EncodeToString(ed25519.Sign(private, content))
	}, nil
}

// newHTTP makes the client of one system.
func newHTTP(private bool) *http.Client {
	dialer := &net.Dialer{Timeout: attemptTime}
	if !private {
		dialer.Control = func(_, address string, _ syscall.RawConn) error { return publicOnly(address) }
	}
	return &http.Client{
		Timeout:       attemptTime,
		CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse },
		Transport: &http.Transport{
			DialContext: dialer.DialContext, TLSHandshakeTimeout: attemptTime, ForceAttemptHTTP2: true,
			MaxIdleConnsPerHost: 1, IdleConnTimeout: time.Minute,
		},
	}
}

// notPublic are networks that netip has no word for.
var notPublic = []netip.Prefix{
	netip.MustParsePrefix("0.0.0.0/8"),      // this network (RFC 1122)
	netip.MustParsePrefix("100.64.0.0/10"),  // shared by carriers (RFC 6598)
	netip.MustParsePrefix("192.0.0.0/24"),   // protocols (RFC 6890)
	netip.MustParsePrefix("198.18.0.0/15"),  // benchmarks (RFC 2544)
	netip.MustParsePrefix("240.0.0.0/4"),    // reserved (RFC 1112)
	netip.MustParsePrefix("64:ff9b::/96"),   // IPv4 behind a translator (RFC 6052)
	netip.MustParsePrefix("64:ff9b:1::/48"), // the same, local (RFC 8215)
	netip.MustParsePrefix("2002::/16"),      // IPv4 in 6to4 (RFC 3056)
	netip.MustParsePrefix("2001::/32"),      // IPv4 in Teredo (RFC 4380)
	netip.MustParsePrefix("fec0::/10"),      // site-local, of old (RFC 3879)
}

// publicOnly refuses an address, as resolved, that is not of the public
// internet.
func publicOnly(address string) error {
	at, err := netip.ParseAddrPort(address)
	if err != nil {
		return err
	}
	ip := at.Addr().Unmap().WithZone("")
	refused := !ip.IsGlobalUnicast() || ip.IsPrivate()
	for _, network := range notPublic {
		refused = refused || network.Contains(ip)
	}
	if refused {
		return fmt.Errorf("%s is not an address of the public internet; a system there must be said to be private", ip)
	}
	return nil
}

// Send implements service.Sender. Any status from 200 to 299 takes the notice.
func (t Targets) Send(ctx context.Context, n service.Notice) error {
	to, ok := t[n.Target]
	if !ok {
		return fmt.Errorf("no system is called %q any more", n.Target)
	}
	request, err := http.NewRequestWithContext(ctx, http.MethodPost, to.url, bytes.NewReader(n.Body))
	if err != nil {
		return err
	}
	at := strconv.FormatInt(time.Now().Unix(), 10)
	content := append([]byte(n.ID+"."+at+"."), n.Body...)
	request.Header.Set("Content-Type", "application/json")
	request.Header.Set("User-Agent", "jointledger")
	request.Header.Set("Webhook-Id", n.ID)
	request.Header.Set("Webhook-Timestamp", at)
	request.Header.Set("Webhook-Signature", to.sign(content))
	response, err := to.http.Do(request)
	if err != nil {
		return err
	}
	_, _ = io.CopyN(io.Discard, response.Body, 64<<10) // so that the connection serves again
	_ = response.Body.Close()
	if response.StatusCode/100 != 2 {
		return fmt.Errorf("%s answers with %d", n.Target, response.StatusCode)
	}
	return nil
}
