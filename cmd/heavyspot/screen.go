package main

import (
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"unicode/utf8"

	"golang.org/x/term"
)

// screenWidth is the number of columns that output for people fits in.
const screenWidth = 80

// screen writes what people read: lines that stay, and one status line that is
// rewritten in place when standard error is a terminal. Control characters go
// only to a terminal and never when NO_COLOR is set. Its methods may be called
// by several goroutines.
type screen struct {
	out, talk io.Writer
	// live says that the status line can be rewritten.
	live bool
	mu   sync.Mutex
	// status is the line that stands there now.
	status string
}

func newScreen(out, talk io.Writer) *screen {
	return &screen{out: out, talk: talk, live: isTerminal(talk) && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"}
}

// isTerminal says whether w is a terminal.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// Write writes data to standard output, below which the status line goes on.
func (s *screen) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.wipe()
	n, err := s.out.Write(p)
	s.draw()
	return n, err
}

// say writes a line of talk to standard error.
func (s *screen) say(format string, args ...any) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.wipe()
	fmt.Fprintf(s.talk, format+"\n", args...)
	s.draw()
}

// show replaces the status line; without a terminal it does nothing.
func (s *screen) show(status string) {
	if !s.live {
		return
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.wipe()
	s.status = cutTo(status, screenWidth-1)
	s.draw()
}

func (s *screen) wipe() {
	if s.live && s.status != "" {
		io.WriteString(s.talk, "\r\x1b[K")
	}
}

func (s *screen) draw() {
	if s.live && s.status != "" {
		io.WriteString(s.talk, s.status)
	}
}

// cutTo cuts a text to a number of characters.
func cutTo(s string, n int) string {
	if utf8.RuneCountInString(s) <= n {
		return s
	}
	return string([]rune(s)[:n])
}

// wrap breaks a text into lines of at most screenWidth columns, the first after
// first and the others after as many blanks.
func wrap(first, text string) string {
	indent := strings.Repeat(" ", utf8.RuneCountInString(first))
	var b strings.Builder
	b.WriteString(first)
	for i, line := range fold(text, screenWidth-len(indent)) {
		if i > 0 {
			b.WriteString(indent)
		}
		b.WriteString(line)
		b.WriteByte('\n')
	}
	return b.String()
}

// fold breaks a text at blanks into lines of at most width characters; a longer
// word stays whole. It returns at least one line.
func fold(text string, width int) []string {
	var lines []string
	line, length := "", 0
	for _, word := range strings.Fields(text) {
		n := utf8.RuneCountInString(word)
		if length > 0 && length+1+n > width {
			lines = append(lines, line)
			line, length = "", 0
		}
		if length > 0 {
			line, length = line+" ", length+1
		}
		line, length = line+word, length+n
	}
	return append(lines, line)
}
