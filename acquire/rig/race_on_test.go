//go:build race

package rig

// raceDetector is true in a build for the race detector.
const raceDetector = true
