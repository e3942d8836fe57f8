package client

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"iter"
	"net/http"

	"jointledger/service/strictjson"
)

// BatchLine is one document of a batch. Input is anything that is written as
// the JSON of its kind.
type BatchLine struct {
	Kind   Kind         `json:"kind"`
	Ref    string       `json:"ref,omitzero"` // comes back with the answer
	Input  any          `json:"input"`
	Record *BatchRecord `json:"record,omitzero"`
}

// BatchRecord asks for a line to be put on record too.
type BatchRecord struct {
	Subject        Subject `json:"subject"`
	GeometryDigest string  `json:"geometry_digest"`
	Note           string  `json:"note,omitzero"`
	// IdempotencyKey makes it safe to send the line again after a broken
	// batch; empty for none.
	IdempotencyKey string `json:"idempotency_key,omitzero"`
}

// BatchAnswer is the answer to one line: a result, with Record where it was put
// on record, or a problem.
type BatchAnswer struct {
	Ref    *string `json:"ref"`
	Result *Result `json:"result"`
	Record *struct {
		ID           string `json:"id"`
		Index        int64  `json:"index"`
		RecordedAt   string `json:"recorded_at"`
		RecordDigest string `json:"record_digest"`
		Replayed     bool   `json:"replayed"`
	} `json:"record"`
	Problem *Problem `json:"problem"`
}

// Batch sends documents and goes through their answers, in the same order, as
// they come: lines are taken while answers are read, so that neither need fit
// into memory. An error ends it; lines without an answer by then may have been
// recorded or not. It is sent once.
func (c *Client) Batch(ctx context.Context, view View, lines iter.Seq[BatchLine]) iter.Seq2[BatchAnswer, error] {
	return func(yield func(BatchAnswer, error) bool) {
		ctx, cancel := context.WithCancel(ctx)
		body, send := io.Pipe()
		sent := make(chan struct{})
		go func() {
			defer close(sent)
			_ = send.CloseWithError(writeLines(send, lines)) // never fails
		}()
		defer func() {
			cancel()
			_ = body.CloseWithError(context.Canceled) // never fails
			<-sent
		}()
		if err := c.batch(ctx, view, body, func(a BatchAnswer) bool { return yield(a, nil) }); err != nil {
			yield(BatchAnswer{}, err)
		}
	}
}

func writeLines(w io.Writer, lines iter.Seq[BatchLine]) error {
	for line := range lines {
		text, err := strictjson.Encode(line)
		if err != nil {
			return fmt.Errorf("the line %.80q cannot be written as JSON: %w", line.Ref, err)
		}
		if _, err := w.Write(append(text, '\n')); err != nil {
			return err
		}
	}
	return nil
}

func (c *Client) batch(ctx context.Context, view View, body io.Reader, each func(BatchAnswer) bool) error {
	request, err := c.request(ctx, call{method: http.MethodPost, path: "/v1/batches", query: view.query(), media: "application/x-ndjson"}, body)
	if err != nil {
		return err
	}
	return c.send(request, func(answers io.Reader) error {
		in := bufio.NewReaderSize(answers, 64<<10)
		for {
			text, err := in.ReadBytes('\n')
			if errors.Is(err, io.EOF) && len(text) == 0 {
				return nil
			}
			if err != nil {
				return fmt.Errorf("the answers end too early: %w", err)
			}
			a, err := answer[BatchAnswer](text, nil)
			if err != nil {
				return err
			}
			if !each(*a) {
				return nil
			}
		}
	})
}
