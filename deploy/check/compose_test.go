package check

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/compose-spec/compose-go/v2/cli"
)

// TestCompose loads the file as an engine does and looks for what a container
// should not have.
func TestCompose(t *testing.T) {
	options, err := cli.NewProjectOptions([]string{"../compose.yaml"}, cli.WithProfiles([]string{"owner"}))
	if err != nil {
		t.Fatal(err)
	}
	project, err := options.LoadProject(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"jointledger", "owner", "postgres", "prometheus", "grafana"} {
		service, err := project.GetService(name)
		if err != nil {
			t.Error(err)
			continue
		}
		plainImage(t, name, service.Image)
		if name != "postgres" { // its own entry point changes users and makes folders
			if !service.ReadOnly || !contains(service.CapDrop, "ALL") || !contains(service.SecurityOpt, "no-new-privileges:true") {
				t.Errorf("%s may write its root file system, has capabilities or may gain privileges", name)
			}
		}
		for _, p := range service.Ports {
			if p.HostIP != "127.0.0.1" {
				t.Errorf("%s publishes %s to every network", name, p.Published)
			}
		}
		for variable, value := range service.Environment {
			known(t, name, variable)
			if value != nil && strings.Contains(variable, "PASSWORD") && !strings.HasPrefix(*value, "/run/secrets/") {
				t.Errorf("%s: %s is in the environment", name, variable)
			}
		}
		for _, v := range service.Volumes {
			if v.Type != "bind" {
				continue
			}
			if _, err := os.Stat(v.Source); err != nil {
				t.Errorf("%s mounts %v", name, err)
			}
		}
		for _, s := range service.Secrets {
			if _, ok := project.Secrets[s.Source]; !ok {
				t.Errorf("%s uses the secret %s, which is not declared", name, s.Source)
			}
		}
	}
	made, err := os.ReadFile("../secrets.sh")
	if err != nil {
		t.Fatal(err)
	}
	for name, s := range project.Secrets {
		if !strings.Contains(string(made), "write "+filepath.Base(s.File)+"\n") {
			t.Errorf("secrets.sh does not make the secret %s", name)
		}
	}
}

func contains(list []string, what string) bool {
	for _, s := range list {
		if s == what {
			return true
		}
	}
	return false
}
