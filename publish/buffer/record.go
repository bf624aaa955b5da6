package buffer

import (
	"encoding/binary"
	"errors"
	"hash/crc32"
	"strings"
	"time"

	"heavyspot/publish"
)

// Record is a stored message.
type Record struct {
	Sequence uint64
	Kind     publish.Kind
	// Time is the message's own time, UTC, whole milliseconds.
	Time time.Time
	// ClockSet says whether the wall clock was set then.
	ClockSet bool
	// Retained says whether a broker keeps the newest of its topic.
	Retained bool
	// Levels are the levels of its topic below the machine.
	Levels []string
	// JSON is the message.
	JSON []byte
}

// A record's value: CRC-32C of what follows (4 bytes), time in ms since 1970
// (8), flags (1), length of the levels (2), levels joined by "/", JSON. bbolt
// has no checksum over data, and a message must not leave damaged.
const recordHead = 4 + 8 + 1 + 2

const (
	flagClockSet = 1 << iota
	flagRetained
)

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

var errRecord = errors.New("buffer: record is damaged")

func (r *Record) encode() []byte {
	levels := strings.Join(r.Levels, "/")
	b := make([]byte, 4, recordHead+len(levels)+len(r.JSON))
	b = binary.BigEndian.AppendUint64(b, uint64(r.Time.UnixMilli()))
	var flags byte
	if r.ClockSet {
		flags |= flagClockSet
	}
	if r.Retained {
		flags |= flagRetained
	}
	b = append(b, flags)
	b = binary.BigEndian.AppendUint16(b, uint16(len(levels)))
	b = append(b, levels...)
	b = append(b, r.JSON...)
	binary.BigEndian.PutUint32(b, crc32.Checksum(b[4:], castagnoli))
	return b
}

// decode reads a record's value, copying what it keeps.
func decode(kind publish.Kind, key, value []byte) (Record, error) {
	at, set, err := peek(value)
	if err != nil || len(key) != 8 {
		return Record{}, errRecord
	}
	if crc32.Checksum(value[4:], castagnoli) != binary.BigEndian.Uint32(value) {
		return Record{}, errRecord
	}
	n := int(binary.BigEndian.Uint16(value[13:]))
	if recordHead+n > len(value) {
		return Record{}, errRecord
	}
	return Record{
		Sequence: binary.BigEndian.Uint64(key), Kind: kind,
		Time: time.UnixMilli(at).UTC(), ClockSet: set, Retained: value[12]&flagRetained != 0,
		Levels: strings.Split(string(value[recordHead:recordHead+n]), "/"),
		JSON:   append([]byte(nil), value[recordHead+n:]...),
	}, nil
}

// peek returns a record's time in ms since 1970 without checking the rest.
func peek(value []byte) (ms int64, clockSet bool, err error) {
	if len(value) < recordHead {
		return 0, false, errRecord
	}
	return int64(binary.BigEndian.Uint64(value[4:])), value[12]&flagClockSet != 0, nil
}

func key(sequence uint64) []byte { return binary.BigEndian.AppendUint64(nil, sequence) }

func number(b []byte) uint64 {
	if len(b) < 8 {
		return 0
	}
	return binary.BigEndian.Uint64(b)
}
