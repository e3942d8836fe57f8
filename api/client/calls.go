package client

import (
	"context"
	"errors"
	"fmt"
	"io"
	"iter"
	"net/http"
	"net/url"
	"strconv"
)

func (v View) query() url.Values {
	q := url.Values{}
	if v.NoWorkings {
		q.Set("workings", "none")
	}
	if v.Checks != "" {
		q.Set("checks", v.Checks)
	}
	return q
}

// Calculate answers one joint without keeping it. Input is anything that is
// written as the JSON of its kind.
func (c *Client) Calculate(ctx context.Context, kind Kind, input any, view View) (*Result, error) {
	return post[Result](ctx, c, "/v1/"+string(kind)+"s", view.query(), input, "")
}

// Record computes a joint and appends the result to the ledger.
func (c *Client) Record(ctx context.Context, request RecordRequest) (*Record, error) {
	return post[Record](ctx, c, "/v1/records", nil, request, newIdempotencyKey())
}

// RecordByID returns a record with its state of now.
func (c *Client) RecordByID(ctx context.Context, id string) (*Record, error) {
	return get[Record](ctx, c, recordPath(id, ""), nil)
}

func recordPath(id, below string) string { return "/v1/records/" + url.PathEscape(id) + below }

// Entry returns the hashed bytes of a record, exactly.
func (c *Client) Entry(ctx context.Context, id string) ([]byte, error) {
	return c.do(ctx, call{method: http.MethodGet, path: recordPath(id, "/entry")})
}

// Proof returns the receipt of a record in C2SP tlog-proof form.
func (c *Client) Proof(ctx context.Context, id string) (string, error) {
	return c.text(ctx, recordPath(id, "/proof"))
}

// Checkpoint returns the signed head of the log in C2SP tlog-checkpoint form.
func (c *Client) Checkpoint(ctx context.Context) (string, error) {
	return c.text(ctx, "/v1/checkpoint")
}

// LedgerKey returns the public key of the ledger, the verifier key of a signed
// note, with its line end.
func (c *Client) LedgerKey(ctx context.Context) (string, error) {
	return c.text(ctx, "/v1/ledger/key")
}

func (c *Client) text(ctx context.Context, path string) (string, error) {
	body, err := c.do(ctx, call{method: http.MethodGet, path: path})
	return string(body), err
}

// Export writes every entry from an index on, and the checkpoint of all, as
// jointledger verify reads them. It is sent once: what was written of a broken
// one is not an export.
func (c *Client) Export(ctx context.Context, from int64, w io.Writer) error {
	query := url.Values{}
	if from > 0 {
		query.Set("from", strconv.FormatInt(from, 10))
	}
	request, err := c.request(ctx, call{method: http.MethodGet, path: "/v1/export", query: query}, nil)
	if err != nil {
		return err
	}
	return c.send(request, func(body io.Reader) error {
		_, err := io.Copy(w, body)
		return err
	})
}

// send sends a request once and hands the answer on as it comes.
func (c *Client) send(request *http.Request, read func(io.Reader) error) error {
	response, err := c.options.HTTP.Do(request)
	if err != nil {
		return err
	}
	if response.StatusCode == http.StatusOK {
		return errors.Join(read(response.Body), response.Body.Close())
	}
	body, err := io.ReadAll(io.LimitReader(response.Body, mostAnswer))
	return errors.Join(problemOf(response, body), err, response.Body.Close())
}

// Records goes through the records that a filter selects, newest first,
// fetching page after page. An error ends it.
func (c *Client) Records(ctx context.Context, f RecordFilter) iter.Seq2[RecordSummary, error] {
	return func(yield func(RecordSummary, error) bool) {
		query := f.query()
		for {
			page, err := get[struct {
				Items      []RecordSummary `json:"items"`
				NextCursor *string         `json:"next_cursor"`
			}](ctx, c, "/v1/records", query)
			if err != nil {
				yield(RecordSummary{}, err)
				return
			}
			for _, item := range page.Items {
				if !yield(item, nil) {
					return
				}
			}
			if page.NextCursor == nil {
				return
			}
			query.Set("cursor", *page.NextCursor)
		}
	}
}

func (f RecordFilter) query() url.Values {
	q := url.Values{}
	for name, value := range map[string]string{
		"part": f.Part, "revision": f.Revision, "joint": f.Joint, "kind": string(f.Kind), "verdict": f.Verdict, "state": f.State,
		"author": f.Author, "method": f.Method, "material": f.Material, "curve_set": f.CurveSet, "since": f.Since, "until": f.Until,
	} {
		if value != "" {
			q.Set(name, value)
		}
	}
	if f.Latest {
		q.Set("latest", "true")
	}
	if f.PageSize != 0 {
		q.Set("limit", strconv.Itoa(f.PageSize))
	}
	return q
}

// SignOff puts a signature, checked or approved, under a record.
func (c *Client) SignOff(ctx context.Context, id, role, statement string) (*Appended, error) {
	return post[Appended](ctx, c, recordPath(id, "/sign-offs"), nil, struct {
		Role      string `json:"role"`
		Statement string `json:"statement"`
	}{role, statement}, newIdempotencyKey())
}

// Withdraw takes a record back.
func (c *Client) Withdraw(ctx context.Context, id, reason string) (*Appended, error) {
	return post[Appended](ctx, c, recordPath(id, "/withdrawal"), nil, struct {
		Reason string `json:"reason"`
	}{reason}, newIdempotencyKey())
}

// Replay computes a record again.
func (c *Client) Replay(ctx context.Context, id string) (*Replay, error) {
	return answer[Replay](c.do(ctx, call{method: http.MethodPost, path: recordPath(id, "/replay")}))
}

// ReleaseCheck asks the gate, and the decision is kept in the ledger.
func (c *Client) ReleaseCheck(ctx context.Context, request ReleaseRequest) (*Decision, error) {
	return decision(post[Decision](ctx, c, "/v1/release-checks", nil, request, newIdempotencyKey()))
}

// DryRun asks the gate without keeping the decision.
func (c *Client) DryRun(ctx context.Context, request ReleaseRequest) (*Decision, error) {
	return decision(post[Decision](ctx, c, "/v1/release-checks", url.Values{"dry_run": {"true"}}, request, ""))
}

// decision lets no answer pass that is not a decision: whoever compares with
// Hold must not release on something else.
func decision(d *Decision, err error) (*Decision, error) {
	switch {
	case err != nil:
		return nil, err
	case d.Decision == Hold && len(d.Findings) > 0, d.Decision == Release && len(d.Findings) == 0:
		return d, nil
	}
	return nil, fmt.Errorf("the answer is no decision: %.80q with %d findings", d.Decision, len(d.Findings))
}

// Part returns what is on record of a part.
func (c *Client) Part(ctx context.Context, part string) (*Part, error) {
	return get[Part](ctx, c, "/v1/parts", url.Values{"part": {part}})
}

// Impact finds what rests on something; cursor is empty for the first page,
// then the NextCursor of the one before.
func (c *Client) Impact(ctx context.Context, withdrawn Withdrawn, cursor string) (*Impact, error) {
	return post[Impact](ctx, c, "/v1/impact", nil, struct {
		Withdrawn Withdrawn `json:"withdrawn"`
		Cursor    string    `json:"cursor,omitzero"`
	}{withdrawn, cursor}, "")
}
