package main

import (
	"errors"
	"fmt"
	"io"
	"os"

	"jointledger/service"
	"jointledger/service/strictjson"
)

// checkCommand calculates documents without a server.
type checkCommand struct {
	Files []string `arg:"" name:"file" help:"Documents {\"kind\", \"input\"}; - is standard input."`
}

// checkDocument is what a file holds.
type checkDocument struct {
	Kind  service.Kind   `json:"kind"`
	Input strictjson.Raw `json:"input"`
}

// Run writes one answer a line and exits with the worst of them.
func (c checkCommand) Run(std *streams) error {
	worst := exitGood
	for _, path := range c.Files {
		code, err := c.one(path, std)
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

func (c checkCommand) one(path string, std *streams) (int, error) {
	data, err := read(path, std.in)
	if err != nil {
		return exitUnusable, err
	}
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
	if result.Verdict != "adequate" {
		return exitBad, nil
	}
	return exitGood, nil
}

// read reads a whole file or standard input.
func read(path string, in io.Reader) ([]byte, error) {
	if path == "-" {
		return io.ReadAll(in)
	}
	return os.ReadFile(path)
}
