package service

import (
	"context"
	"fmt"
	"io"
	"runtime/debug"

	"jointledger/service/strictjson"
)

// batchLine is one line of a batch.
type batchLine struct {
	Kind   Kind           `json:"kind"`
	Ref    *string        `json:"ref,omitzero" validate:"omitnil,text"`
	Input  strictjson.Raw `json:"input"`
	Record *batchRecord   `json:"record,omitzero"`
}

// batchRecord asks for a line to be put on record too.
type batchRecord struct {
	Subject        Subject `json:"subject"`
	GeometryDigest string  `json:"geometry_digest" validate:"id"`
	Note           string  `json:"note,omitzero" validate:"text"`
	IdempotencyKey *string `json:"idempotency_key,omitzero" validate:"omitnil,id"`
}

// The lines of the answer.
type (
	batchResult struct {
		Ref    *string `json:"ref"`
		Result *Result `json:"result"`
	}
	batchRecorded struct {
		Ref    *string        `json:"ref"`
		Result *Result        `json:"result"`
		Record BatchRecordRef `json:"record"`
	}
	batchProblem struct {
		Ref     *string        `json:"ref"`
		Problem strictjson.Raw `json:"problem"`
	}
)

// BatchRecordRef names the record that a line of a batch made.
type BatchRecordRef struct {
	ID           string `json:"id"`
	Index        int64  `json:"index"`
	RecordedAt   string `json:"recorded_at"`
	RecordDigest string `json:"record_digest"`
	// Replayed tells that the same line was recorded before under its
	// idempotency key.
	Replayed bool `json:"replayed"`
}

// BatchPath is the path under which idempotency keys of a batch count.
const BatchPath = "/v1/batches"

// Batch answers a stream of documents, one a line, in order. Say writes a
// problem as callers see it. Lines that ask to be recorded are appended in
// their order. Closing in must unblock a Read.
func (s *Service) Batch(ctx context.Context, caller Caller, view View, in io.ReadCloser, out io.Writer, say func(error) []byte) error {
	return stream(ctx, in, out, func(ctx context.Context, text []byte) (l line) {
		// A defect that one line meets must not end the server.
		defer func() {
			if r := recover(); r != nil {
				l = answered(problemLine(nil, fmt.Errorf("panic: %v\n%s", r, debug.Stack()), say))
			}
		}()
		ref, l, err := s.batchLine(ctx, caller, view, text, say)
		if err != nil {
			return answered(problemLine(ref, s.fail(err), say))
		}
		return l
	})
}

// CheckLines is Batch without a ledger: nothing can be recorded, and only
// built-in and inline curve sets are known. Each hears of every verdict, empty
// for a problem, in order.
func CheckLines(ctx context.Context, in io.ReadCloser, out io.Writer, say func(error) []byte, each func(verdict string)) error {
	return stream(ctx, in, out, func(_ context.Context, text []byte) line {
		l, ref, err := readBatchLine(text)
		if err == nil && l.Record != nil {
			err = &Problem{Code: Invalid, Detail: "Some values cannot be used.", Errors: []FieldError{{"/record", "nothing is recorded without a server; leave it out"}}}
		}
		var answer []byte
		verdict := ""
		if err == nil {
			var c *calculation
			if c, err = calculateLine(l, View{}, noRegistry{}); err == nil {
				verdict = c.result.Verdict
				answer, err = strictjson.Encode(batchResult{ref, &c.result})
			}
		}
		return line{end: func() []byte {
			if err != nil {
				verdict, answer = "", problemLine(ref, err, say)
			}
			each(verdict)
			return answer
		}}
	})
}

// problemLine answers a line that has no result.
func problemLine(ref *string, err error, say func(error) []byte) []byte {
	text, encodeErr := strictjson.Encode(batchProblem{ref, say(err)})
	if encodeErr != nil {
		return fmt.Appendf(nil, `{"ref":null,"problem":null}`)
	}
	return text
}

// readBatchLine reads a line; the ref is known also of a line with other
// faults.
func readBatchLine(text []byte) (*batchLine, *string, error) {
	if text == nil {
		return nil, nil, problem(Malformed, "The line is longer than %d MiB.", MostLine>>20)
	}
	var l batchLine
	if err := strictjson.Decode(text, &l); err != nil {
		var known struct {
			Ref *string `json:"ref"`
		}
		if strictjson.DecodeLoosely(text, &known) != nil {
			known.Ref = nil
		}
		return nil, known.Ref, malformed(err, "")
	}
	return &l, l.Ref, nil
}

// calculateLine answers the document of a line; its problems point from the
// line's root, and are joined by those of the line itself.
func calculateLine(l *batchLine, view View, look lookup) (*calculation, error) {
	var f faults
	f.check(l)
	c, err := calculate(l.Kind, l.Input, view, look)
	if err := f.under("/input", err); err != nil {
		return nil, err
	}
	return c, nil
}

func (s *Service) batchLine(ctx context.Context, caller Caller, view View, text []byte, say func(error) []byte) (ref *string, _ line, _ error) {
	l, ref, err := readBatchLine(text)
	if err != nil {
		return ref, line{}, err
	}
	look := s.registry(ctx)
	if l.Record == nil {
		c, err := calculateLine(l, view, look)
		if err != nil {
			return ref, line{}, err
		}
		s.count(&c.result)
		answer, err := strictjson.Encode(batchResult{ref, &c.result})
		return ref, answered(answer), err
	}
	if !caller.Role.May(Analyst) {
		return ref, line{}, problem(Forbidden, "Recording needs the role %s, and %s has the role %s.", Analyst, caller.Name, caller.Role)
	}
	whole, err := calculateLine(l, View{}, look)
	if err != nil {
		return ref, line{}, err
	}
	shown := &whole.result
	if view != (View{}) {
		c, err := calculateLine(l, view, look)
		if err != nil {
			return ref, line{}, err
		}
		shown = &c.result
	}
	s.count(shown)
	var idempotency Idempotency
	if l.Record.IdempotencyKey != nil {
		idempotency = Idempotency{Key: *l.Record.IdempotencyKey, Method: "POST", Path: BatchPath, Body: text}
	}
	r := &RecordRequest{
		Subject: l.Record.Subject, GeometryDigest: l.Record.GeometryDigest, Kind: l.Kind, Note: l.Record.Note,
	}
	p, _, err := s.pendingRecord(ctx, caller, r, whole, idempotency)
	if err != nil {
		return ref, line{}, err
	}
	return ref, line{
		begin: func() { s.log.submit(p) },
		end: func() []byte {
			entry, again, err := s.recorded(ctx, p, idempotency)
			var answer []byte
			if err == nil {
				answer, err = strictjson.Encode(batchRecorded{ref, shown, BatchRecordRef{entry.ID, entry.Index, entry.At, digestOf(entry), again}})
			}
			if err != nil {
				return problemLine(ref, err, say)
			}
			return answer
		},
	}, nil
}
