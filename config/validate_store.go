package config

import (
	"fmt"
	"regexp"
)

// pathForm is the form of a file's name: no control characters, which would
// break messages and units.
var pathForm = form{regexp.MustCompile(`^[^\x00-\x1f\x7f]{1,1000}$`), "the name of a file, at most 1000 characters"}

// socketForm leaves room for the folder: Linux takes 107 bytes in all.
var socketForm = form{regexp.MustCompile(`^[!-~]{1,100}$`), "the name of a socket, at most 100 ASCII characters without spaces"}

func (c *checker) validateBuffer(b *Buffer) {
	s := c.section("buffer")
	s.text("path", optional, b.Path, pathForm)
	s.text("socket", optional, b.Socket, socketForm)
	s.whole("max_mb", optional, b.MaxMB, span{16, 900, "MB"})
	s.whole("keep_days", optional, b.KeepDays, span{1, 3650, "days"})
	s.whole("findings_keep_days", optional, b.FindingsKeepDays, span{1, 3650, "days"})
	if s.sound("path") && s.sound("socket") && b.Path == b.Socket {
		s.failAt("socket", fmt.Sprintf("must differ from path, %q", b.Path))
	}
}
