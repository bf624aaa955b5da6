// Package rig is a simulated fan: the dynamics of a rigid rotor on flexible
// bearings and pedestals, the accelerometers on its two bearing housings, and
// the phase reference beside its shaft, in volts at a converter's input.
//
// A Machine integrates the equations of motion in time and can be changed
// while it runs: unbalance, faults, speed, trip and run-down. Its Steady method
// solves the same equations for the steady response, which is the truth that
// tests compare against. Phasors is a signal without dynamics whose vectors and
// shaft angle are prescribed exactly. Random draws machines of each kind of
// fault. NewSource turns either signal into an acquire.Source; the simulated
// converters in the folder chip take the signal itself.
//
// Axes are right-handed: vertical up, horizontal to the right seen from the
// drive end, axial from the drive end to the non-drive end. A clockwise rotor
// turns from vertical to horizontal, positively about the axial axis. Angles on
// the rotor are laid off from the reference mark against the rotation. The
// shaft angle is zero at the leading edge of the reference's pulse.
package rig
