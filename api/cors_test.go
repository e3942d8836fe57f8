package api_test

import (
	"net/http"
	"testing"

	"jointledger/api"
	"jointledger/store/storetest"
)

// TestPagesOfChosenOriginsMayCall: a browser asks first, and only the origins
// that the owner chose are told yes.
func TestPagesOfChosenOriginsMayCall(t *testing.T) {
	const chosen, other = "https://desk.saltmarsh.example", "https://elsewhere.example"
	none := serve(t, storetest.SQLite(t))
	some := serveWith(t, storetest.SQLite(t), api.Options{CORSOrigins: []string{chosen}})
	for _, c := range []struct {
		client
		origin, allowed string
	}{{none, chosen, ""}, {some, chosen, chosen}, {some, other, ""}} {
		asked := call{method: http.MethodOptions, target: "/v1/lugs"}.
			with("Origin", c.origin).with("Access-Control-Request-Method", "POST").with("Access-Control-Request-Headers", "authorization,content-type")
		preflight, _, _ := c.exchange(t, asked)
		if found := preflight.header.Get("Access-Control-Allow-Origin"); found != c.allowed {
			t.Errorf("asked for %s: %q is allowed, want %q", c.origin, found, c.allowed)
		}
		a := c.do(t, get("/v1/rules").with("Origin", c.origin))
		if found := a.header.Get("Access-Control-Allow-Origin"); a.status != http.StatusOK || found != c.allowed {
			t.Errorf("called from %s: %d, %q is allowed, want %q", c.origin, a.status, found, c.allowed)
		}
		if a.header.Get("Access-Control-Allow-Credentials") != "" {
			t.Errorf("called from %s: credentials are allowed", c.origin)
		}
	}
}
