package config

import (
	"slices"

	"heavyspot/acquire/ads131m08"
	"heavyspot/rules"
)

// The drivers of [source].
const (
	// DriverADS131M08 is the converter on SPI.
	DriverADS131M08 = "ads131m08"
	// DriverRig is a simulated machine behind a simulated converter.
	DriverRig = "rig"
	// DriverADXL355 is the digital accelerometer: its recordings can be
	// replayed, but it cannot be driven yet.
	DriverADXL355 = "adxl355"
)

// The standards of [limits].
const (
	StandardISO14694  = "iso-14694"
	StandardISO208163 = "iso-20816-3"
	StandardOwn       = "own"
)

// converterChannels is the number of channels of the converter.
const converterChannels = ads131m08.MaxChannels

var (
	drivers    = []string{DriverADS131M08, DriverADXL355, DriverRig}
	standards  = []string{StandardISO14694, StandardISO208163, StandardOwn}
	categories = []string{"BV-1", "BV-2", "BV-3", "BV-4", "BV-5"}
	supports   = []string{"rigid", "flexible"}
	rotors     = []string{"between-bearings", "overhung"}
	rotations  = []string{"clockwise", "counter-clockwise"}
	clocks     = []string{"crystal", "external"}
	edges      = []string{"rising", "falling"}
	bearings   = []string{"drive-end", "non-drive-end"}
	directions = []string{"vertical", "horizontal", "axial"}
)

// faults are the simulated machine's troubles: the kinds of unbalance, then the
// causes that a judgement calls suspects, by the same words.
var faults = []string{
	"none", "static", "couple", "dynamic", faultOverhung,
	string(rules.BentShaft), string(rules.Misalignment), string(rules.Eccentricity), string(rules.Resonance),
	string(rules.Looseness), string(rules.RubOrLooseRotor), string(rules.NeighbourMachine), string(rules.NotTurnRelated),
}

// faultOverhung needs a machine with an overhung rotor.
const faultOverhung = "overhung"

// Faults returns the words that [rig] fault may hold.
func Faults() []string { return slices.Clone(faults) }

// defaults returns the configuration that a file is read over.
func defaults() *Config {
	return &Config{
		Limits: Limits{QuietShare: 0.25},
		Source: Source{
			SPI: "/dev/spidev0.0", SPIHz: 8_000_000, DataReady: "GPIO25",
			Clock: "crystal", ClockHz: 8_192_000, Gain: []int{1}, InputCRC: true,
		},
		Buffer: Buffer{
			Path: "heavyspot.db", Socket: "heavyspot.sock",
			MaxMB: 256, KeepDays: 400, FindingsKeepDays: 3650,
		},
		MQTT: MQTT{
			Brokers: []string{}, EmbeddedListen: "127.0.0.1:1883", Root: "heavyspot",
			KeepaliveS: 30, InFlight: 16,
		},
		Alarm: Alarm{UnbalanceMinutes: 3, ClearMinutes: 3},
	}
}

// defaultRig returns the story of a rig that the file says nothing about.
func defaultRig() *Rig {
	return &Rig{Fault: "static", MMS: 6, NoiseMMS: 0.3, Seed: 1, SpeedUp: 1}
}
