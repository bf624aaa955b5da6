package rig

// Direction is a machine axis.
type Direction uint8

// The directions: up; to the right seen from the drive end; from the drive end
// to the non-drive end.
const (
	Vertical Direction = iota
	Horizontal
	Axial
)

// End names a bearing.
type End uint8

// The two bearings.
const (
	DriveEnd End = iota
	NonDriveEnd
)

// Config describes a machine and what is attached to it. Positions along the
// shaft are metres from the drive-end bearing towards the non-drive end.
type Config struct {
	Rotor Rotor
	// Supports are the drive-end and the non-drive-end bearing, each with its
	// housing and pedestal.
	Supports [2]Support
	Frame    Frame
	// Shaft ties the rotor's centre of mass elastically to ground; the zero
	// value means it does not.
	Shaft Shaft
	Drive Drive
	// Unbalances are the masses on the rotor.
	Unbalances []Unbalance
	Faults     Faults
	// Sensors are the accelerometers.
	Sensors []Sensor
	// Reference is the phase reference; nil means none.
	Reference *Reference
	// Channels is the number of inputs of the converter, at least one more
	// than the highest channel used; inputs without a sensor carry 0 V. Zero
	// means 8.
	Channels int
	// StepHz is the number of steps of signal per second; zero means 8000.
	StepHz float64
}

// Rotor is the rigid rotor.
type Rotor struct {
	// MassKg is the mass, kg.
	MassKg float64
	// PolarKgM2 and TransverseKgM2 are the moments of inertia about the axis
	// and about a diameter through the centre of mass, kg m2.
	PolarKgM2, TransverseKgM2 float64
	// CentreM is the position of the centre of mass.
	CentreM float64
	// CounterClockwise is the sense of rotation seen from the drive end.
	CounterClockwise bool
}

// Spring is a linear spring with a viscous damper beside it.
type Spring struct {
	// K is the stiffness, N/m, or N m/rad against tilting.
	K float64
	// C is the damping, N s/m, or N m s/rad.
	C float64
}

// Support is a bearing, its housing and the pedestal the housing stands on.
type Support struct {
	// PositionM is the bearing's position.
	PositionM float64
	// BearingV, BearingH and BearingA are the springs between shaft and housing.
	BearingV, BearingH, BearingA Spring
	// BearingTilt resists tilting of the shaft in the housing, N m/rad about
	// both transverse axes; zero means self-aligning.
	BearingTilt Spring
	// HousingKg is the mass that moves with the housing, kg.
	HousingKg float64
	// V, H and A are the springs between housing and frame. A stiffness of
	// zero holds the housing fast in space in that direction.
	V, H, A Spring
	// PedestalM is the height of the shaft above the foot about which the
	// pedestal bends in the vertical plane through the shaft, m: axial motion
	// x of the housing tilts it by x / PedestalM. Zero means that it does not tilt.
	PedestalM float64
}

// Frame is the body that carries both pedestals: a bearing frame or a
// foundation block. A mass of zero holds it fast.
type Frame struct {
	// MassKg is the mass, kg; PitchKgM2 and YawKgM2 the moments of inertia
	// about the horizontal and the vertical transverse axis, kg m2.
	MassKg, PitchKgM2, YawKgM2 float64
	// CentreM is the axial position of the centre of its springs and HeightM
	// the height of the shaft above it, m: pitching by b moves both housings
	// by b * HeightM along the shaft, in phase.
	CentreM, HeightM float64
	// V, H, A are its springs to ground, Pitch and Yaw those against tilting.
	V, H, A, Pitch, Yaw Spring
}

// Shaft is the stiffness that a flexible shaft built in at ground gives a disc
// at the rotor's centre of mass, alike in both planes:
// force = Translation*u + Coupling*slope, moment = Coupling*u + Tilt*slope.
type Shaft struct {
	// Translation is in N/m, Coupling in N/rad, Tilt in N m/rad.
	Translation, Coupling, Tilt float64
}

// Unbalance is a mass on the rotor.
type Unbalance struct {
	// KgM is mass times radius, kg m.
	KgM float64
	// PositionM is its plane.
	PositionM float64
	// AngleDeg is its angle from the reference mark against the rotation.
	AngleDeg float64
}

// Drive is the motor and the load that set the speed.
type Drive struct {
	// RPM is the speed under full load, r/min.
	RPM float64
	// Slip is the share of the synchronous speed by which full load slows the
	// motor, for instance 0.012; the load's wander changes the speed through it.
	Slip float64
	// LoadWander is one standard deviation of the load's slow random change as
	// a share of full load, and WanderS its correlation time, s.
	LoadWander, WanderS float64
	// RampRPMPerS bounds how fast the drive changes the speed; zero means 60.
	RampRPMPerS float64
	// FollowS is the time constant with which the speed follows, s; zero means 1.
	FollowS float64
	// WindageRPMPerS is the deceleration by windage at RPM after a trip, falling with
	// the square of the speed; FrictionRPMPerS is the part that stays.
	// Both zero means 0.02 and 0.004 of RPM per second.
	WindageRPMPerS, FrictionRPMPerS float64
	// Stopped starts the simulation at standstill.
	Stopped bool
}
