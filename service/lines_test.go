package service

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"runtime"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

// shout answers a line with itself in capitals, long ones with TOO LONG.
func shout(_ context.Context, text []byte) line {
	if text == nil {
		return answered([]byte("TOO LONG"))
	}
	return answered(bytes.ToUpper(text))
}

func TestStreamAnswersInOrder(t *testing.T) {
	var in, want strings.Builder
	for i := range 10_000 {
		fmt.Fprintf(&in, "line %d\n", i)
		fmt.Fprintf(&want, "LINE %d\n", i)
	}
	in.WriteString("\n  \t\r\nlast")
	want.WriteString("LAST\n")
	var out bytes.Buffer
	slowFirst := func(ctx context.Context, text []byte) line {
		if bytes.HasSuffix(text, []byte("00")) {
			runtime.Gosched()
		}
		return shout(ctx, text)
	}
	if err := stream(t.Context(), io.NopCloser(strings.NewReader(in.String())), &out, slowFirst); err != nil {
		t.Fatal(err)
	}
	if out.String() != want.String() {
		t.Error("the answers are not those of the lines in order")
	}
}

func TestStreamLineLengths(t *testing.T) {
	for _, c := range []struct {
		length int
		want   string
	}{{MostLine - 1, "A"}, {MostLine, "A"}, {MostLine + 1, "TOO LONG"}, {10 << 20, "TOO LONG"}} {
		for _, end := range []string{"\n", "\nb\n", ""} {
			var out bytes.Buffer
			in := strings.Repeat("a", c.length) + end
			if err := stream(t.Context(), io.NopCloser(strings.NewReader(in)), &out, shout); err != nil {
				t.Fatal(err)
			}
			first, rest, _ := strings.Cut(out.String(), "\n")
			if c.want == "TOO LONG" && first != c.want || c.want == "A" && len(first) != c.length {
				t.Errorf("a line of %d is answered by %.20q", c.length, first)
			}
			if b := end == "\nb\n"; b != (rest == "B\n") {
				t.Errorf("after a line of %d and %q comes %q", c.length, end, rest)
			}
		}
	}
}

// A caller may wait for each answer before it sends on.
func TestStreamDoesNotWaitForMore(t *testing.T) {
	requestR, requestW := io.Pipe()
	answerR, answerW := io.Pipe()
	ended := make(chan error, 1)
	go func() { ended <- stream(t.Context(), requestR, answerW, shout) }()
	buffer := make([]byte, 100)
	for i := range 100 {
		if _, err := fmt.Fprintf(requestW, "n%d\n", i); err != nil {
			t.Fatal(err)
		}
		n, err := answerR.Read(buffer)
		if want := fmt.Sprintf("N%d\n", i); err != nil || string(buffer[:n]) != want {
			t.Fatalf("%q, %v, want %q", buffer[:n], err, want)
		}
	}
	_ = requestW.Close()
	if err := <-ended; err != nil {
		t.Error(err)
	}
}

// failing is a writer that fails after some bytes.
type failing struct{ left int }

var errFull = errors.New("full")

func (f *failing) Write(b []byte) (int, error) {
	if f.left -= len(b); f.left < 0 {
		return 0, errFull
	}
	return len(b), nil
}

// Whatever ends first, all ends, and the input is closed.
func TestStreamEndsWhole(t *testing.T) {
	endless := func() io.ReadCloser {
		r, w := io.Pipe()
		go func() {
			for {
				if _, err := io.WriteString(w, "line\n"); err != nil {
					return
				}
			}
		}()
		return r
	}
	torn := errors.New("torn")
	for name, c := range map[string]struct {
		run  func(ctx context.Context, cancel func()) error
		want error
	}{
		"the writer fails": {func(ctx context.Context, _ func()) error {
			return stream(ctx, endless(), &failing{1000}, shout)
		}, errFull},
		"the reader fails": {func(ctx context.Context, _ func()) error {
			r, w := io.Pipe()
			go func() {
				_, _ = io.WriteString(w, "a\nb")
				_ = w.CloseWithError(torn)
			}()
			return stream(ctx, r, io.Discard, shout)
		}, torn},
		"the caller leaves while nothing comes": {func(ctx context.Context, cancel func()) error {
			r, w := io.Pipe()
			go func() {
				_, _ = io.WriteString(w, "a\n")
				cancel()
			}()
			return stream(ctx, r, io.Discard, shout)
		}, context.Canceled},
		"the caller leaves while lines come": {func(ctx context.Context, cancel func()) error {
			n := 0
			return stream(ctx, endless(), writerFunc(func(b []byte) (int, error) {
				if n++; n == 10 {
					cancel()
				}
				return len(b), nil
			}), shout)
		}, context.Canceled},
	} {
		t.Run(name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
				defer cancel()
				if err := c.run(ctx, cancel); !errors.Is(err, c.want) {
					t.Errorf("%v, want %v", err, c.want)
				}
			})
		})
	}
}

type writerFunc func([]byte) (int, error)

func (f writerFunc) Write(b []byte) (int, error) { return f(b) }

// Who does not read holds up the reading: what is in hand stays little.
func TestStreamIsBounded(t *testing.T) {
	const lines = 20_000
	text := strings.Repeat("a", 1000) + "\n"
	taken := 0
	in := io.NopCloser(readerFunc(func(b []byte) (int, error) {
		if taken >= lines*len(text) {
			return 0, io.EOF
		}
		n := copy(b, text[taken%len(text):])
		taken += n
		return n, nil
	}))
	first := true
	err := stream(t.Context(), in, writerFunc(func(b []byte) (int, error) {
		if first {
			first = false
			time.Sleep(50 * time.Millisecond)
		}
		return len(b), nil
	}), func(_ context.Context, text []byte) line { return answered(text[:1]) })
	if err != nil || taken != lines*len(text) {
		t.Fatalf("%d bytes taken, %v", taken, err)
	}
	// While the writer stands still no more is taken than the queues hold.
	taken = 0
	held := make(chan struct{})
	ctx, cancel := context.WithCancel(t.Context())
	var most int
	go func() {
		time.Sleep(100 * time.Millisecond)
		cancel()
		close(held)
	}()
	_ = stream(ctx, in, writerFunc(func(b []byte) (int, error) {
		<-held
		return 0, errFull
	}), func(_ context.Context, text []byte) line { return answered(text[:1]) })
	most = taken
	if limit := (chunksInHand*3+2)*(runtime.GOMAXPROCS(0)+1)*chunkLines*len(text) + 128<<10; most > limit {
		t.Errorf("%d bytes were taken while nobody read, at most %d may be", most, limit)
	}
}

type readerFunc func([]byte) (int, error)

func (f readerFunc) Read(b []byte) (int, error) { return f(b) }
