package main

import (
	"fmt"
	"io"
	"net"
	"net/http"
	"strings"
	"testing"
	"time"

	"jointledger/api"
)

// TestTooManyConnectionsWait: with every place taken the next connection waits,
// and is answered when a place is free.
func TestTooManyConnectionsWait(t *testing.T) {
	s := start(t, "--data", t.TempDir())
	address := strings.TrimPrefix(s.url, "http://")
	var places []net.Conn
	t.Cleanup(func() {
		for _, c := range places {
			c.Close()
		}
	})
	deadline := time.Now().Add(4 * time.Second) // silent ones are cut after five
	for range api.MostConnections {
		c, err := net.Dial("tcp", address)
		if err != nil {
			t.Fatal(err)
		}
		places = append(places, c)
	}
	late, err := net.Dial("tcp", address) // the kernel takes it, the server not yet
	if err != nil {
		t.Fatal(err)
	}
	defer late.Close()
	if _, err := io.WriteString(late, "GET /healthz HTTP/1.1\r\nHost: localhost\r\nConnection: close\r\n\r\n"); err != nil {
		t.Fatal(err)
	}
	if err := late.SetReadDeadline(time.Now().Add(500 * time.Millisecond)); err != nil {
		t.Fatal(err)
	}
	if time.Now().After(deadline) {
		t.Fatal("this machine opens connections too slowly for this test")
	}
	if n, err := late.Read(make([]byte, 1)); n > 0 || err == nil {
		t.Fatal("one connection too many was answered")
	}
	places[0].Close()
	if err := late.SetReadDeadline(time.Now().Add(20 * time.Second)); err != nil {
		t.Fatal(err)
	}
	answer, err := io.ReadAll(late)
	if want := fmt.Sprintf("HTTP/1.1 %d ", http.StatusOK); err != nil || !strings.HasPrefix(string(answer), want) {
		t.Errorf("the connection that waited: %v %.100s", err, answer)
	}
}
