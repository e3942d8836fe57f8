package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// TestReadme runs the commands of the README that need a server, and its Python,
// in their order against one without keys. Where a block of text follows, it is
// what they print.
func TestReadme(t *testing.T) {
	page, err := os.ReadFile("README.md")
	if err != nil {
		t.Fatal(err)
	}
	bin, dir := t.TempDir(), t.TempDir()
	program, err := filepath.Abs(os.Args[0])
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(program, filepath.Join(bin, "jointledger")); err != nil {
		t.Fatal(err)
	}
	server := start(t, "--data", t.TempDir())
	ran := map[string]int{}
	blocks := regexp.MustCompile("(?s)```(sh|python)\n(.*?)```(?:\n\n```text\n(.*?)```)?").FindAllStringSubmatch(string(page), -1)
	for _, block := range blocks {
		language, text, want := block[1], block[2], block[3]
		if language == "sh" && !strings.Contains(text, "curl") {
			continue // it starts a server, or makes keys, which would close this one
		}
		ran[language]++
		text = strings.NewReplacer("http://127.0.0.1:8080", server.url, "go run . ", "jointledger ").Replace(text)
		cmd := exec.Command("bash", "-euo", "pipefail", "-c", text)
		if language == "python" {
			cmd = exec.Command("python3", "-c", text)
		}
		cmd.Dir = dir
		cmd.Env = append(os.Environ(), asProgram+"=1", "PATH="+bin+":"+os.Getenv("PATH"))
		var errs bytes.Buffer
		cmd.Stderr = &errs
		out, err := cmd.Output()
		if err != nil || bytes.Contains(out, []byte(`"/problems/`)) {
			t.Errorf("%v\n%s\n%s%s", err, block[2], out, &errs)
		}
		if want != "" && string(out) != want {
			t.Errorf("the README's\n%s\nprints\n%swant\n%s", block[2], out, want)
		}
	}
	if ran["sh"] < 6 || ran["python"] < 1 {
		t.Errorf("the README has %v blocks that were run", ran)
	}
}
