package rig_test

import (
	"fmt"
	"math/rand/v2"

	"heavyspot/acquire/rig"
)

// A lump on the impeller lets go while the fan runs.
func Example() {
	fan := rig.Random(rig.Static, rand.New(rand.NewPCG(1, 2)))
	m, err := rig.New(fan.Config, 1)
	if err != nil {
		fmt.Println(err)
		return
	}
	volts := make([]float32, m.Channels())
	run := func(seconds int) {
		for range seconds * int(m.StepHz()) {
			m.Next(volts)
		}
	}
	run(1)
	before, _ := m.Steady(m.RPM())
	masses := m.Config().Unbalances
	masses[0].KgM /= 2
	if err := m.SetUnbalance(masses...); err != nil {
		fmt.Println(err)
		return
	}
	run(1)
	after, _ := m.Steady(m.RPM())
	fmt.Printf("1x at %s fell to %.0f %%\n", after[0].Name, 100*after[0].Order[0].RMS/before[0].Order[0].RMS)
	// Output: 1x at de-v fell to 49 %
}
