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
	// Boot is the number of the start that stored it.
	Boot uint64
	Kind publish.Kind
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

// A record's value, big-endian. bbolt has no checksum over data, and a message
// must not leave damaged; the mark and the numbers let a new file go on from a
// damaged one.
const (
	atMark     = 0  // recordMark
	atSum      = 4  // CRC-32C of all that follows
	atSequence = 8  // 8 bytes
	atBoot     = 16 // 8 bytes
	atTime     = 24 // ms since 1970, 8 bytes
	atFlags    = 32 // 1 byte
	atLevels   = 33 // length of the levels, joined by "/", 2 bytes
	atBody     = 35 // length of the packed JSON, 4 bytes
	recordHead = 39 // then levels, then the packed JSON
)

const recordMark = "\xf5rec"

const (
	flagClockSet = 1 << iota
	flagRetained
)

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

var errRecord = errors.New("buffer: record is damaged")

// encode returns the record's value; p packs the JSON.
func (r *Record) encode(p *packer) []byte {
	levels := strings.Join(r.Levels, "/")
	body := p.pack(r.JSON)
	b := make([]byte, recordHead, recordHead+len(levels)+len(body))
	copy(b[atMark:], recordMark)
	binary.BigEndian.PutUint64(b[atSequence:], r.Sequence)
	binary.BigEndian.PutUint64(b[atBoot:], r.Boot)
	binary.BigEndian.PutUint64(b[atTime:], uint64(r.Time.UnixMilli()))
	if r.ClockSet {
		b[atFlags] |= flagClockSet
	}
	if r.Retained {
		b[atFlags] |= flagRetained
	}
	binary.BigEndian.PutUint16(b[atLevels:], uint16(len(levels)))
	binary.BigEndian.PutUint32(b[atBody:], uint32(len(body)))
	b = append(append(b, levels...), body...)
	binary.BigEndian.PutUint32(b[atSum:], crc32.Checksum(b[atSequence:], castagnoli))
	return b
}

// whole returns the record that begins a slice, cut to its length, if its
// checksum is right.
func whole(b []byte) ([]byte, bool) {
	if len(b) < recordHead || string(b[:atSum]) != recordMark {
		return nil, false
	}
	n := recordHead + uint64(binary.BigEndian.Uint16(b[atLevels:])) + uint64(binary.BigEndian.Uint32(b[atBody:]))
	if n > uint64(len(b)) {
		return nil, false
	}
	b = b[:n]
	return b, crc32.Checksum(b[atSequence:], castagnoli) == binary.BigEndian.Uint32(b[atSum:])
}

// decode reads the value of the record with a sequence number, copying what it
// keeps.
func decode(kind publish.Kind, sequence uint64, value []byte) (Record, error) {
	b, ok := whole(value)
	if !ok || len(b) != len(value) || number(b[atSequence:]) != sequence {
		return Record{}, errRecord
	}
	levels := recordHead + int(binary.BigEndian.Uint16(b[atLevels:]))
	body, err := unpack(b[levels:])
	if err != nil {
		return Record{}, errRecord
	}
	at, set, _ := peek(b)
	return Record{
		Sequence: sequence, Boot: number(b[atBoot:]), Kind: kind,
		Time: time.UnixMilli(at).UTC(), ClockSet: set, Retained: b[atFlags]&flagRetained != 0,
		Levels: strings.Split(string(b[recordHead:levels]), "/"),
		JSON:   body,
	}, nil
}

// peek returns a record's time in ms since 1970 without checking the rest.
func peek(value []byte) (ms int64, clockSet bool, err error) {
	if len(value) < recordHead {
		return 0, false, errRecord
	}
	return int64(binary.BigEndian.Uint64(value[atTime:])), value[atFlags]&flagClockSet != 0, nil
}

func key(sequence uint64) []byte { return binary.BigEndian.AppendUint64(nil, sequence) }

func number(b []byte) uint64 {
	if len(b) < 8 {
		return 0
	}
	return binary.BigEndian.Uint64(b)
}
