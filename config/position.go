package config

import (
	"fmt"
	"sort"
	"strconv"
	"strings"
	"unicode"

	"github.com/pelletier/go-toml/v2/unstable"
)

// origin is where the keys of a file stand.
type origin struct {
	// file is the file's name as it was given.
	file string
	// places holds the place of every key and table by its path.
	places map[string]place
}

// place is where a key or a table's header stands and what was written.
type place struct {
	line int
	// value is the text right of the equals sign; empty for a header.
	value string
}

// line returns the line of a path, or of the nearest table around it, or 1.
func (o origin) line(path string) int {
	for path != "" {
		if p, ok := o.places[path]; ok {
			return p.line
		}
		path = path[:max(0, strings.LastIndexAny(path, ".["))]
	}
	return 1
}

// deepest is the number of keys in the longest path that means anything; what
// is nested deeper belongs to an unknown key above it.
const deepest = 3

// locator walks the syntax tree of a file and notes places.
type locator struct {
	places map[string]place
	parser unstable.Parser
	starts []int
	// counts holds the number of elements of each list of tables so far.
	counts map[string]int
}

// locate returns the places of all keys in data, which must be valid TOML.
func locate(data []byte) map[string]place {
	l := &locator{places: map[string]place{}, counts: map[string]int{}, starts: []int{0}}
	for i, c := range data {
		if c == '\n' {
			l.starts = append(l.starts, i+1)
		}
	}
	l.parser.Reset(data)
	table := ""
	for l.parser.NextExpression() {
		switch n := l.parser.Expression(); n.Kind {
		case unstable.Table:
			table = l.header(n.Key(), false)
		case unstable.ArrayTable:
			table = l.header(n.Key(), true)
		case unstable.KeyValue:
			l.keyValue(table, n, 0)
		}
	}
	return l.places
}

// header notes a table's header and returns its path.
func (l *locator) header(keys unstable.Iterator, list bool) string {
	path := ""
	for depth := 0; keys.Next() && depth < deepest; depth++ {
		k := keys.Node()
		path = join(path, string(k.Data))
		if keys.IsLast() && list {
			l.counts[path]++
		}
		l.note(path, k.Raw, "")
		if n := l.counts[path]; n > 0 {
			path += index(n - 1)
			l.note(path, k.Raw, "")
		}
	}
	return path
}

// keyValue notes a key of a table, and those inside its value.
func (l *locator) keyValue(table string, n *unstable.Node, depth int) {
	path := table
	for keys := n.Key(); keys.Next(); depth++ {
		if depth == deepest {
			return
		}
		k := keys.Node()
		path = join(path, string(k.Data))
		if !keys.IsLast() {
			l.note(path, k.Raw, "")
			continue
		}
		from, to := k.Raw.Offset+k.Raw.Length, n.Raw.Offset+n.Raw.Length
		_, text, _ := strings.Cut(string(l.parser.Data()[from:to]), "=")
		l.note(path, k.Raw, strings.TrimSpace(text))
		l.inside(path, n.Value(), k.Raw, depth+1)
	}
}

// inside notes what a list or an inline table holds.
func (l *locator) inside(path string, n *unstable.Node, at unstable.Range, depth int) {
	if depth == deepest {
		return
	}
	children := n.Children()
	switch n.Kind {
	case unstable.InlineTable:
		for children.Next() {
			l.keyValue(path, children.Node(), depth)
		}
	case unstable.Array:
		for i := 0; children.Next(); i++ {
			element, where, text := path+index(i), at, ""
			child := children.Node()
			if child.Raw.Length > 0 {
				where, text = child.Raw, string(l.parser.Raw(child.Raw))
			}
			l.note(element, where, text)
			l.inside(element, child, where, depth+1)
		}
	}
}

// note keeps the first place of a path.
func (l *locator) note(path string, at unstable.Range, value string) {
	if _, ok := l.places[path]; !ok {
		line := sort.SearchInts(l.starts, int(at.Offset)+1)
		l.places[path] = place{line: line, value: shorten(value)}
	}
}

// join returns the path of a key in a table; an empty table is the file itself.
// Keys that need quotes in TOML are shown in quotes.
func join(table, key string) string {
	if strings.IndexFunc(key, notBare) >= 0 || key == "" {
		key = strconv.Quote(key)
	}
	key = shorten(key)
	if table == "" {
		return key
	}
	return table + "." + key
}

func notBare(r rune) bool {
	return r != '_' && r != '-' && !('a' <= r && r <= 'z') && !('A' <= r && r <= 'Z') && !('0' <= r && r <= '9')
}

func index(i int) string { return fmt.Sprintf("[%d]", i) }

// shorten makes a text fit for one line of a message.
func shorten(s string) string {
	const most = 60
	runes := []rune(s)
	if len(runes) > most {
		runes = append(runes[:most-3], '.', '.', '.')
	}
	for i, r := range runes {
		if !unicode.IsPrint(r) {
			runes[i] = ' '
		}
	}
	return string(runes)
}
