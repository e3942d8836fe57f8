package api

import (
	"context"
	"io"
	"net/http"
	"net/url"
	"strconv"

	"jointledger/service"
	"jointledger/service/strictjson"
)

const jsonMedia = "application/json"

// routes is every operation, once.
func (v *server) routes() []route {
	view := []string{"workings", "checks"}
	return []route{
		{http.MethodPost, "/v1/lugs", service.Reader, view, jsonMedia, v.calculate(service.Lug)},
		{http.MethodPost, "/v1/lugs/sizing", service.Reader, view, jsonMedia, v.sizeLug},
		{http.MethodPost, "/v1/fastener-groups", service.Reader, view, jsonMedia, v.calculate(service.FastenerGroup)},
		{http.MethodPost, "/v1/fastener-groups/sizing", service.Reader, view, jsonMedia, v.sizeGroup},
		{http.MethodPost, "/v1/splices", service.Reader, view, jsonMedia, v.calculate(service.Splice)},
		{http.MethodPost, "/v1/splices/steps", service.Reader, view, jsonMedia, v.steps},

		{http.MethodPost, service.BatchPath, service.Reader, view, ndjsonMedia, v.batches},

		{http.MethodPost, "/v1/records", service.Analyst, nil, jsonMedia, v.record},
		{http.MethodGet, "/v1/records", service.Reader, []string{
			"part", "revision", "joint", "kind", "verdict", "state", "author", "method", "material", "curve_set",
			"since", "until", "latest", "cursor", "limit",
		}, "", v.records},
		{http.MethodGet, "/v1/records/:id", service.Reader, nil, "", v.recordByID},
		{http.MethodGet, "/v1/records/:id/entry", service.Reader, nil, "", v.recordEntry},
		{http.MethodGet, "/v1/records/:id/proof", service.Reader, nil, "", v.recordProof},
		{http.MethodGet, "/v1/records/:id/verification", service.Reader, nil, "", v.verification},
		{http.MethodPost, "/v1/records/:id/sign-offs", service.Checker, nil, jsonMedia, v.signOff},
		{http.MethodPost, "/v1/records/:id/withdrawal", service.Analyst, nil, jsonMedia, v.withdraw},
		{http.MethodPost, "/v1/records/:id/replay", service.Reader, nil, "", v.replay},

		{http.MethodGet, "/v1/parts", service.Reader, []string{"part"}, "", v.part},
		{http.MethodGet, "/v1/parts/changes", service.Reader, []string{"part", "from", "to"}, "", v.partChanges},

		{http.MethodPost, "/v1/replays", service.Reader, nil, jsonMedia, v.replays},

		{http.MethodPost, "/v1/impact", service.Reader, nil, jsonMedia, v.impact},
		{http.MethodPost, "/v1/release-checks", service.Reader, []string{"dry_run"}, jsonMedia, v.releaseCheck},

		{http.MethodGet, "/v1/export", service.Reader, []string{"from"}, "", v.export},
		{http.MethodGet, "/v1/checkpoint", service.Reader, nil, "", v.checkpoint},
		{http.MethodGet, "/v1/checkpoint/consistency", service.Reader, []string{"from", "to"}, "", v.consistency},
		{http.MethodGet, "/v1/ledger/key", service.Reader, nil, "", v.ledgerKey},

		{http.MethodPost, "/v1/curve-sets", service.Admin, nil, jsonMedia, v.registerCurveSet},
		{http.MethodGet, "/v1/curve-sets", service.Reader, nil, "", v.curveSets},
		{http.MethodGet, "/v1/curve-sets/:name", service.Reader, nil, "", v.curveSet},

		{http.MethodGet, "/v1/materials", service.Reader, []string{"units"}, "", v.materials},
		{http.MethodGet, "/v1/fastener-types", service.Reader, []string{"units"}, "", v.fastenerTypes},
		{http.MethodGet, "/v1/methods", service.Reader, []string{"kind"}, "", v.methods},
		{http.MethodGet, "/v1/rules", service.Reader, []string{"units"}, "", v.rules},

		{http.MethodGet, "/problems/:type", "", nil, "", func(_ context.Context, r *Request) (*Response, error) {
			return explainProblem(r.Param("type"))
		}},
		{http.MethodGet, "/openapi.yaml", "", nil, "", v.openapi},
		{http.MethodGet, "/healthz", "", nil, "", v.healthz},
		{http.MethodGet, "/readyz", "", nil, "", v.readyz},
		{http.MethodGet, "/metrics", "", nil, "", v.exposition},
	}
}

// encoded answers a value as JSON.
func encoded(value any, err error) (*Response, error) {
	if err != nil {
		return nil, err
	}
	body, err := strictjson.Encode(value)
	return &Response{ContentType: jsonMedia, Body: body}, err
}

// viewOf reads how much of an answer is wanted.
func viewOf(query url.Values) (service.View, error) {
	view := service.View{Checks: query.Get("checks")}
	var found []service.FieldError
	switch query.Get("workings") {
	case "none":
		view.NoWorkings = true
	case "":
	default:
		found = append(found, service.QueryFault("workings", "must be none, or left out"))
	}
	if query.Has("checks") && view.Checks != "all" && view.Checks != "governing" {
		found = append(found, service.QueryFault("checks", "must be all or governing, or left out"))
	}
	if found != nil {
		return view, service.MalformedQuery(found...)
	}
	return view, nil
}

func (v *server) calculate(kind service.Kind) func(context.Context, *Request) (*Response, error) {
	return func(ctx context.Context, r *Request) (*Response, error) {
		view, err := viewOf(r.Query)
		if err != nil {
			return nil, err
		}
		return encoded(v.service.Calculate(ctx, kind, r.Body, view))
	}
}

func (v *server) sizeLug(ctx context.Context, r *Request) (*Response, error) {
	view, err := viewOf(r.Query)
	if err != nil {
		return nil, err
	}
	return encoded(v.service.SizeLug(ctx, r.Body, view))
}

func (v *server) sizeGroup(_ context.Context, r *Request) (*Response, error) {
	view, err := viewOf(r.Query)
	if err != nil {
		return nil, err
	}
	return encoded(service.SizeGroup(r.Body, view))
}

func (v *server) steps(_ context.Context, r *Request) (*Response, error) {
	view, err := viewOf(r.Query)
	if err != nil {
		return nil, err
	}
	return encoded(service.Steps(r.Body, view))
}

// batches answers documents while they come.
func (v *server) batches(_ context.Context, r *Request) (*Response, error) {
	view, err := viewOf(r.Query)
	if err != nil {
		return nil, err
	}
	say := func(err error) []byte {
		if kindOf(problemOf(err).Code).status >= 500 {
			v.options.Log.Error("line of a batch failed", "request", r.ID, "error", err.Error())
		}
		return EncodeProblem(err, r.ID)
	}
	return &Response{ContentType: ndjsonMedia, Duplex: true, Stream: func(ctx context.Context, w io.Writer) error {
		return v.service.Batch(ctx, r.Caller, view, r.Stream, w, say)
	}}, nil
}

// idempotency reads the Idempotency-Key of a request that appends.
func idempotency(r *Request) (service.Idempotency, error) {
	given := r.Header.Values("Idempotency-Key")
	if len(given) == 0 {
		return service.Idempotency{}, nil
	}
	key := given[0]
	ok := len(given) == 1 && len(key) >= 1 && len(key) <= 255
	for i := range len(key) {
		ok = ok && key[i] >= 0x20 && key[i] <= 0x7e
	}
	if !ok {
		return service.Idempotency{}, &service.Problem{Code: service.Malformed, Detail: "Idempotency-Key must be one value of 1 to 255 printable ASCII characters."}
	}
	return service.Idempotency{Key: key, Method: http.MethodPost, Path: r.Path, Body: r.Body}, nil
}

// created answers an append: 201, and whether it is a repeated answer.
func created(value any, again bool, location string) (*Response, error) {
	response, err := encoded(value, nil)
	if err != nil {
		return nil, err
	}
	response.Status = http.StatusCreated
	response.Header = map[string]string{"Location": location}
	if again {
		response.Header["Idempotency-Replayed"] = "true"
	}
	return response, nil
}

func (v *server) record(ctx context.Context, r *Request) (*Response, error) {
	key, err := idempotency(r)
	if err != nil {
		return nil, err
	}
	document, again, err := v.service.Record(ctx, r.Caller, r.Body, key)
	if err != nil {
		return nil, err
	}
	return created(document, again, "/v1/records/"+document.ID)
}

func (v *server) recordByID(ctx context.Context, r *Request) (*Response, error) {
	document, err := v.service.RecordByID(ctx, r.Param("id"))
	if err != nil {
		return nil, err
	}
	tag := `"` + document.RecordDigest + "-" + string(document.State) + "-" + strconv.Itoa(len(document.SignOffs)) + `"`
	if r.Header.Get("If-None-Match") == tag {
		return &Response{Status: http.StatusNotModified, Header: map[string]string{"ETag": tag}}, nil
	}
	response, err := encoded(document, nil)
	if err != nil {
		return nil, err
	}
	response.Header = map[string]string{"ETag": tag, "Cache-Control": "no-cache"}
	return response, nil
}

func (v *server) recordEntry(ctx context.Context, r *Request) (*Response, error) {
	data, err := v.service.EntryBytes(ctx, r.Param("id"))
	if err != nil {
		return nil, err
	}
	return &Response{ContentType: jsonMedia, Body: data, Header: map[string]string{
		"Cache-Control": "private, max-age=31536000, immutable",
	}}, nil
}

func (v *server) records(ctx context.Context, r *Request) (*Response, error) {
	q := r.Query
	list, err := v.service.Records(ctx, service.RecordQuery{
		Part: q.Get("part"), Revision: q.Get("revision"), Joint: q.Get("joint"), Kind: q.Get("kind"),
		Verdict: q.Get("verdict"), State: q.Get("state"), Author: q.Get("author"), Method: q.Get("method"),
		Material: q.Get("material"), CurveSet: q.Get("curve_set"), Since: q.Get("since"), Until: q.Get("until"),
		Latest: q.Get("latest"), Cursor: q.Get("cursor"), Limit: q.Get("limit"),
	})
	if err != nil {
		return nil, err
	}
	response, err := encoded(list, nil)
	if err == nil && list.NextCursor != nil {
		next := url.Values{}
		for name, values := range q {
			next[name] = values
		}
		next.Set("cursor", *list.NextCursor)
		response.Header = map[string]string{"Link": "<" + r.Path + "?" + next.Encode() + `>; rel="next"`}
	}
	return response, err
}

func (v *server) materials(_ context.Context, r *Request) (*Response, error) {
	return encoded(service.Materials(r.Query.Get("units")))
}

func (v *server) methods(_ context.Context, r *Request) (*Response, error) {
	return encoded(service.Methods(r.Query.Get("kind")))
}

func (v *server) rules(_ context.Context, r *Request) (*Response, error) {
	return encoded(service.Rules(r.Query.Get("units")))
}

func (v *server) fastenerTypes(_ context.Context, r *Request) (*Response, error) {
	return encoded(service.FastenerTypes(r.Query.Get("units")))
}

func (v *server) openapi(context.Context, *Request) (*Response, error) {
	return &Response{ContentType: "application/yaml", Body: v.options.OpenAPI}, nil
}

func (v *server) healthz(context.Context, *Request) (*Response, error) {
	return &Response{ContentType: "text/plain; charset=utf-8", Body: []byte("ok\n")}, nil
}

func (v *server) readyz(ctx context.Context, _ *Request) (*Response, error) {
	if err := v.service.Ready(ctx); err != nil {
		return nil, err
	}
	return &Response{ContentType: "text/plain; charset=utf-8", Body: []byte("ready\n")}, nil
}

// exposition lets the library write the metrics in its own format.
func (v *server) exposition(context.Context, *Request) (*Response, error) {
	return &Response{Handler: v.metrics.handler()}, nil
}
