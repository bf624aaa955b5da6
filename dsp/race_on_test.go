//go:build race

package dsp_test

// raceDetector is true in a build for the race detector.
const raceDetector = true
