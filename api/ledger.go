package api

import (
	"context"
	"mime"
	"net/url"

	"jointledger/service"
)

const (
	ndjsonMedia = "application/x-ndjson"
	textMedia   = "text/plain; charset=utf-8"
)

// plain answers a text that may change.
func plain(text string, err error) (*Response, error) {
	if err != nil {
		return nil, err
	}
	return &Response{ContentType: textMedia, Body: []byte(text), Header: map[string]string{"Cache-Control": "no-cache"}}, nil
}

func (v *server) recordProof(ctx context.Context, r *Request) (*Response, error) {
	return plain(v.service.Proof(ctx, r.Param("id")))
}

func (v *server) verification(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Verify(ctx, r.Param("id")))
}

func (v *server) part(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Part(ctx, r.Query.Get("part")))
}

func (v *server) partChanges(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Changes(ctx, r.Query.Get("part"), r.Query.Get("from"), r.Query.Get("to")))
}

func (v *server) checkpoint(ctx context.Context, _ *Request) (*Response, error) {
	return plain(v.service.Checkpoint(ctx))
}

func (v *server) ledgerKey(context.Context, *Request) (*Response, error) {
	return plain(v.service.VerifierKey()+"\n", nil)
}

func (v *server) consistency(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Consistency(ctx, r.Query.Get("from"), r.Query.Get("to")))
}

func (v *server) export(ctx context.Context, r *Request) (*Response, error) {
	stream, err := v.service.Export(ctx, r.Query.Get("from"))
	if err != nil {
		return nil, err
	}
	return &Response{ContentType: ndjsonMedia, Stream: stream}, nil
}

// about appends an entry about a record.
func (v *server) about(ctx context.Context, r *Request, do func(context.Context, service.Caller, string, []byte, service.Idempotency) (*service.Appended, bool, error)) (*Response, error) {
	key, err := idempotency(r)
	if err != nil {
		return nil, err
	}
	id := r.Param("id")
	done, again, err := do(ctx, r.Caller, id, r.Body, key)
	if err != nil {
		return nil, err
	}
	return created(done, again, "/v1/records/"+id)
}

func (v *server) signOff(ctx context.Context, r *Request) (*Response, error) {
	return v.about(ctx, r, v.service.SignOff)
}

func (v *server) withdraw(ctx context.Context, r *Request) (*Response, error) {
	return v.about(ctx, r, v.service.Withdraw)
}

func (v *server) replay(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Replay(ctx, r.Param("id")))
}

func (v *server) replays(ctx context.Context, r *Request) (*Response, error) {
	stream, err := v.service.Replays(ctx, r.Body)
	if err != nil {
		return nil, err
	}
	return &Response{ContentType: ndjsonMedia, Stream: stream}, nil
}

func (v *server) releaseCheck(ctx context.Context, r *Request) (*Response, error) {
	dryRun := false
	switch r.Query.Get("dry_run") {
	case "true":
		dryRun = true
	case "", "false":
	default:
		return nil, service.MalformedQuery(service.QueryFault("dry_run", "must be true or false, or left out"))
	}
	if !dryRun && !r.Caller.Role.May(service.Gate) {
		return nil, forbidden(r.Caller, service.Gate)
	}
	key, err := idempotency(r)
	if err != nil {
		return nil, err
	}
	decision, again, err := v.service.Judge(ctx, r.Caller, r.Body, dryRun, key)
	if err != nil {
		return nil, err
	}
	response, err := encoded(decision, nil)
	if err != nil {
		return nil, err
	}
	response.Header = map[string]string{"Vary": "Accept"}
	// For a shell: no JSON to take apart.
	if media, _, err := mime.ParseMediaType(r.Header.Get("Accept")); err == nil && media == "text/plain" {
		response.ContentType, response.Body = textMedia, []byte(decision.Text())
	}
	if again {
		response.Header["Idempotency-Replayed"] = "true"
	}
	return response, nil
}

func (v *server) impact(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.Impact(ctx, r.Body))
}

func (v *server) registerCurveSet(ctx context.Context, r *Request) (*Response, error) {
	key, err := idempotency(r)
	if err != nil {
		return nil, err
	}
	set, again, err := v.service.RegisterCurveSet(ctx, r.Caller, r.Body, key)
	if err != nil {
		return nil, err
	}
	return created(set, again, "/v1/curve-sets/"+url.PathEscape(set.CurveSet.ID+"@"+set.CurveSet.Version))
}

func (v *server) curveSets(ctx context.Context, _ *Request) (*Response, error) {
	return encoded(v.service.CurveSets(ctx))
}

func (v *server) curveSet(ctx context.Context, r *Request) (*Response, error) {
	return encoded(v.service.CurveSetByName(ctx, r.Param("name")))
}

// forbidden says which role is missing.
func forbidden(caller service.Caller, least service.Role) *service.Problem {
	return &service.Problem{Code: service.Forbidden, Detail: "This needs the role " + string(least) + ", and " + caller.Name + " has the role " + string(caller.Role) + "."}
}
