package api

import (
	"context"
	"net/http"
	"strings"

	"jointledger/service"
)

// local is whoever asks a server without keys.
var local = service.Caller{Name: "local", Role: service.Local}

// authenticate finds out who asks, before anything of the body is read.
func (v *server) authenticate(ctx context.Context, r *http.Request) (service.Caller, error) {
	mode, _ := r.Context().Value(modeKey{}).(mode)
	if mode.open {
		return local, nil
	}
	key, ok := strings.CutPrefix(r.Header.Get("Authorization"), "Bearer ")
	switch {
	case !ok && mode.err != nil:
		return service.Caller{}, mode.err // perhaps none is needed
	case !ok:
		return service.Caller{}, &service.Problem{Code: service.Unauthenticated, Detail: "Send an API key as Authorization: Bearer KEY."}
	}
	return v.service.Authenticate(ctx, key)
}
