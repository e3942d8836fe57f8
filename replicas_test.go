package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"net/http"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"sync"
	"syscall"
	"testing"
	"time"

	"jointledger/store/storetest"
)

// TestReplicas puts load on three servers behind the HAProxy of the deployment,
// kills one after another and restarts Postgres under them: callers that retry
// with their keys see no loss and no duplicate, and there is one log, which
// verifies.
func TestReplicas(t *testing.T) {
	cluster, err := storetest.NewCluster()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := cluster.Remove(); err != nil {
			t.Error(err)
		}
	})
	const replicas = 3
	data := t.TempDir()
	address := [replicas]string{}
	servers := [replicas]*server{}
	run := func(i int) {
		servers[i] = start(t, "--listen", address[i], "--data", data, "--database-url", cluster.URL())
	}
	for i := range replicas {
		address[i] = "127.0.0.1:" + freePort(t)
		run(i)
	}
	front := "http://" + balance(t, address)

	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	var acknowledged sync.Map // joint → id
	var work sync.WaitGroup
	for c := range 16 {
		work.Go(func() {
			for i := 0; ctx.Err() == nil; i++ {
				joint := fmt.Sprintf("joint-%d-%d", c, i)
				id, err := recordUntilAnswered(func() string { return front }, joint)
				if err != nil {
					t.Error(err)
					return
				}
				acknowledged.Store(joint, id)
			}
		})
	}
	count := func() (n int) {
		acknowledged.Range(func(any, any) bool { n++; return true })
		return n
	}
	// Whatever was done to the servers, records are acknowledged again after it.
	goesOn := func(after string) {
		t.Helper()
		for had, deadline := count(), time.Now().Add(20*time.Second); count() < had+20; time.Sleep(20 * time.Millisecond) {
			if time.Now().After(deadline) {
				t.Fatalf("nothing is recorded any more after %s", after)
			}
		}
	}
	goesOn("the start")
	for i := range replicas {
		_ = servers[i].stop(t, syscall.SIGKILL)
		goesOn("the end of a server")
		run(i)
		goesOn("its new start")
	}
	if err := cluster.Stop(); err != nil {
		t.Fatal(err)
	}
	time.Sleep(500 * time.Millisecond)
	if err := cluster.Start(); err != nil {
		t.Fatal(err)
	}
	goesOn("the restart of Postgres")
	// The last way that a server goes: told to, and draining.
	if err := servers[0].stop(t, syscall.SIGTERM); err != nil {
		t.Errorf("a drained server ended with %v\n%s", err, servers[0].log)
	}
	goesOn("a drain")
	cancel()
	work.Wait()

	compareWithListed(t, front, &acknowledged)
	// One log: the servers that are left, asked without the balancer, have the
	// same head, and it verifies.
	_, one := get(t, servers[1].url+"/v1/checkpoint")
	_, other := get(t, servers[2].url+"/v1/checkpoint")
	if !bytes.Equal(one, other) {
		t.Errorf("two replicas have two heads:\n%s%s", one, other)
	}
	t.Log(count(), "records;", verifyExport(t, servers[1].url, 0))
}

// balance starts the deployment's HAProxy before three servers and returns the
// address that callers use.
func balance(t *testing.T, servers [3]string) string {
	t.Helper()
	path, err := exec.LookPath("haproxy")
	if err != nil {
		path = "/usr/sbin/haproxy" // Debian's place, which is not on everybody's PATH
	}
	front := "127.0.0.1:" + freePort(t)
	cmd := exec.Command(path, "-f", filepath.Join("deploy", "haproxy", "haproxy.cfg"))
	cmd.Env = append(os.Environ(), "FRONT="+front, "A="+servers[0], "B="+servers[1], "C="+servers[2])
	var said bytes.Buffer
	cmd.Stdout, cmd.Stderr = &said, &said
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		_ = cmd.Process.Kill()
		_ = cmd.Wait()
		if t.Failed() {
			t.Logf("haproxy: %s", &said)
		}
	})
	for deadline := time.Now().Add(20 * time.Second); ; time.Sleep(50 * time.Millisecond) {
		response, err := httpClient.Get("http://" + front + "/readyz")
		if err == nil {
			response.Body.Close()
			if response.StatusCode == http.StatusOK {
				return front
			}
		}
		if time.Now().After(deadline) {
			t.Fatalf("haproxy does not answer: %v", err)
		}
	}
}

// recordUntilAnswered records a joint as a caller does that retries with its
// key: whatever is not an answer of the ledger is asked again.
func recordUntilAnswered(server func() string, joint string) (id string, _ error) {
	for deadline := time.Now().Add(60 * time.Second); ; time.Sleep(20 * time.Millisecond) {
		response, body, err := post(server()+"/v1/records", recordOf(joint), joint)
		switch {
		case err == nil && response.StatusCode == http.StatusCreated:
			var made struct{ ID string }
			err = json.Unmarshal(body, &made)
			return made.ID, err
		case err == nil && response.StatusCode < 500:
			return "", fmt.Errorf("%s: %d %s", joint, response.StatusCode, body)
		case time.Now().After(deadline):
			return "", fmt.Errorf("%s was not answered: %v %s", joint, err, body)
		}
	}
}

// compareWithListed holds the records that were acknowledged, by joint, against
// those that a server lists: each is there, once, and nothing else is. It
// returns how many there are.
func compareWithListed(t *testing.T, server string, acknowledged *sync.Map) int {
	t.Helper()
	found := listed(t, server)
	for joint, ids := range found {
		if len(ids) != 1 {
			t.Errorf("%s is there as %q", joint, ids)
		}
	}
	count := 0
	acknowledged.Range(func(joint, id any) bool {
		count++
		if ids := found[joint.(string)]; len(ids) != 1 || ids[0] != id {
			t.Errorf("%s was acknowledged as %s and is there as %q", joint, id, ids)
		}
		return true
	})
	if len(found) != count {
		t.Errorf("%d records were acknowledged and %d are there", count, len(found))
	}
	return count
}

// listed is every record of a server by its joint.
func listed(t *testing.T, server string) map[string][]string {
	t.Helper()
	found := map[string][]string{}
	for next := server + "/v1/records?limit=500"; next != ""; {
		status, body := get(t, next)
		var list struct {
			Items []struct {
				ID      string
				Subject struct{ Joint string }
			}
			NextCursor *string `json:"next_cursor"`
		}
		if err := json.Unmarshal(body, &list); err != nil || status != http.StatusOK {
			t.Fatalf("%d %v", status, err)
		}
		for _, item := range list.Items {
			found[item.Subject.Joint] = append(found[item.Subject.Joint], item.ID)
		}
		if next = ""; list.NextCursor != nil {
			next = server + "/v1/records?limit=500&cursor=" + url.QueryEscape(*list.NextCursor)
		}
	}
	return found
}
