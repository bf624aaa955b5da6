package recording

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"time"

	"heavyspot/acquire"
)

const (
	// maxLine is the longest line of a CSV file, bytes.
	maxLine = 1 << 20
	// minBuffer is the size of the buffer for a small file, bytes.
	minBuffer = 32 << 10
	// aheadRows is how many rows the rate is taken from.
	aheadRows = 4096
)

// csvReader reads the rows of a CSV file into blocks.
type csvReader struct {
	header
	path string
	in   *bufio.Reader
	read int64
	line int64
	// unended is set by the last line when it lacks its line feed.
	unended bool

	base      timebase
	clock     clock
	fileClock bool
	perBlock  int

	row  rowInfo
	held []float32
	// waiting says that held and row are the first row of the next block.
	waiting bool
	// next is the index of the next row, lost rows included.
	next int64
	err  error
}

// rowInfo is what a row holds besides its volts.
type rowInfo struct {
	t     number
	clock time.Time
	cause acquire.Cause
	// estimated says that the gap column calls the gap's length estimated.
	estimated bool
	gap       acquire.Gap
	// wasClocked says that the row before had a wall time as well.
	wasClocked bool
}

// openCSV reads the header and enough rows to know the rate.
func (s *Source) openCSV(r io.ReadSeeker, size int64, o Options) error {
	// A line must fit into the buffer, and none is longer than the file.
	buffer := max(minBuffer, min(maxLine, size+1))
	c := &csvReader{path: s.path, in: bufio.NewReaderSize(r, int(buffer))}
	line, err := c.readLine()
	if err != nil {
		return c.named(err)
	}
	h, fault := parseHeader(line)
	if fault != nil {
		fault.Path, fault.Line = s.path, 1
		return fault
	}
	c.header = *h
	if c.has, err = o.use(s.path, h.has); err != nil {
		return err
	}
	for i, kind := range c.plan {
		if kind >= 0 && c.has>>kind&1 == 0 {
			c.plan[i] = ignoredColumn
		}
	}
	c.held = make([]float32, c.channels)
	start := c.read
	hz, err := c.findRate(o)
	if err != nil {
		return err
	}
	if _, err := r.Seek(start, io.SeekStart); err != nil {
		return &Error{Path: s.path, Reason: "reading failed", Err: err}
	}
	c.in.Reset(r)
	c.read, c.line, c.unended, c.row = start, 1, false, rowInfo{}
	c.clock = clock{rateHz: hz, at: o.Start}
	c.fileClock = o.Start.IsZero()
	c.perBlock = o.blockRows(hz, c.channels)
	s.format = acquire.Format{RateHz: hz, Channels: c.channels}
	s.has = c.has
	s.blocks = c
	return nil
}

// findRate reads rows ahead and sets the time base. A fault behind the second
// row is left to be found again by readBlock.
func (c *csvReader) findRate(o Options) (float64, error) {
	times := make([]number, 0, aheadRows)
	for len(times) < aheadRows {
		err := c.nextRow(c.held)
		if err != nil && len(times) < 2 && err != io.EOF {
			return 0, err
		}
		if err != nil {
			break
		}
		times = append(times, c.row.t)
	}
	switch len(times) {
	case 0:
		return 0, &Error{Path: c.path, Reason: "there is a header line and no row of data"}
	case 1:
		if o.ExpectRateHz == 0 {
			return 0, &Error{Path: c.path, Reason: "there is only one row, the rate cannot be found"}
		}
		c.base.step = 1 / o.ExpectRateHz
		return o.ExpectRateHz, nil
	}
	hz, row, reason := c.base.findStep(times, o.ExpectRateHz)
	if reason != "" {
		// Behind the header no line but a row comes ahead of a row.
		c.line = int64(row) + 2
		return 0, c.fail(slices.Index(c.plan, timeColumn), reason)
	}
	return hz, o.checkRate(c.path, hz)
}

// consumed returns the bytes read so far.
func (c *csvReader) consumed() int64 { return c.read }

// readBlock fills b up to the next hole or wall time, a full block at most.
func (c *csvReader) readBlock(b *acquire.Block) error {
	b.Volts = b.Volts[:0]
	b.Gap = acquire.Gap{}
	if c.waiting {
		c.waiting = false
		b.Volts = append(b.Volts, c.held...)
		c.begin(b)
	}
	for c.err == nil && len(b.Volts) < c.perBlock*c.channels {
		n := len(b.Volts)
		b.Volts = slices.Grow(b.Volts, c.channels)[:n+c.channels]
		if c.err = c.nextTimed(b.Volts[n:]); c.err != nil {
			b.Volts = b.Volts[:n]
			break
		}
		if n > 0 && c.breaks() {
			copy(c.held, b.Volts[n:])
			b.Volts = b.Volts[:n]
			c.waiting = true
			break
		}
		if n == 0 {
			c.begin(b)
		} else {
			c.count()
		}
	}
	if len(b.Volts) == 0 {
		return c.err
	}
	return nil
}

// breaks says whether the last row must begin a block: behind a hole, and
// where a wall time stands alone, as the writer puts it at each block.
func (c *csvReader) breaks() bool {
	return c.row.gap.Lost > 0 || c.fileClock && !c.row.clock.IsZero() && !c.row.wasClocked
}

// begin makes the last row the first of b.
func (c *csvReader) begin(b *acquire.Block) {
	c.count()
	b.First = c.next - 1
	b.Gap = c.row.gap
	c.clock.stamp(b)
}

// count gives the last row its index.
func (c *csvReader) count() {
	c.next += c.row.gap.Lost
	if c.fileClock && !c.row.clock.IsZero() {
		c.clock.at, c.clock.row = c.row.clock, c.next
	}
	c.next++
}

// nextTimed reads the next row and checks its time.
func (c *csvReader) nextTimed(out []float32) error {
	if err := c.nextRow(out); err != nil {
		return err
	}
	lost, exact, reason := c.base.follow(c.row.t)
	if reason != "" {
		return c.fail(slices.Index(c.plan, timeColumn), reason)
	}
	c.row.gap = acquire.Gap{}
	if lost > 0 {
		c.row.gap = acquire.Gap{Lost: lost, Exact: exact && !c.row.estimated, Cause: c.row.cause}
	}
	return nil
}

// nextRow reads the next row into out and c.row. It returns io.EOF behind the
// last row.
func (c *csvReader) nextRow(out []float32) error {
	line, err := c.readLine()
	if err == nil && len(bytes.TrimSpace(line)) == 0 {
		err = c.blankLine()
	}
	if err != nil {
		return c.named(err)
	}
	if c.has != 1<<c.channels-1 {
		clear(out)
	}
	return c.parseRow(line, out)
}

// blankLine allows blank lines at the end of the file.
func (c *csvReader) blankLine() error {
	blank := c.line
	for {
		line, err := c.readLine()
		if err != nil {
			return err
		}
		if len(bytes.TrimSpace(line)) > 0 {
			c.line = blank
			return &Error{Path: c.path, Line: blank, Reason: "the line is blank, and rows follow"}
		}
	}
}

// readLine returns the next line without its end; it is valid until the next
// call.
func (c *csvReader) readLine() ([]byte, error) {
	line, err := c.in.ReadSlice('\n')
	c.read += int64(len(line))
	if err == io.EOF && len(line) == 0 {
		return nil, io.EOF
	}
	c.line++
	c.unended = err == io.EOF
	if err != nil && err != io.EOF {
		return nil, err
	}
	line = bytes.TrimSuffix(line, []byte{'\n'})
	return bytes.TrimSuffix(line, []byte{'\r'}), nil
}

// named makes an *Error of a fault of reading; io.EOF stays what it is once
// there is a header.
func (c *csvReader) named(err error) error {
	fault := new(Error)
	switch {
	case errors.As(err, &fault), err == io.EOF:
		return err
	case errors.Is(err, bufio.ErrBufferFull):
		return &Error{Path: c.path, Line: c.line, Reason: fmt.Sprintf("the line is longer than %d bytes", maxLine)}
	}
	return &Error{Path: c.path, Line: c.line, Reason: "reading failed", Err: err}
}

// parseRow reads the cells of line. Volts are what a float64 of the cell's
// value rounds to.
func (c *csvReader) parseRow(line []byte, out []float32) error {
	c.row.wasClocked = !c.row.clock.IsZero()
	c.row.clock, c.row.cause, c.row.estimated = time.Time{}, acquire.Absent, false
	i, last := 0, len(c.plan)-1
	for column, kind := range c.plan {
		n, next, ok := number{}, i, false
		if kind >= 0 || kind == timeColumn {
			n, next, ok = scanPlain(line, i)
		}
		if !ok {
			var reason string
			if n, next, reason = c.otherCell(line, i, kind); reason != "" {
				return c.failCell(column, next == len(line), reason)
			}
		}
		switch {
		case kind >= 0:
			v := float32(n.value)
			if v-v != 0 {
				return c.fail(column, fmt.Sprintf("%s V is more than a recording can hold (%.3g V)", clip(line[i:next]), math.MaxFloat32))
			}
			out[kind] = v
		case kind == timeColumn:
			if !(math.Abs(n.value) <= maxTime) {
				return c.fail(column, fmt.Sprintf("the time %g s is out of range, allowed is up to %g s", n.value, maxTime))
			}
			c.row.t = n
		}
		i = next
		if i == len(line) {
			if column == last {
				return nil
			}
			break
		}
		i++
	}
	return c.ragged(line)
}

// otherCell reads the cell at line[i] when it is not a plain number.
func (c *csvReader) otherCell(line []byte, i, kind int) (n number, next int, reason string) {
	cell, next, reason := cutCell(line, i)
	if reason != "" {
		return n, next, reason
	}
	switch kind {
	case clockColumn:
		if len(cell) > 0 && c.row.clock.UnmarshalText(cell) != nil {
			c.row.clock = time.Time{}
		}
	case causeColumn:
		if len(cell) > 0 {
			c.row.cause, c.row.estimated = parseCause(cell)
		}
	case ignoredColumn:
	default:
		n, reason = parseNumber(cell)
	}
	return n, next, reason
}

// fail returns an error in the last line read; column counts from 0.
func (c *csvReader) fail(column int, reason string) error {
	return &Error{Path: c.path, Line: c.line, Column: column + 1, Name: c.names[column], Reason: reason}
}

// failCell does what fail does for a cell that may be cut off by the end of
// the file.
func (c *csvReader) failCell(column int, atEnd bool, reason string) error {
	if atEnd && c.unended {
		reason = "the last line is cut off: " + reason
	}
	return c.fail(column, reason)
}

// ragged returns the error for a line with too many or too few cells.
func (c *csvReader) ragged(line []byte) error {
	cells := 0
	for i := 0; ; i++ {
		cells++
		_, next, _ := cutCell(line, i)
		next += max(0, bytes.IndexByte(line[next:], ','))
		if next == len(line) || line[next] != ',' {
			break
		}
		i = next
	}
	want := len(c.plan)
	reason := fmt.Sprintf("the line has %d cells, the header %d", cells, want)
	switch {
	case cells < want:
		return c.failCell(cells, true, reason)
	case cells >= 2*want-1:
		reason += "; are the decimals written with a comma?"
	}
	return &Error{Path: c.path, Line: c.line, Reason: reason}
}
