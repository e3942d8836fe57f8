// Throwaway runs a command beside a Postgres cluster that lives as long as the
// command:
//
//	go run ./store/throwaway -- go test ./...
//
// The command finds the cluster's URL in JOINTLEDGER_TEST_POSTGRES. Its exit
// status is passed on; 125 means that the cluster could not be started or
// stopped.
package main

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"os/signal"
	"runtime"
	"syscall"

	"jointledger/store/storetest"
)

// statusOfCluster is the exit status when not the command failed but the
// cluster.
const statusOfCluster = 125

func main() {
	args := os.Args[1:]
	if len(args) > 0 && args[0] == "--" {
		args = args[1:]
	}
	if len(args) == 0 {
		fmt.Fprintln(os.Stderr, "usage: throwaway -- COMMAND [ARGUMENT…]")
		os.Exit(statusOfCluster)
	}
	// Signals are for the command; the cluster outlives it.
	signals := make(chan os.Signal, 8)
	signal.Notify(signals, syscall.SIGINT, syscall.SIGTERM, syscall.SIGHUP)
	cluster, err := storetest.NewCluster()
	if err != nil {
		fmt.Fprintln(os.Stderr, "throwaway:", err)
		os.Exit(statusOfCluster)
	}
	status, err := run(args, cluster.URL(), signals)
	if err := errors.Join(err, cluster.Remove()); err != nil {
		fmt.Fprintln(os.Stderr, "throwaway:", err)
		if status == 0 {
			status = statusOfCluster
		}
	}
	os.Exit(status)
}

// run runs the command and returns its exit status, that of a shell where a
// signal ended it.
func run(args []string, url string, signals <-chan os.Signal) (int, error) {
	command := exec.Command(args[0], args[1:]...)
	command.Env = append(os.Environ(), storetest.Variable+"="+url)
	command.Stdin, command.Stdout, command.Stderr = os.Stdin, os.Stdout, os.Stderr
	command.SysProcAttr = &syscall.SysProcAttr{Pdeathsig: syscall.SIGTERM}
	// The signal on the parent's death follows the thread that forked.
	runtime.LockOSThread()
	if err := command.Start(); err != nil {
		return statusOfCluster, err
	}
	ended := make(chan error, 1)
	go func() { ended <- command.Wait() }()
	for {
		select {
		case s := <-signals:
			if err := command.Process.Signal(s); err != nil && !errors.Is(err, os.ErrProcessDone) {
				return statusOfCluster, err
			}
		case err := <-ended:
			var exit *exec.ExitError
			if !errors.As(err, &exit) {
				return command.ProcessState.ExitCode(), err
			}
			if by := exit.Sys().(syscall.WaitStatus); by.Signaled() {
				return 128 + int(by.Signal()), nil
			}
			return exit.ExitCode(), nil
		}
	}
}
