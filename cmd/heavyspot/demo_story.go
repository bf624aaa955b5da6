package main

import (
	"time"

	"heavyspot/acquire/rig"
)

// storyBegins is when the demo's story begins, on its own clock.
var storyBegins = time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC)

// visit is a stretch of whole minutes in which the story can be seen. Between
// two visits it leaps.
type visit struct {
	// day counts from the story's first; a visit begins at its hour.
	day int
	// minutes is how many minutes are seen.
	minutes  int
	deposits []dust
	text     string
	turns    []turn
}

// turn is something that happens during a visit.
type turn struct {
	// second counts from the visit's begin.
	second float64
	text   string
	do     func(*rig.Machine) error
}

// story is the demo's: dust builds up on one blade, then unevenly on both sides
// of the impeller; a lump lets go, and the plant stops the fan.
func story() []visit {
	one := func(g float64) []dust { return []dust{{g, 3, 0}} }
	return []visit{
		{day: 0, minutes: 2, text: "the fan runs well after it was cleaned and balanced"},
		{day: 9, minutes: 2, deposits: one(60), text: "a little dust on blade 3"},
		{day: 16, minutes: 2, deposits: one(115), text: "more of it, alike on both sides of the impeller"},
		{day: 21, minutes: 2, deposits: one(170), text: "it goes on"},
		{day: 25, minutes: 2, deposits: one(250), text: "it goes on"},
		{day: 29, minutes: 3, deposits: uneven(260), text: "now it settles unevenly: on blade 5 at the non-drive end's side, on blade 2 at the other"},
		{day: 32, minutes: 2, deposits: uneven(330), text: "it goes on"},
		{day: 34, minutes: 2, deposits: uneven(400), text: "it goes on"},
		{day: 35, minutes: 4, deposits: uneven(430), text: "a day later", turns: ending(57, 140)},
	}
}

// uneven are deposits on both sides of the impeller that do not match: g grams
// at the non-drive end's.
func uneven(g float64) []dust { return []dust{{250, 3, 0}, {g, 5, 1}, {g / 2, 2, -1}} }

// shortStory is the same in fewer minutes.
func shortStory() []visit {
	full := story()
	visits := []visit{full[0], full[2], full[4], full[7], full[8]}
	for i, n := range []int{1, 1, 2, 1, 3} {
		visits[i].minutes = n
	}
	visits[4].turns = ending(1, 65)
	return visits
}

// ending is how the story ends: seconds from the visit's begin.
func ending(lump, trip float64) []turn {
	after := append(uneven(430), dust{300, 5, 1})
	return []turn{
		{lump, "a lump of 300 g lets go from blade 2 at the non-drive end's side, opposite blade 5", func(m *rig.Machine) error {
			return m.SetUnbalance(unbalances(after...)...)
		}},
		{trip, "the plant's own protection stops the fan; it runs down", func(m *rig.Machine) error {
			m.Trip()
			return nil
		}},
	}
}
