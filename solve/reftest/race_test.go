//go:build race

package reftest

const raceDetector = true
