//go:build !race

package reftest

// raceDetector tells that tests run under it.
const raceDetector = false
