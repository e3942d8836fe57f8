package service

import (
	"context"
	"fmt"

	"jointledger/service/strictjson"
)

// Content is what a record says, decoded: its result, and its input in the
// document of its kind, the others nil.
type Content struct {
	Result *Result
	Lug    *LugDocument
	Group  *GroupDocument
	Splice *SpliceDocument
}

// Content decodes input and result of a record.
func (d *RecordDocument) Content() (*Content, error) {
	c := &Content{Result: new(Result)}
	// Both were written by this program: nothing has to be refused again.
	if err := strictjson.DecodeLoosely(d.Result, c.Result); err != nil {
		return nil, fmt.Errorf("the result of record %s: %w", d.ID, err)
	}
	if err := c.input(d.Kind, d.Input); err != nil {
		return nil, fmt.Errorf("the input of record %s: %w", d.ID, err)
	}
	return c, nil
}

// Content calculates a document and returns it with its defaults written out
// beside its answer.
func (s *Service) Content(ctx context.Context, kind Kind, input []byte) (*Content, error) {
	done, err := calculate(kind, input, View{}, s.registry(ctx))
	if err != nil {
		return nil, s.fail(err)
	}
	s.count(&done.result)
	c := &Content{Result: &done.result}
	return c, c.input(kind, done.input)
}

// input decodes a resolved input into the document of its kind.
func (c *Content) input(kind Kind, resolved strictjson.Raw) error {
	var input any
	switch kind {
	case Lug:
		c.Lug = new(LugDocument)
		input = c.Lug
	case FastenerGroup:
		c.Group = new(GroupDocument)
		input = c.Group
	case Splice:
		c.Splice = new(SpliceDocument)
		input = c.Splice
	default:
		return fmt.Errorf("there is no kind %q", kind)
	}
	return strictjson.DecodeLoosely(resolved, input)
}

// Spread writes a document, an input or a result as JSON that people can read.
func Spread(document any) (string, error) {
	text, err := strictjson.Spread(document)
	return string(text), err
}
