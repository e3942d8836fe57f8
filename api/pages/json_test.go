package pages_test

import (
	"encoding/json"
	"strings"
	"testing"
)

// inputOf finds the input in a published case, or in the case of a title.
func inputOf(t testing.TB, text []byte, title string) string {
	t.Helper()
	type one struct {
		Title string          `json:"title"`
		Input json.RawMessage `json:"input"`
	}
	var file struct {
		one
		Cases []one `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if title == "" && file.Input != nil {
		return string(file.Input)
	}
	for _, c := range file.Cases {
		if strings.HasPrefix(c.Title, title) {
			return string(c.Input)
		}
	}
	return ""
}

// inputsOf finds all inputs of a file of published cases.
func inputsOf(t testing.TB, text []byte) []string {
	t.Helper()
	type one struct {
		Input json.RawMessage `json:"input"`
	}
	var file struct {
		one
		Cases []one `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	var all []string
	for _, c := range append(file.Cases, file.one) {
		if c.Input != nil {
			all = append(all, string(c.Input))
		}
	}
	return all
}
