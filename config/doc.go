// Package config reads the TOML file that describes one machine, its sensors
// and where its data go, and hands out a configuration that is right as a whole
// or none at all.
//
// All problems of a file are found in one go and told one a line, each with the
// file, the line, the key, the value as written and what is allowed:
//
//	kiln-fan-2.toml:17: point[2].volts_per_g = 0: must be from 0.0001 to 100 (volts per standard gravity)
//
// A list of tables is counted from 0, as channels are: point[2] is the third
// [[point]]. A key that nobody knows is an error too, with the nearest known
// one. Nothing is taken from the environment while a file is read, so the same
// bytes always give the same configuration.
//
// The TOML library parses; assigning its values to the fields is done here,
// because the library stops at the first value of a wrong type and an operator
// should not have to start the program once for each mistake.
//
// schema.go holds every key with its unit, range and default; the checks of a
// table are in the validate file of its name.
package config
