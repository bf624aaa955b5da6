package main

import (
	"io"

	"heavyspot/config"
	"heavyspot/publish"
)

// messages makes the messages of a tick in the order in which they are
// published; sequence and boot are left to who counts them.
func (t *tick) messages(m *config.Machine) []publish.Message {
	list := make([]publish.Message, 0, 2+len(t.Events))
	list = append(list, publish.MinuteMessage(&t.Minute))
	if t.Finding != nil {
		list = append(list, publish.FindingMessage(t.Finding))
	}
	for i := range t.Events {
		list = append(list, publish.AlarmMessage(&t.Events[i]))
	}
	for _, msg := range list {
		head := msg.Head()
		head.Site, head.Machine = m.Site, m.Name
	}
	return list
}

// jsonSink prints messages as JSON Lines. It numbers them from 1, with boot 0:
// a replay is no start of the daemon, and the same recording prints the same.
type jsonSink struct {
	machine  *config.Machine
	out      io.Writer
	sequence uint64
}

func (s *jsonSink) take(t *tick) error {
	for _, m := range t.messages(s.machine) {
		s.sequence++
		m.Head().Sequence = s.sequence
		if err := printMessage(s.out, m); err != nil {
			return err
		}
	}
	return nil
}

// printMessage prints one message as one line.
func printMessage(out io.Writer, m publish.Message) error {
	line, err := publish.Encode(m)
	if err != nil {
		return err
	}
	_, err = out.Write(append(line, '\n'))
	return err
}
