package storetest

import (
	"sync/atomic"
	"time"
)

// Ticking is a clock that moves on by Step with each reading.
type Ticking struct {
	Step time.Duration
	read atomic.Int64
}

// Now implements service.Clock.
func (c *Ticking) Now() time.Time {
	return time.Date(2026, 3, 1, 8, 0, 0, 0, time.UTC).Add(time.Duration(c.read.Add(1)) * c.Step)
}
