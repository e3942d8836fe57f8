//go:build race

package pages_test

const raceDetector = true
