package buffer

import (
	"bytes"
	"compress/flate"
	"io"
	"sync"
)

// The messages of one kind differ little but in their numbers. Packed against a
// text that holds their keys they take about a quarter of the room, and as much
// less is written to the card.

// dictionary is part of the file's layout: a change of one letter makes the
// records of old files unreadable.
const dictionary = `"missing":"the machine has no point ","holds":false,"holds":true,"margin":-` +
	`{"test":"","measured":,"sd":,"unit":"deg","expected":" to ","unit":"mm/s rms","unit":"share","expected":"under ` +
	`{"schema":1,"kind":"alarm","site":"","machine":"","time":"2026-01-01T00:00:00.000Z","sequence":,"boot":,` +
	`"alarm":"high-overall","point":"","priority":"medium","state":"unacknowledged","state":"normal","condition":true,` +
	`"value":,"limit":,"unit":"mm/s rms","since":"2026-01-01T00:00:00.000Z","text":"vibration is over the alarm limit of ` +
	`{"schema":1,"kind":"finding","site":"","machine":"","time":"2026-01-01T00:00:00.000Z","sequence":,"boot":,` +
	`"verdict":"static-unbalance","verdict":"couple-unbalance","verdict":"dynamic-unbalance","verdict":"overhung-unbalance",` +
	`"verdict":"not-unbalance","verdict":"undetermined","verdict":"quiet",` +
	`"severity":{"standard":"iso-20816-3","standard":"iso-14694","level":"acceptable","level":"alarm","level":"good",` +
	`"worst_point":"nde-h","mm_s_rms":,"limit_mm_s_rms":},"suspects":[],"evidence":[],"advice":"balance; ` +
	`{"schema":1,"kind":"minute","site":"","machine":"","time":"2026-01-01T00:00:00.000Z","sequence":,"boot":,` +
	`"seconds":60,"coverage":1,"clock":"set","speed":{"state":"steady","mean_rpm":,"min_rpm":,"max_rpm":,"turns":,` +
	`"reference":"good"},"points":[{"point":"de-v","state":"good",{"point":"de-h","state":"good",{"point":"de-a","state":"good",` +
	`{"point":"nde-v","state":"good",{"point":"nde-h","state":"good",{"point":"nde-a","state":"good",` +
	`"order1":{"mm_s_rms":,"lag_deg":,"mm_s_rms_sd":0.0,"lag_deg_sd":0.},"order2":{"mm_s_rms":0.,"lag_deg":},` +
	`"order3":{"mm_s_rms":0.,"lag_deg":},"overall_mm_s_rms":,"order1_share":0.,"wander_deg":0.},` +
	`"neighbours":[{"rpm":,"points":[{"point":"","mm_s_rms":0.`

// longest bounds an unpacked message, bytes.
const longest = 1 << 20

// packer packs one message at a time; it is not safe for use by several
// goroutines at once.
type packer struct {
	w   *flate.Writer
	buf bytes.Buffer
}

func newPacker() (*packer, error) {
	w, err := flate.NewWriterDict(io.Discard, flate.DefaultCompression, []byte(dictionary))
	return &packer{w: w}, err
}

// pack returns the packed message, which is valid until the next call.
func (p *packer) pack(message []byte) []byte {
	p.buf.Reset()
	p.w.Reset(&p.buf)
	p.w.Write(message) // writing to a bytes.Buffer does not fail
	p.w.Close()
	return p.buf.Bytes()
}

var unpackers = sync.Pool{New: func() any { return flate.NewReaderDict(nil, nil) }}

// unpack is the reverse of pack.
func unpack(b []byte) ([]byte, error) {
	r := unpackers.Get().(io.Reader)
	defer unpackers.Put(r)
	if err := r.(flate.Resetter).Reset(bytes.NewReader(b), []byte(dictionary)); err != nil {
		return nil, err
	}
	out, err := io.ReadAll(io.LimitReader(r, longest+1))
	if err == nil && len(out) > longest {
		err = errRecord
	}
	return out, err
}
