package rig

import (
	"math"
	"math/rand/v2"
)

// driveState is the motor: on and following its set speed, or off.
type driveState struct {
	on bool
	// synchronous is the speed without load, rad/s; slip, ramp, follow as in
	// Drive, in rad and s.
	synchronous, slip, ramp, follow float64
	windage, friction, rated        float64
	wander                          wander
}

// rpm converts r/min to rad/s.
const rpm = 2 * math.Pi / 60

// newDrive prepares the drive.
func newDrive(d Drive) driveState {
	s := driveState{
		on: !d.Stopped, slip: d.Slip, rated: d.RPM * rpm,
		ramp: d.RampRPMPerS * rpm, follow: d.FollowS,
		windage: d.WindageRPMPerS * rpm, friction: d.FrictionRPMPerS * rpm,
		wander: wander{sd: d.LoadWander, seconds: d.WanderS},
	}
	s.synchronous = s.rated / (1 - d.Slip)
	if s.ramp == 0 {
		s.ramp = 60 * rpm
	}
	if s.follow == 0 {
		s.follow = 1
	}
	if s.windage == 0 && s.friction == 0 {
		s.windage, s.friction = 0.02*s.rated, 0.004*s.rated
	}
	return s
}

// alpha implements torque.
func (d *driveState) alpha(omega float64) float64 {
	if !d.on {
		if omega <= 0 {
			return 0
		}
		// Windage goes with the square of the speed, friction does not change.
		r := omega / d.rated
		return -(d.windage*r*r + d.friction)
	}
	target := d.synchronous * (1 - d.slip*(1+d.wander.value))
	return max(-d.ramp, min(d.ramp, (target-omega)/d.follow))
}

// wander is a slow random change: an Ornstein-Uhlenbeck process.
type wander struct {
	sd, seconds, value float64
}

// step advances the process by h seconds.
func (w *wander) step(h float64, r *rand.Rand) {
	if w.sd == 0 {
		w.value = 0
		return
	}
	if w.seconds <= 0 {
		w.value = w.sd * r.NormFloat64()
		return
	}
	keep := 1 - h/w.seconds
	if keep < 0 {
		keep = 0
	}
	w.value = keep*w.value + w.sd*math.Sqrt(1-keep*keep)*r.NormFloat64()
}
