package buffer

import (
	"bytes"
	"io"
	"strconv"
)

// count is where the numbers of a new file go on from.
type count struct{ sequence, boot uint64 }

// skipped is added to the highest sequence number found in a damaged file: the
// newest may have been lost with the damage, and a number must not be used
// twice, since receivers drop repeats. They see the gap.
const skipped = 10_000

// most bounds the numbers believed from a damaged file: half of what a JSON
// reader with 53-bit numbers can hold.
const most = 1 << 52

// salvage searches the bytes of a damaged file for the highest numbers in any
// message's envelope. It returns zeros when there are none.
func salvage(r io.ReaderAt) count {
	var c count
	const piece, overlap = 1 << 20, 128
	buf := make([]byte, piece+overlap)
	for at := int64(0); ; at += piece {
		n, err := r.ReadAt(buf, at)
		c.scan(buf[:n])
		if err != nil {
			break
		}
	}
	if c.sequence > 0 {
		c.sequence += skipped
	}
	return c
}

func (c *count) scan(b []byte) {
	const first, second = `"sequence":`, `,"boot":`
	for {
		i := bytes.Index(b, []byte(first))
		if i < 0 {
			return
		}
		b = b[i+len(first):]
		sequence, rest := digits(b)
		if !bytes.HasPrefix(rest, []byte(second)) {
			continue
		}
		boot, rest := digits(rest[len(second):])
		if len(rest) == 0 || rest[0] != ',' || sequence > most || boot > most {
			continue
		}
		c.sequence, c.boot = max(c.sequence, sequence), max(c.boot, boot)
	}
}

// digits reads the number at the start of b; it is over most when there is none.
func digits(b []byte) (uint64, []byte) {
	n := 0
	for n < len(b) && b[n] >= '0' && b[n] <= '9' {
		n++
	}
	v, err := strconv.ParseUint(string(b[:n]), 10, 64)
	if err != nil {
		v = most + 1
	}
	return v, b[n:]
}
