package publish

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"time"
)

// Schema is the version of the messages that this package writes and reads.
const Schema = 1

// Kind is what a message is about.
type Kind string

// The kinds of message.
const (
	KindMinute  Kind = "minute"
	KindFinding Kind = "finding"
	KindAlarm   Kind = "alarm"
	KindLink    Kind = "link"
)

// Envelope begins every message.
type Envelope struct {
	Schema  int    `json:"schema"`
	Kind    Kind   `json:"kind"`
	Site    string `json:"site"`
	Machine string `json:"machine"`
	Time    Time   `json:"time"`
	// Sequence counts messages up from 1 without gaps, over restarts; receivers
	// drop repeats and see gaps by it. A link message is not counted: it carries
	// the number of the last message counted before it, 0 for none.
	Sequence uint64 `json:"sequence"`
	// Boot changes at each start of the program.
	Boot uint64 `json:"boot"`
}

// Head returns the envelope, for filling in what the message does not know.
func (e *Envelope) Head() *Envelope { return e }

// Message is one of *Minute, *Finding, *Alarm and *Link.
type Message interface {
	Head() *Envelope
	// Levels are the levels of the topic below the machine.
	Levels() []string
	// Retained says whether a broker keeps the newest for later receivers.
	Retained() bool
}

// Time is a time in UTC, written with milliseconds as RFC 3339 has it. The zero
// time, which means unknown, is written as 1970-01-01T00:00:00.000Z.
type Time struct{ time.Time }

const timeLayout = "2006-01-02T15:04:05.000Z07:00"

// At returns t as messages carry it: UTC, cut to whole milliseconds.
func At(t time.Time) Time {
	if t.IsZero() {
		t = time.Unix(0, 0)
	}
	return Time{t.UTC().Truncate(time.Millisecond)}
}

// Counted returns the time that stands for a sample when the wall time is
// unknown: its distance from the first sample, counted from
// 1970-01-01T00:00:00Z. index is the sample index, rateHz the rate, over 0.
func Counted(index int64, rateHz float64) time.Time {
	return time.Unix(0, 0).UTC().Add(time.Duration(float64(index) / rateHz * float64(time.Second)))
}

// MarshalJSON writes the time.
func (t Time) MarshalJSON() ([]byte, error) {
	u := At(t.Time)
	if err := u.check(); err != nil {
		return nil, err
	}
	return u.AppendFormat(nil, `"`+timeLayout+`"`), nil
}

// UnmarshalJSON reads any RFC 3339 time.
func (t *Time) UnmarshalJSON(b []byte) error {
	var s string
	if err := json.Unmarshal(b, &s); err != nil {
		return err
	}
	u, err := time.Parse(time.RFC3339, s)
	if err != nil {
		return fmt.Errorf("publish: time %q: must be as in 2026-03-01T06:31:00.000Z", s)
	}
	*t = At(u)
	return t.check()
}

// check refuses years that RFC 3339 cannot write.
func (t Time) check() error {
	if y := t.Year(); y < 0 || y > 9999 {
		return fmt.Errorf("publish: year %d: must be from 0 to 9999", y)
	}
	return nil
}

// Encode returns the message as one line of JSON, without the line end.
func Encode(m Message) ([]byte, error) {
	var b bytes.Buffer
	enc := json.NewEncoder(&b)
	enc.SetEscapeHTML(false)
	if err := enc.Encode(m); err != nil {
		return nil, fmt.Errorf("publish: cannot encode %s message: %v", m.Head().Kind, err)
	}
	return bytes.TrimSuffix(b.Bytes(), []byte("\n")), nil
}

// Decode reads a message. Unknown fields are ignored, since fields may be
// added; another schema or an unknown kind is an error.
func Decode(data []byte) (Message, error) {
	var head Envelope
	if err := json.Unmarshal(data, &head); err != nil {
		return nil, fmt.Errorf("publish: cannot read message: %v", err)
	}
	if head.Schema != Schema {
		return nil, fmt.Errorf("publish: cannot read message: schema %d: must be %d", head.Schema, Schema)
	}
	m, err := empty(head.Kind)
	if err != nil {
		return nil, err
	}
	if err := json.Unmarshal(data, m); err != nil {
		return nil, fmt.Errorf("publish: cannot read %s message: %v", head.Kind, err)
	}
	return m, nil
}

// ErrKind is returned for a message of an unknown kind.
var ErrKind = errors.New("publish: unknown kind of message")

func empty(k Kind) (Message, error) {
	switch k {
	case KindMinute:
		return &Minute{}, nil
	case KindFinding:
		return &Finding{}, nil
	case KindAlarm:
		return &Alarm{}, nil
	case KindLink:
		return &Link{}, nil
	}
	return nil, fmt.Errorf("%w: %q", ErrKind, k)
}
