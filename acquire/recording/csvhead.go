package recording

import (
	"bytes"
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"
)

// What a CSV column that is no channel holds.
const (
	ignoredColumn = -1 - iota
	timeColumn    // t_s
	clockColumn   // time
	causeColumn   // gap
)

// maxColumns bounds the width of a CSV file.
const maxColumns = 1024

// header is the first line of a CSV file.
type header struct {
	names []string
	// plan holds the channel of each column, or what else it is.
	plan     []int
	channels int
	has      uint64
}

// parseHeader reads the first line of a file. A column of 0 in the error means
// the whole line.
func parseHeader(line []byte) (*header, *Error) {
	line = bytes.TrimPrefix(line, []byte("\xef\xbb\xbf"))
	if reason := notHeader(line); reason != "" {
		return nil, &Error{Reason: reason}
	}
	h := &header{}
	column := map[string]int{}
	for i := 0; ; i++ {
		cell, next, reason := cutCell(line, 0)
		if reason == "" && i == maxColumns {
			reason = fmt.Sprintf("there are more than %d columns", maxColumns)
		}
		if reason != "" {
			return nil, &Error{Column: i + 1, Reason: reason}
		}
		name := string(cell)
		kind, reason := columnKind(name)
		if first, twice := column[name]; twice && name != "" {
			reason = fmt.Sprintf("column %d has the same name", first)
		}
		if reason != "" {
			return nil, &Error{Column: i + 1, Name: name, Reason: reason}
		}
		column[name] = i + 1
		h.add(name, kind)
		if next == len(line) {
			break
		}
		line = line[next+1:]
	}
	return h, h.check(column)
}

// add takes the next column.
func (h *header) add(name string, kind int) {
	h.names = append(h.names, name)
	h.plan = append(h.plan, kind)
	if kind >= 0 {
		h.has |= 1 << kind
		h.channels = max(h.channels, kind+1)
	}
}

// check returns an error if columns are missing.
func (h *header) check(column map[string]int) *Error {
	found := fmt.Sprintf("; the header names %s", clip([]byte(strings.Join(h.names, ","))))
	if column["t_s"] == 0 {
		return &Error{Reason: "there is no column t_s (seconds from the start)" + found}
	}
	if h.channels == 0 {
		return &Error{Reason: "there is no channel column (ch0, ch1 ... with volts)" + found}
	}
	return nil
}

// columnKind says what the column called name holds.
func columnKind(name string) (kind int, reason string) {
	switch name {
	case "t_s":
		return timeColumn, ""
	case "time":
		return clockColumn, ""
	case "gap":
		return causeColumn, ""
	}
	digits, ok := strings.CutPrefix(name, "ch")
	if !ok || digits == "" || !allDigits([]byte(digits)) {
		return ignoredColumn, ""
	}
	n, err := strconv.Atoi(digits)
	if err != nil || n >= MaxChannels {
		return 0, fmt.Sprintf("channels go from ch0 to ch%d", MaxChannels-1)
	}
	if strconv.Itoa(n) != digits {
		return 0, fmt.Sprintf("channel %d is written ch%d", n, n)
	}
	return n, ""
}

// notHeader says why line cannot be a header line.
func notHeader(line []byte) string {
	switch {
	case bytes.HasPrefix(line, []byte("\xff\xfe")), bytes.HasPrefix(line, []byte("\xfe\xff")):
		return "the text is UTF-16, save it as UTF-8"
	case !utf8.Valid(line), bytes.ContainsFunc(line, func(r rune) bool { return r < ' ' && r != '\t' }):
		return "it is neither CSV text nor a WAV file"
	case len(bytes.TrimSpace(line)) == 0:
		return "the header line is blank; it must name the columns t_s,ch0,ch1 ..."
	}
	if !bytes.Contains(line, []byte{','}) {
		for _, separator := range []string{";", "\t"} {
			if bytes.Contains(line, []byte(separator)) {
				return fmt.Sprintf("columns are separated by %q, allowed is a comma, with a point in numbers", separator)
			}
		}
	}
	first, _, _ := cutCell(line, 0)
	if _, ok := grammar(first); ok {
		return fmt.Sprintf("the header line is missing: the first line begins with the number %s instead of naming the columns t_s,ch0,ch1 ...", clip(first))
	}
	return ""
}

// cutCell returns the cell that starts at line[i], without the blanks and the
// quotes around it, and where it ends: at a comma or the end of the line.
// Quotes are those of RFC 4180; doubled quotes inside are left as they are.
func cutCell(line []byte, i int) (cell []byte, next int, reason string) {
	for i < len(line) && (line[i] == ' ' || line[i] == '\t') {
		i++
	}
	if i < len(line) && line[i] == '"' {
		return cutQuoted(line, i+1)
	}
	next = len(line)
	if n := bytes.IndexByte(line[i:], ','); n >= 0 {
		next = i + n
	}
	return bytes.TrimRight(line[i:next], " \t"), next, ""
}

// cutQuoted does the work of cutCell behind an opening quote.
func cutQuoted(line []byte, i int) (cell []byte, next int, reason string) {
	end := i
	for {
		n := bytes.IndexByte(line[end:], '"')
		if n < 0 {
			return nil, len(line), "a quote is opened and not closed on this line"
		}
		end += n
		if end+1 == len(line) || line[end+1] != '"' {
			break
		}
		end += 2
	}
	next = end + 1
	for next < len(line) && (line[next] == ' ' || line[next] == '\t') {
		next++
	}
	if next < len(line) && line[next] != ',' {
		return nil, next, "there is text behind a closing quote"
	}
	return bytes.Trim(line[i:end], " \t"), next, ""
}
