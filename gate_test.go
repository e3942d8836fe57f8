package main

import (
	"bytes"
	"fmt"
	"net"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"jointledger/api/client"
)

// gates are the two ways to ask: the program itself, and the shell script.
func gates(t *testing.T) map[string]string {
	t.Helper()
	script, err := filepath.Abs("deploy/hook/jointledger-gate.sh")
	if err != nil {
		t.Fatal(err)
	}
	// A hook finds the program by its name; here it is the test itself.
	program := filepath.Join(t.TempDir(), "jointledger")
	text := fmt.Sprintf("#!/bin/sh\n%s=1 exec '%s' \"$@\"\n", asProgram, os.Args[0])
	if err := os.WriteFile(program, []byte(text), 0o700); err != nil {
		t.Fatal(err)
	}
	return map[string]string{"program": program + " gate", "script": script}
}

// team is a server with people who have keys.
type team struct {
	data, url string
	keys      map[string]string
}

func newTeam(t *testing.T, args ...string) *team {
	t.Helper()
	v := &team{data: t.TempDir(), keys: map[string]string{}}
	for name, role := range map[string]string{"ada": "analyst", "ben": "checker", "cleo": "approver", "vault": "gate"} {
		out, err := asProcess("key", "add", name, "--role", role, "--data", v.data).Output()
		if err != nil {
			t.Fatal(err)
		}
		v.keys[name] = strings.TrimSpace(string(out))
	}
	v.url = start(t, append([]string{"--data", v.data}, args...)...).url
	return v
}

func (v *team) by(t *testing.T, name string) *client.Client {
	t.Helper()
	c, err := client.New(v.url, client.Options{Key: v.keys[name]})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// record puts the hinge on record for a geometry.
func (v *team) record(t *testing.T, joint, digest string) string {
	t.Helper()
	made, err := v.by(t, "ada").Record(t.Context(), client.RecordRequest{
		Subject:        client.Subject{Part: "SM-2100", Revision: "B", Joint: joint},
		GeometryDigest: digest, Kind: client.Lug, Input: client.Raw(hinge),
	})
	if err != nil {
		t.Fatal(err)
	}
	return made.ID
}

func (v *team) sign(t *testing.T, id string) {
	t.Helper()
	for _, s := range [][2]string{{"ben", "checked"}, {"cleo", "approved"}} {
		if _, err := v.by(t, s[0]).SignOff(t.Context(), id, s[1], "followed by hand"); err != nil {
			t.Fatal(err)
		}
	}
}

// repository is a git repository and a bare one that it pushes to, with the
// hook.
type repository struct {
	t    *testing.T
	work string
	env  []string
}

func newRepository(t *testing.T, gate string, env ...string) *repository {
	t.Helper()
	dir := t.TempDir()
	r := &repository{t: t, work: filepath.Join(dir, "work"), env: append(os.Environ(),
		"HOME="+dir, "GIT_CONFIG_NOSYSTEM=1", "GIT_AUTHOR_NAME=ada", "GIT_AUTHOR_EMAIL=ada@example.org",
		"GIT_COMMITTER_NAME=ada", "GIT_COMMITTER_EMAIL=ada@example.org", "JOINTLEDGER_GATE="+gate)}
	r.env = append(r.env, env...)
	bare := filepath.Join(dir, "vault.git")
	for _, args := range [][]string{{"init", "-q", "--bare", "-b", "main", bare}, {"init", "-q", "-b", "main", r.work}} {
		r.run(dir, args...)
	}
	r.run(r.work, "remote", "add", "origin", bare)
	hook, err := os.ReadFile("deploy/hook/pre-receive")
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(bare, "hooks", "pre-receive"), hook, 0o700); err != nil {
		t.Fatal(err)
	}
	return r
}

func (r *repository) run(dir string, args ...string) string {
	r.t.Helper()
	out, err := r.try(dir, args...)
	if err != nil {
		r.t.Fatalf("git %v: %v\n%s", args, err, out)
	}
	return strings.TrimSpace(out)
}

func (r *repository) try(dir string, args ...string) (string, error) {
	cmd := exec.Command("git", args...)
	cmd.Dir, cmd.Env = dir, r.env
	out, err := cmd.CombinedOutput()
	return string(out), err
}

// commit writes files and commits them.
func (r *repository) commit(files map[string]string) {
	r.t.Helper()
	for name, text := range files {
		path := filepath.Join(r.work, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
			r.t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			r.t.Fatal(err)
		}
	}
	r.run(r.work, "add", "-A")
	r.run(r.work, "commit", "-q", "-m", "boom")
}

// push pushes main and returns what the hook said.
func (r *repository) push(want bool) string {
	r.t.Helper()
	out, err := r.try(r.work, "push", "origin", "main")
	if (err == nil) != want {
		r.t.Fatalf("the push went through: %v, want %v\n%s", err == nil, want, out)
	}
	return out
}

func (r *repository) digest(joint string) string {
	r.t.Helper()
	return "git:" + r.run(r.work, "rev-parse", "HEAD:joints/"+joint)
}

// The vault of a part refuses a push that changes the geometry of a joint, and
// takes it once a new record is checked and approved; the decisions are in the
// export and verify.
func TestAGitRepositoryAsksTheGate(t *testing.T) {
	for name, gate := range gates(t) {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			v := newTeam(t)
			r := newRepository(t, gate, "JOINTLEDGER_SERVER="+v.url, "JOINTLEDGER_KEY="+v.keys["vault"])
			r.commit(map[string]string{"part": "SM-2100 B\n", "joints/hinge-upper": "lug 2.0 x 0.5", "joints/hinge-lower": "lug 2.0 x 0.5, lower"})
			said := func(out, what string) {
				t.Helper()
				if !strings.Contains(out, what) {
					t.Errorf("the hook does not say %q:\n%s", what, out)
				}
			}
			out := r.push(false)
			said(out, "hinge-upper: no-record:")
			said(out, "hinge-lower: no-record:")
			for _, joint := range []string{"hinge-upper", "hinge-lower"} {
				v.sign(t, v.record(t, joint, r.digest(joint)))
			}
			said(r.push(true), "release")

			r.commit(map[string]string{"joints/hinge-upper": "lug 2.1 x 0.5"})
			out = r.push(false)
			said(out, "hinge-upper: geometry-changed:")
			said(out, r.digest("hinge-upper"))
			id := v.record(t, "hinge-upper", r.digest("hinge-upper"))
			out = r.push(false)
			said(out, "hinge-upper: not-checked:")
			said(out, "hinge-upper: not-approved:")
			v.sign(t, id)
			said(r.push(true), "release")

			r.run(r.work, "rm", "-q", "joints/hinge-lower")
			r.commit(nil)
			said(r.push(false), "hinge-lower: joint-not-named:")

			decisions := verifiedDecisions(t, v)
			if want := []string{"hold", "release", "hold", "hold", "release", "hold"}; !equal(decisions, want) {
				t.Errorf("the export has the decisions %v, want %v", decisions, want)
			}
		})
	}
}

func equal(a, b []string) bool { return strings.Join(a, " ") == strings.Join(b, " ") }

// verifiedDecisions exports the ledger, verifies the export with the program
// and returns the decisions in it.
func verifiedDecisions(t *testing.T, v *team) (decisions []string) {
	t.Helper()
	c := v.by(t, "vault")
	key, err := c.LedgerKey(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	var export bytes.Buffer
	if err := c.Export(t.Context(), 0, &export); err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	keyFile, exportFile := filepath.Join(dir, "key"), filepath.Join(dir, "export")
	for path, text := range map[string][]byte{keyFile: []byte(key), exportFile: export.Bytes()} {
		if err := os.WriteFile(path, text, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	if out, err := asProcess("verify", "--key", keyFile, exportFile).CombinedOutput(); err != nil {
		t.Fatalf("the export does not verify: %v\n%s", err, out)
	}
	for line := range strings.Lines(export.String()) {
		if strings.Contains(line, `"type":"release-decision"`) {
			_, after, _ := strings.Cut(line, `"decision":"`)
			decision, _, _ := strings.Cut(after, `"`)
			decisions = append(decisions, decision)
		}
	}
	return decisions
}

// What cannot be pushed is refused without asking.
func TestTheHookRefusesWhatItCannotRead(t *testing.T) {
	r := newRepository(t, "false")
	r.commit(map[string]string{"readme": "x"})
	if out := r.push(false); !strings.Contains(out, "JOINTLEDGER_SERVER") {
		t.Errorf("without a server it says\n%s", out)
	}
	r = newRepository(t, "false", "JOINTLEDGER_SERVER=http://127.0.0.1:9")
	for _, c := range []struct {
		files map[string]string
		want  string
	}{
		{map[string]string{"readme": "x"}, "no file part"},
		{map[string]string{"part": "SM-2100\n"}, "PART REVISION"},
		{map[string]string{"part": "SM-2100 B C\n"}, "PART REVISION"},
		{map[string]string{"part": "SM-2100 B\n"}, "no folder joints"},
		{map[string]string{"joints/a\"b": "x"}, "other characters"},
	} {
		r.commit(c.files)
		if out := r.push(false); !strings.Contains(out, c.want) {
			t.Errorf("%v: it says\n%s\nwant %q", c.files, out, c.want)
		}
	}
}

// gateRun is one call of a gate.
type gateRun struct {
	code      int
	out, errs string
	took      time.Duration
}

func runGate(t *testing.T, gate, key string, args ...string) gateRun {
	t.Helper()
	words := append(strings.Fields(gate), args...)
	cmd := exec.Command(words[0], words[1:]...)
	cmd.Env = append(os.Environ(), "JOINTLEDGER_KEY="+key)
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	began := time.Now()
	err := cmd.Run()
	if _, exited := err.(*exec.ExitError); err != nil && !exited {
		t.Fatal(err)
	}
	return gateRun{cmd.ProcessState.ExitCode(), out.String(), errs.String(), time.Since(began)}
}

func TestExitCodesOfTheGate(t *testing.T) {
	v := newTeam(t)
	v.sign(t, v.record(t, `hinge "upper"\1`, "sha256:01"))
	dir := t.TempDir()
	file := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	good := file("good", "[{\"joint\": \"hinge \\\"upper\\\"\\\\1\", \"geometry_digest\": \"sha256:01\"}]\n")
	changed := file("changed", `[{"joint": "hinge \"upper\"\\1", "geometry_digest": "sha256:02"}]`)
	silent, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = silent.Close() })
	answering := func(status int, body string) string {
		s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Content-Type", "application/json")
			w.WriteHeader(status)
			_, _ = w.Write([]byte(body))
		}))
		t.Cleanup(s.Close)
		return s.URL
	}
	for name, gate := range gates(t) {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			for _, c := range []struct {
				what             string
				server, key      string
				joints, revision string
				args             []string
				code, onError    int // onError: with --on-error release
				out, errs        string
			}{
				{"release", v.url, "vault", good, "B", nil, 0, 0, "release\n", ""},
				{"hold", v.url, "vault", changed, "B", nil, 1, 1, "hold\nhinge \"upper\"\\1: geometry-changed: the latest record is for", ""},
				{"another revision", v.url + "/", "vault", good, `B"\`, nil, 1, 1, "hold\nhinge \"upper\"\\1: no-record: there is no record of this joint under part SM-2100, revision B\"\\\n", ""},
				{"nobody there", "http://127.0.0.1:9", "vault", good, "B", nil, 2, 0, "", "could not be asked"},
				{"silence", "http://" + silent.Addr().String(), "vault", good, "B", []string{"--timeout", "1s"}, 2, 0, "", "could not be asked"},
				{"a wrong key", v.url, "nobody", good, "B", nil, 2, 0, "", "401"},
				{"a server that fails", answering(500, "{}"), "vault", good, "B", nil, 2, 0, "", "500"},
				{"a server of another kind", answering(200, `{"released": true}`), "vault", good, "B", nil, 2, 0, "", "no decision"},
				{"a redirect", answering(307, "release"), "vault", good, "B", nil, 2, 0, "", "307"},
				{"no such policy", v.url, "vault", good, "B", []string{"--policy", "flight"}, 2, 2, "", "flight"},
				{"no joints", v.url, "vault", file("none", "[]"), "B", nil, 2, 2, "", "joints"},
				{"no list", v.url, "vault", file("broken", "{"), "B", nil, 2, 2, "", ""},
				{"another question", v.url, "vault", file("other", `[{"joint":"a","geometry_digest":"b"}],"part":"SM-1"`), "B", nil, 2, 2, "", ""},
				{"no file", v.url, "vault", filepath.Join(dir, "absent"), "B", nil, 2, 2, "", "absent"},
				{"no address", "ledger", "vault", good, "B", nil, 2, 2, "", "http"},
				{"a bad option", v.url, "vault", good, "B", []string{"--on-error", "maybe"}, 2, -1, "", "on-error"},
			} {
				args := append([]string{"--server", c.server, "--part", "SM-2100", "--revision", c.revision, "--joints", c.joints, "--timeout", "5s"}, c.args...)
				got := runGate(t, gate, v.keys[c.key], args...)
				if got.code != c.code || !strings.HasPrefix(got.out, c.out) || c.out == "" && got.out != "" || !strings.Contains(got.errs, c.errs) {
					t.Errorf("%s: exit %d, want %d\n%s%s", c.what, got.code, c.code, got.out, got.errs)
				}
				if got.took > 8*time.Second {
					t.Errorf("%s took %s", c.what, got.took)
				}
				if c.onError < 0 {
					continue
				}
				got = runGate(t, gate, v.keys[c.key], append(args, "--on-error", "release")...)
				if got.code != c.onError {
					t.Errorf("%s with --on-error release: exit %d, want %d\n%s%s", c.what, got.code, c.onError, got.out, got.errs)
				}
				if loud := strings.Contains(got.errs, "WITHOUT the gate"); loud != (c.code == 2 && c.onError == 0) {
					t.Errorf("%s with --on-error release says\n%s", c.what, got.errs)
				}
			}
		})
	}
}

// Both gates say the same in the same words.
func TestBothGatesSayTheSame(t *testing.T) {
	v := newTeam(t)
	v.record(t, "hinge", "sha256:01")
	joints := filepath.Join(t.TempDir(), "joints.json")
	if err := os.WriteFile(joints, []byte(`[{"joint":"hinge","geometry_digest":"sha256:02"},{"joint":"strut","geometry_digest":"sha256:03"}]`), 0o600); err != nil {
		t.Fatal(err)
	}
	said := map[string]bool{}
	for _, gate := range gates(t) {
		got := runGate(t, gate, v.keys["vault"], "--server", v.url, "--part", "SM-2100", "--revision", "B", "--joints", joints)
		said[fmt.Sprint(got.code, got.out)] = true
	}
	if len(said) != 1 {
		t.Errorf("%v", said)
	}
}
