// Package rules says what a minute reading means: how severe the vibration is
// by a published table or the plant's own limits, and whether the 1x vibration
// is unbalance and of which kind, with every test's measured value, expectation
// and uncertainty as evidence. A verdict near a border, or with points missing,
// is Undetermined rather than a guess.
package rules
