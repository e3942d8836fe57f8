// Package check holds the deployment files against what reads them: the types
// of the Kubernetes API and the loader of compose files. It is a module of its
// own, so that the program does not depend on either.
package check

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
)

// variables are the environment variables that the program declares.
var variables = sync.OnceValues(func() (map[string]bool, error) {
	found := map[string]bool{}
	files, err := filepath.Glob("../../*.go")
	if err != nil {
		return nil, err
	}
	declared := regexp.MustCompile(`env:"(JOINTLEDGER_[A-Z_]+)"`)
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			return nil, err
		}
		for _, match := range declared.FindAllStringSubmatch(string(text), -1) {
			found[match[1]] = true
		}
	}
	return found, nil
})

// known fails for a variable of ours that the program does not read.
func known(t *testing.T, where, variable string) {
	t.Helper()
	all, err := variables()
	if err != nil || len(all) == 0 {
		t.Fatalf("the program's variables: %v %v", all, err)
	}
	if strings.HasPrefix(variable, "JOINTLEDGER_") && !all[variable] {
		t.Errorf("%s sets %s, which the program does not read", where, variable)
	}
}

// plainImage fails for an image that names a registry.
func plainImage(t *testing.T, where, image string) {
	t.Helper()
	first, _, more := strings.Cut(image, "/")
	if image == "" || more && strings.ContainsAny(first, ".:") {
		t.Errorf("%s: the image is %q", where, image)
	}
	if strings.HasSuffix(image, ":latest") || !strings.Contains(image, ":") {
		t.Errorf("%s: the image %s has no fixed version", where, image)
	}
}

// TestUnit: the systemd unit sets nothing that the program does not read.
func TestUnit(t *testing.T) {
	text, err := os.ReadFile("../systemd/jointledger.service")
	if err != nil {
		t.Fatal(err)
	}
	found := regexp.MustCompile(`(?m)^Environment=(\w+)=`).FindAllStringSubmatch(string(text), -1)
	if len(found) == 0 {
		t.Error("the unit sets nothing")
	}
	for _, match := range found {
		known(t, "the unit", match[1])
	}
}
