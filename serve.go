package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"net/netip"
	"os"
	"runtime"
	"sync"
	"time"

	"golang.org/x/net/netutil"

	"jointledger/api"
	"jointledger/notice"
	"jointledger/service"
)

// serveCommand answers over HTTP.
type serveCommand struct {
	Listen      string        `help:"Address to listen on." default:"127.0.0.1:8080" env:"JOINTLEDGER_LISTEN" placeholder:"HOST:PORT"`
	RateLimit   float64       `help:"Requests a second that each caller may make; 0 is no limit." default:"0" env:"JOINTLEDGER_RATE_LIMIT" placeholder:"N"`
	CORSOrigins []string      `help:"Web origin whose pages may call, such as https://tools.example; none by default." name:"cors-origin" env:"JOINTLEDGER_CORS_ORIGIN" placeholder:"ORIGIN"`
	DrainNotice time.Duration `help:"How long /readyz fails after SIGTERM before no more requests are accepted: longer than what sends them here takes to notice." default:"200ms" env:"JOINTLEDGER_DRAIN_NOTICE" placeholder:"TIME"`
	Policies    string        `help:"File of named release policies." env:"JOINTLEDGER_POLICIES" placeholder:"FILE"`
	Notify      string        `help:"File of systems that are told when a release does not hold any more." env:"JOINTLEDGER_NOTIFY" placeholder:"FILE"`
	place
}

// policies reads the file of policies; an error in it stops the start.
func (c serveCommand) policies() (service.Policies, error) {
	if c.Policies == "" {
		return service.NewPolicies(nil)
	}
	text, err := os.ReadFile(c.Policies)
	if err != nil {
		return nil, fmt.Errorf("cannot read the policies: %w", err)
	}
	policies, err := service.NewPolicies(text)
	if err != nil {
		return nil, fmt.Errorf("the policies in %s cannot be used:\n%w", c.Policies, err)
	}
	return policies, nil
}

// targets reads the file of systems to notify; an error in it stops the start.
func (c serveCommand) targets() (notice.Targets, error) {
	if c.Notify == "" {
		return nil, nil
	}
	text, err := os.ReadFile(c.Notify)
	if err != nil {
		return nil, fmt.Errorf("cannot read the systems to notify: %w", err)
	}
	targets, err := notice.NewTargets(text)
	if err != nil {
		return nil, fmt.Errorf("the systems to notify in %s cannot be used:\n%w", c.Notify, err)
	}
	return targets, nil
}

// drainTime is how long requests that have begun may take after SIGTERM and
// the notice.
const drainTime = 25 * time.Second

// ballast is a part of the heap that is never touched, and so never in memory.
// Without it the heap is so small that the garbage collector runs for every few
// dozen requests; a large heap is collected as ever.
const ballast = 32 << 20

// Run serves until the context ends, then drains.
func (c serveCommand) Run(ctx context.Context, std *streams) error {
	untouched := make([]byte, ballast)
	defer runtime.KeepAlive(untouched)
	log := slog.New(slog.NewJSONHandler(std.errs, nil))
	metrics := api.NewMetrics(log)
	policies, err := c.policies()
	if err != nil {
		return err
	}
	targets, err := c.targets()
	if err != nil {
		return err
	}
	s, closeAll, err := c.openService(ctx, service.Setup{Policies: policies, Watch: metrics, Notify: targets.Names()})
	if err != nil {
		return err
	}
	defer closeAll()
	listener, err := (&net.ListenConfig{}).Listen(ctx, "tcp", c.Listen)
	if err != nil {
		return fmt.Errorf("cannot listen: %w; --listen HOST:PORT names another address", err)
	}
	open, err := s.Open(ctx)
	if err != nil {
		return err
	}
	if open && !isLoopback(listener.Addr()) {
		_ = listener.Close() // nothing was accepted
		return fmt.Errorf("%s is not a loopback address and there are no keys: make one with jointledger key add NAME --role ROLE, or listen on 127.0.0.1", c.Listen)
	}
	server := api.Serve(api.New(s, api.Options{
		Log: log, Metrics: metrics, RateLimit: c.RateLimit, CORSOrigins: c.CORSOrigins, OpenAPI: openapi,
	}), log)
	server.ConnState = metrics.Connection
	delivering, stopDelivery := context.WithCancel(context.Background())
	var delivery sync.WaitGroup
	if len(targets) > 0 {
		delivery.Go(func() { s.Deliver(delivering, targets) })
	}
	defer delivery.Wait()
	defer stopDelivery()
	ended := make(chan error, 1)
	go func() { ended <- server.Serve(netutil.LimitListener(listener, api.MostConnections)) }()
	log.Info("serving", "address", "http://"+listener.Addr().String(), "open", open)
	select {
	case err := <-ended:
		return fmt.Errorf("the server stopped: %w", err)
	case <-ctx.Done():
	}
	log.Info("draining")
	s.Drain()
	time.Sleep(c.DrainNotice)
	late, cancel := context.WithTimeout(context.Background(), drainTime)
	defer cancel()
	if err := server.Shutdown(late); err != nil && !errors.Is(err, http.ErrServerClosed) {
		_ = server.Close()
		return fmt.Errorf("requests were still running after %s: %w", drainTime, err)
	}
	log.Info("stopped")
	return nil
}

// isLoopback reports whether only this machine can reach an address.
func isLoopback(a net.Addr) bool {
	address, err := netip.ParseAddrPort(a.String())
	return err == nil && address.Addr().IsLoopback()
}
