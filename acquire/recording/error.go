package recording

import (
	"fmt"
	"strings"
)

// Error says what is wrong with a recording and where.
type Error struct {
	// Path is the file's path as given to Open.
	Path string
	// Line is the line of a CSV file, the header being line 1; 0 where no line
	// is to blame.
	Line int64
	// Column is the number of the CSV column, from 1; 0 where no column is to
	// blame.
	Column int
	// Name is the name of that column in the header.
	Name string
	// Reason says what was found and what is allowed.
	Reason string
	// Err is the fault of the operating system behind it, if there is one.
	Err error
}

// Error returns path, place and reason in one line.
func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString("cannot read recording ")
	b.WriteString(e.Path)
	if e.Line > 0 {
		fmt.Fprintf(&b, ": line %d", e.Line)
	}
	if e.Column > 0 {
		fmt.Fprintf(&b, ", column %d", e.Column)
		if e.Name != "" {
			fmt.Fprintf(&b, " (%s)", e.Name)
		}
	}
	b.WriteString(": ")
	b.WriteString(e.Reason)
	if e.Err != nil {
		fmt.Fprintf(&b, ": %v", e.Err)
	}
	return b.String()
}

// Unwrap returns the fault of the operating system, nil if there is none.
func (e *Error) Unwrap() error { return e.Err }

// clip quotes what was found in a file, short enough for one line of a message.
func clip(b []byte) string {
	const most = 32
	if len(b) > most {
		return fmt.Sprintf("%q...", b[:most])
	}
	return fmt.Sprintf("%q", b)
}
