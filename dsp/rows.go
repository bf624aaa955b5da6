package dsp

// rows keeps the newest rows of samples, one after another in memory.
type rows struct {
	stride int
	base   int64 // sample index of the first row kept
	data   []float32
	keep   int // rows to keep when room is made
}

func newRows(stride, keep int) *rows {
	return &rows{stride: stride, keep: keep, data: make([]float32, 0, 3*keep*stride)}
}

// end returns the index after the last row.
func (b *rows) end() int64 { return b.base + int64(len(b.data)/b.stride) }

// restart drops all rows; the next row has the index at.
func (b *rows) restart(at int64) { b.base, b.data = at, b.data[:0] }

// push adds rows and drops the oldest beyond those to keep.
func (b *rows) push(volts []float32) {
	if len(b.data)+len(volts) > cap(b.data) {
		if drop := len(b.data) - b.keep*b.stride; drop > 0 {
			n := copy(b.data, b.data[drop:])
			b.data = b.data[:n]
			b.base += int64(drop / b.stride)
		}
	}
	b.data = append(b.data, volts...)
}

// value returns the sample of a channel; row must be kept.
func (b *rows) value(row int64, channel int) float64 {
	return float64(b.data[int(row-b.base)*b.stride+channel])
}

// from returns the samples from a row on; row must be kept.
func (b *rows) from(row int64) []float32 {
	return b.data[int(row-b.base)*b.stride:]
}
