package main

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"sync/atomic"
	"time"

	"jointledger/api"
	"jointledger/service"
	"jointledger/service/strictjson"
)

// checkCommand calculates documents without a server.
type checkCommand struct {
	Files []string `arg:"" name:"file" help:"Documents {\"kind\", \"input\"}, or many of them, one a line (NDJSON); - is standard input."`
}

// checkDocument is what a file holds.
type checkDocument struct {
	Kind  service.Kind   `json:"kind"`
	Input strictjson.Raw `json:"input"`
}

// Run writes one answer a line and exits with the worst of them.
func (c checkCommand) Run(ctx context.Context, std *streams) error {
	worst := exitGood
	for _, path := range c.Files {
		code, err := c.one(ctx, path, std)
		if err != nil {
			fmt.Fprintf(std.errs, "jointledger: %s: %s\n", path, err)
		}
		worst = max(worst, code)
	}
	if worst == exitGood {
		return nil
	}
	return exit(worst)
}

func (c checkCommand) one(ctx context.Context, path string, std *streams) (int, error) {
	in := io.NopCloser(std.in)
	if path != "-" {
		file, err := os.Open(path)
		if err != nil {
			return exitUnusable, err
		}
		defer func() { _ = file.Close() }() // it was only read
		in = file
	}
	manyLines := slices.Contains([]string{".ndjson", ".jsonl"}, filepath.Ext(path))
	whole, rest, err := firstDocument(in, manyLines)
	switch {
	case err != nil:
		return exitUnusable, err
	case rest != nil:
		return checkLines(ctx, rest, std)
	}
	return checkWhole(whole, std)
}

// firstDocument tells a file with one document, which it reads whole, from one
// with a document on every line, of which it gives back all.
func firstDocument(in io.ReadCloser, manyLines bool) (whole []byte, lines io.ReadCloser, err error) {
	buffered := bufio.NewReader(in)
	var head []byte
	for documents := 0; !manyLines; {
		text, err := buffered.ReadBytes('\n')
		head = append(head, text...)
		if len(bytes.TrimSpace(text)) > 0 {
			var value any
			if documents == 0 && strictjson.DecodeLoosely(text, &value) != nil {
				// Not the whole of a document: the file is one.
				more, err := io.ReadAll(buffered)
				return append(head, more...), nil, err
			}
			documents++
		}
		if err != nil && !errors.Is(err, io.EOF) {
			return nil, nil, err
		}
		if err != nil && documents < 2 {
			return head, nil, nil
		}
		manyLines = documents == 2
	}
	type joined struct {
		io.Reader
		io.Closer
	}
	return nil, joined{io.MultiReader(bytes.NewReader(head), buffered), in}, nil
}

func checkWhole(data []byte, std *streams) (int, error) {
	var document checkDocument
	if err := strictjson.Decode(data, &document); err != nil {
		return exitUnusable, err
	}
	result, err := service.Calculate(document.Kind, document.Input, service.View{})
	if err != nil {
		var p *service.Problem
		if errors.As(err, &p) {
			err = p.Under("/input")
		}
		return exitUnusable, err
	}
	line, err := strictjson.Encode(result)
	if err != nil {
		return exitUnusable, err
	}
	if _, err := fmt.Fprintf(std.out, "%s\n", line); err != nil {
		return exitUnusable, err
	}
	return exitOf(result.Verdict), nil
}

// exitOf is the exit code of a verdict, empty for a line that cannot be used.
func exitOf(verdict string) int {
	switch verdict {
	case "adequate":
		return exitGood
	case "":
		return exitUnusable
	}
	return exitBad
}

// progressPause is how often a terminal is told how far it is.
const progressPause = 200 * time.Millisecond

// checkLines answers a document on every line as a batch does.
func checkLines(ctx context.Context, in io.ReadCloser, std *streams) (int, error) {
	var done, notAdequate atomic.Int64
	worst := exitGood
	ended := make(chan error, 1)
	// In a goroutine of its own: a Read of a terminal cannot be interrupted.
	go func() {
		out := bufio.NewWriterSize(std.out, 64<<10)
		err := service.CheckLines(ctx, in, out, func(err error) []byte { return api.EncodeProblem(err, "") }, func(verdict string) {
			code := exitOf(verdict)
			worst = max(worst, code)
			if done.Add(1); code != exitGood {
				notAdequate.Add(1)
			}
		})
		ended <- errors.Join(err, out.Flush())
	}()
	say := func(end string) {
		fmt.Fprintf(std.errs, "\r%d lines, %d of them not adequate%s", done.Load(), notAdequate.Load(), end)
	}
	tick := time.NewTicker(progressPause)
	defer tick.Stop()
	terminal := isTerminal(std.errs)
	for {
		select {
		case err := <-ended:
			if terminal {
				say("\n")
			}
			if err != nil {
				return exitUnusable, err
			}
			return worst, nil
		case <-ctx.Done():
			return exitUnusable, ctx.Err()
		case <-tick.C:
			if terminal {
				say("")
			}
		}
	}
}

// isTerminal reports whether what is written is looked at while it comes.
func isTerminal(w io.Writer) bool {
	file, ok := w.(*os.File)
	if !ok {
		return false
	}
	info, err := file.Stat()
	return err == nil && info.Mode()&os.ModeCharDevice != 0
}
