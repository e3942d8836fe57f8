package api

import "time"

// MostLarge and MostHeader are limits that tests go up to.
const (
	MostLarge  = mostLarge
	MostHeader = mostHeader
	LargeBody  = largeBody
)

// Hasten shortens the deadlines that would make a test wait, and returns what
// puts them back.
func Hasten(d time.Duration) (restore func()) {
	stream, large := streamIdle, largeWait
	streamIdle, largeWait = d, d
	return func() { streamIdle, largeWait = stream, large }
}
