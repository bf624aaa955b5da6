//go:build !linux

package main

// wallClockSet says whether the wall clock can be believed; elsewhere than on
// Linux nobody can tell.
func wallClockSet() bool { return false }

// hurry does nothing elsewhere than on Linux.
func hurry() {}

// freeBytes returns how many bytes may still be written in a folder's file
// system; elsewhere than on Linux that is not known.
func freeBytes(string) (int64, bool) { return 0, false }
