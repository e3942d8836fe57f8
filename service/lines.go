package service

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"io"
	"runtime"
	"sync"
)

// Limits of a stream of lines. What is in hand at once is at most the longest
// chunk times chunksInHand for every core, however long the stream.
const (
	MostLine     = 4 << 20
	chunkLines   = 64
	chunkBytes   = 256 << 10
	chunksInHand = 2
)

// line is what is to be done with one line of a stream.
type line struct {
	// begin is called in the order of the lines, where it is not nil.
	begin func()
	// end gives the line's answer; it may wait for what begin has begun.
	end func() []byte
}

// answered is a line whose answer is known.
func answered(text []byte) line { return line{end: func() []byte { return text }} }

// chunk is some lines that are worked on one after the other.
type chunk struct {
	texts [][]byte // nil for one that is too long
	lines []line
	ready chan struct{} // closed when lines are there
}

// stream reads lines, works on them on all cores and writes their answers in
// order. Blank lines are passed over. A line is answered as soon as it can be:
// the other end may wait for the answer before it sends the next. It ends with
// the input, with the first error of reading or writing, or with the context;
// then it closes the input, whose Close must unblock a Read.
func stream(ctx context.Context, in io.ReadCloser, out io.Writer, work func(ctx context.Context, text []byte) line) error {
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	stop := context.AfterFunc(ctx, func() { _ = in.Close() })
	defer stop()
	cores := runtime.GOMAXPROCS(0)
	todo := make(chan *chunk, cores*chunksInHand)
	worked := make(chan *chunk, cores*chunksInHand) // in order, worked on or not yet
	begun := make(chan *chunk, cores*chunksInHand)

	var running sync.WaitGroup
	running.Go(func() {
		defer close(todo)
		defer close(worked)
		err := readChunks(bufio.NewReaderSize(in, 64<<10), func(c *chunk) error {
			for _, queue := range []chan *chunk{todo, worked} {
				select {
				case queue <- c:
				case <-ctx.Done():
					return ctx.Err()
				}
			}
			return nil
		})
		if err != nil {
			cancel(err)
		}
	})
	for range cores {
		running.Go(func() {
			for c := range todo {
				for _, text := range c.texts {
					if ctx.Err() != nil {
						break
					}
					c.lines = append(c.lines, work(ctx, text))
				}
				close(c.ready)
			}
		})
	}
	running.Go(func() {
		defer close(begun)
		for c := range worked {
			<-c.ready
			for _, l := range c.lines {
				if l.begin != nil {
					l.begin()
				}
			}
			select {
			case begun <- c:
			case <-ctx.Done():
			}
		}
	})
	var answers bytes.Buffer
	for c := range begun {
		if ctx.Err() != nil {
			continue // to its end, so that nobody waits to send
		}
		answers.Reset()
		for _, l := range c.lines {
			answers.Write(append(l.end(), '\n'))
		}
		_, err := out.Write(answers.Bytes())
		if flusher, ok := out.(interface{ Flush() error }); err == nil && ok && len(begun) == 0 {
			err = flusher.Flush()
		}
		if err != nil {
			cancel(err)
		}
	}
	running.Wait()
	return context.Cause(ctx)
}

// readChunks cuts a stream into lines. A chunk goes on as soon as there is no
// further line to be had without waiting.
func readChunks(in *bufio.Reader, send func(*chunk) error) error {
	c := &chunk{ready: make(chan struct{})}
	size := 0
	for {
		text, long, err := readLine(in)
		if err != nil && !errors.Is(err, io.EOF) {
			return err
		}
		if long || len(bytes.TrimSpace(text)) > 0 {
			c.texts, size = append(c.texts, text), size+len(text)
		}
		ended := err != nil
		if len(c.texts) > 0 && (ended || len(c.texts) >= chunkLines || size >= chunkBytes || !lineBuffered(in)) {
			if err := send(c); err != nil {
				return err
			}
			c, size = &chunk{ready: make(chan struct{})}, 0
		}
		if ended {
			return nil
		}
	}
}

// lineBuffered reports whether a whole line is in the buffer.
func lineBuffered(in *bufio.Reader) bool {
	buffered, _ := in.Peek(in.Buffered())
	return bytes.IndexByte(buffered, '\n') >= 0
}

// readLine reads a line, without its end, into memory of its own. A line that
// is too long is passed over: long, and nil.
func readLine(in *bufio.Reader) (text []byte, long bool, err error) {
	for {
		part, err := in.ReadSlice('\n')
		if !long {
			if text = append(text, part...); len(text) > MostLine+1 {
				text, long = nil, true
			}
		}
		if errors.Is(err, bufio.ErrBufferFull) {
			continue
		}
		text = bytes.TrimSuffix(text, []byte("\n"))
		if len(text) > MostLine {
			text, long = nil, true
		}
		return text, long, err
	}
}
