package pages_test

import (
	"encoding/json"
	"slices"
	"strings"
	"testing"
)

// publishedCase is a published case with what it asks.
type publishedCase struct {
	Title string          `json:"title"`
	Input json.RawMessage `json:"input"`
}

// casesOf lists the cases of a file that have an input, one that is the file
// itself first.
func casesOf(t testing.TB, text []byte) []publishedCase {
	t.Helper()
	var file struct {
		publishedCase
		Cases []publishedCase `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	return slices.DeleteFunc(append([]publishedCase{file.publishedCase}, file.Cases...), func(c publishedCase) bool { return c.Input == nil })
}

// inputOf finds the input of the first case whose title begins so.
func inputOf(t testing.TB, text []byte, title string) string {
	t.Helper()
	for _, c := range casesOf(t, text) {
		if strings.HasPrefix(c.Title, title) {
			return string(c.Input)
		}
	}
	return ""
}

// inputsOf finds all inputs of a file of published cases.
func inputsOf(t testing.TB, text []byte) (all []string) {
	t.Helper()
	for _, c := range casesOf(t, text) {
		all = append(all, string(c.Input))
	}
	return all
}
