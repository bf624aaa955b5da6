package publish

import "time"

// LinkState says whether the program is connected to the broker.
type LinkState string

// The states of the link.
const (
	Online  LinkState = "online"
	Offline LinkState = "offline"
)

// Link tells whether the program is there. An offline message that the broker
// sends as last will carries the time of the connection that broke, since it was
// handed over then.
type Link struct {
	Envelope
	State LinkState `json:"state"`
}

// LinkMessage makes a link message; site, machine, sequence and boot are left to
// the sender.
func LinkMessage(s LinkState, at time.Time) *Link {
	return &Link{Envelope: Envelope{Schema: Schema, Kind: KindLink, Time: At(at)}, State: s}
}

// Levels are the levels of the topic below the machine.
func (l *Link) Levels() []string { return []string{string(KindLink)} }

// Retained is true: a receiver that comes later must know.
func (l *Link) Retained() bool { return true }
