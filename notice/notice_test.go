package notice

import (
	"context"
	"crypto/ed25519"
	"crypto/hmac"
	"crypto/sha256"
	"encoding/base64"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"strconv"
	"strings"
	"testing"
	"time"

	"jointledger/service"
)

var secret = []byte("a secret of thirty-two bytes, ok")

func targets(t *testing.T, url, key string, private bool) Targets {
	t.Helper()
	found, err := NewTargets(fmt.Appendf(nil, `{"notify": [{"name": "vault", "url": %q, "key": %q, "private": %t}]}`, url, key, private))
	if err != nil {
		t.Fatal(err)
	}
	return found
}

var note = service.Notice{ID: "0192-a", Target: "vault", Body: []byte(`{"type":"record.withdrawn"}`)}

// receiver verifies as the other side does: the signed content is the id, the
// timestamp in seconds and the body, joined by full stops.
func receiver(t *testing.T, verify func(content []byte, signature string) bool) *httptest.Server {
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		body, err := io.ReadAll(r.Body)
		if err != nil {
			t.Error(err)
		}
		at := r.Header.Get("Webhook-Timestamp")
		seconds, err := strconv.ParseInt(at, 10, 64)
		if age := time.Since(time.Unix(seconds, 0)); err != nil || age < -time.Minute || age > time.Minute {
			t.Errorf("the timestamp %q", at)
		}
		content := []byte(r.Header.Get("Webhook-Id") + "." + at + "." + string(body))
		if r.Method != http.MethodPost || r.Header.Get("Webhook-Id") != note.ID || string(body) != string(note.Body) || !verify(content, r.Header.Get("Webhook-Signature")) {
			t.Errorf("received %s %v %s", r.Method, r.Header, body)
		}
		w.WriteHeader(http.StatusNoContent)
	}))
	t.Cleanup(s.Close)
	return s
}

func TestSendWithASharedSecret(t *testing.T) {
	s := receiver(t, func(content []byte, signature string) bool {
		mac := hmac.New(sha256.New, secret)
		mac.Write(content)
		return signature == "v1,"+base64.StdEncoding.EncodeToString(mac.Sum(nil))
	})
	to := targets(t, s.URL, "whsec_"+base64.StdEncoding.EncodeToString(secret), true)
	if err := to.Send(t.Context(), note); err != nil {
		t.Error(err)
	}
}

func TestSendWithAPrivateKey(t *testing.T) {
	private := ed25519.NewKeyFromSeed(secret)
	s := receiver(t, func(content []byte, signature string) bool {
		text, ok := strings.CutPrefix(signature, "v1a,")
		raw, err := base64.StdEncoding.DecodeString(text)
		return ok && err == nil && ed25519.Verify(private.Public().(ed25519.PublicKey), content, raw)
	})
	for _, key := range [][]byte{secret, private} {
		to := targets(t, s.URL, "whsk_"+base64.StdEncoding.EncodeToString(key), true)
		if err := to.Send(t.Context(), note); err != nil {
			t.Error(err)
		}
	}
}

func TestOnlySuccessTakesANotice(t *testing.T) {
	followed := false
	var status int
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		followed = followed || r.URL.Path == "/elsewhere"
		w.Header().Set("Location", "/elsewhere")
		w.WriteHeader(status)
	}))
	defer s.Close()
	to := targets(t, s.URL, "whsec_"+base64.StdEncoding.EncodeToString(secret), true)
	for status = range map[int]bool{301: true, 307: true, 308: true, 400: true, 404: true, 410: true, 500: true, 503: true} {
		if err := to.Send(t.Context(), note); err == nil || !strings.Contains(err.Error(), strconv.Itoa(status)) {
			t.Errorf("%d: %v", status, err)
		}
	}
	if followed {
		t.Error("a redirect was followed")
	}
	other := note
	other.Target = "gone"
	if err := to.Send(t.Context(), other); err == nil {
		t.Error("sent to a system that is not there")
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if err := to.Send(ctx, note); err == nil {
		t.Error("sent after the end")
	}
}

// A name that resolves to this machine is refused when connecting.
func TestPrivateAddressesAreNotCalled(t *testing.T) {
	called := false
	s := httptest.NewTLSServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { called = true }))
	defer s.Close()
	port := s.URL[strings.LastIndexByte(s.URL, ':'):]
	for _, host := range []string{"127.0.0.1", "localhost", "[::ffff:127.0.0.1]"} {
		to := targets(t, "https://"+host+port+"/", "whsec_"+base64.StdEncoding.EncodeToString(secret), false)
		if err := to.Send(t.Context(), note); err == nil || !strings.Contains(err.Error(), "not an address of the public internet") {
			t.Errorf("%s: %v", host, err)
		}
	}
	if called {
		t.Error("a private address was called")
	}
}

func TestPublicOnly(t *testing.T) {
	for address, want := range map[string]bool{
		"203.0.114.1": true, "8.8.8.8": true, "2600::1": true,
		"127.0.0.1": false, "127.9.9.9": false, "0.0.0.0": false, "0.1.2.3": false, "10.1.2.3": false, "172.16.0.1": false, "172.31.255.255": false,
		"192.168.1.1": false, "169.254.169.254": false, "100.64.0.1": false, "192.0.0.8": false, "198.19.0.1": false, "224.0.0.1": false,
		"255.255.255.255": false, "240.0.0.1": false,
		"::1": false, "::": false, "::ffff:10.0.0.1": false, "fe80::1": false, "fe80::1%eth0": false, "fc00::1": false, "fd12::1": false, "ff02::1": false,
		"64:ff9b::a00:1": false, "2002:a00:1::": false, "2001:0:1::": false, "fec0::1": false,
	} {
		full := address + ":443"
		if strings.Contains(address, ":") {
			full = "[" + address + "]:443"
		}
		if err := publicOnly(full); (err == nil) != want {
			t.Errorf("%s: %v, want allowed %t", address, err, want)
		}
	}
	if publicOnly("nonsense") == nil {
		t.Error("nonsense is allowed")
	}
}

func TestFilesOfTargetsAreRefused(t *testing.T) {
	key := "whsec_" + base64.StdEncoding.EncodeToString(secret)
	for text, want := range map[string]string{
		`{`: "line 1",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"" + key + "\",\n\"secret\": 1}]}":                                                     "line 3: /notify/0/secret there is no member",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"http://a\", \"key\": \"" + key + "\"}]}":                                                                      "line 2: /notify/0/url must be like https",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"https://u:p@a\", \"key\": \"" + key + "\"}]}":                                                                 "/notify/0/url",
		"{\"notify\": [\n{\"name\": \"\", \"url\": \"https://a\", \"key\": \"" + key + "\"}]}":                                                                      "/notify/0/name",
		"{\"notify\": [{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"" + key + "\"},\n{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"" + key + "\"}]}": "line 2: /notify/1/name",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"whsec_c2hvcnQ=\"}]}":                                                                  "line 2: /notify/0/key",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"whsk_c2hvcnQ=\"}]}":                                                                   "line 2: /notify/0/key",
		"{\"notify\": [\n{\"name\": \"a\", \"url\": \"https://a\", \"key\": \"plain\"}]}":                                                                           "line 2: /notify/0/key",
	} {
		_, err := NewTargets([]byte(text))
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s\ngives %v, want %s", text, err, want)
		}
		if err != nil && strings.Contains(err.Error(), key) {
			t.Errorf("the error tells the key: %v", err)
		}
	}
}

// The example of the operator's page can be used as it stands.
func TestTheOperatorsExample(t *testing.T) {
	page, err := os.ReadFile("../OPERATIONS.md")
	if err != nil {
		t.Fatal(err)
	}
	_, after, _ := strings.Cut(string(page), "```json\n{\"notify\"")
	text, _, found := strings.Cut(after, "```")
	to, err := NewTargets([]byte("{\"notify\"" + text))
	if err != nil || !found || len(to) != 2 {
		t.Errorf("%d systems, %v", len(to), err)
	}
}
