package buffer

import (
	"bytes"
	"io"
)

// count is where the numbers of a new file go on from.
type count struct{ sequence, boot uint64 }

// skipped is added to the highest sequence number found in a damaged file: the
// newest may have been lost with the damage, and a number must not be used
// twice, since receivers drop repeats. They see the gap.
const skipped = 10_000

// salvage searches the bytes of a damaged file for the highest numbers in any
// record that is whole. It returns zeros when there is none.
func salvage(r io.ReaderAt) count {
	var c count
	const piece, overlap = 1 << 20, 1 << 16
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
	for {
		i := bytes.Index(b, []byte(recordMark))
		if i < 0 {
			return
		}
		b = b[i:]
		if r, ok := whole(b); ok {
			c.sequence, c.boot = max(c.sequence, number(r[atSequence:])), max(c.boot, number(r[atBoot:]))
		}
		b = b[len(recordMark):]
	}
}
