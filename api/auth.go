package api

import (
	"context"
	"net/http"
	"strings"

	"jointledger/service"
)

// authenticate finds out who asks, before anything of the body is read.
func (v *server) authenticate(ctx context.Context, r *http.Request) (service.Caller, error) {
	if r.Context().Value(openMode{}) != nil {
		return service.Caller{Name: "local", Role: service.Local}, nil
	}
	key, ok := strings.CutPrefix(r.Header.Get("Authorization"), "Bearer ")
	if !ok {
		return service.Caller{}, &service.Problem{Code: service.Unauthenticated, Detail: "Send an API key as Authorization: Bearer KEY."}
	}
	return v.service.Authenticate(ctx, key)
}
