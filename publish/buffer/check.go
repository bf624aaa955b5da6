package buffer

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"hash/fnv"
	"io"
)

// The check reads the file's pages with plain reads before bbolt maps it into
// memory. bbolt's own check follows page numbers through the mapping, in a
// goroutine of its own: there a wrong number or a short file is a fault that
// ends the program. The layout is that of bbolt's file format version 2, in the
// byte order of the machine.

const (
	magic       = 0xED0CDAED
	fileVersion = 2
	pageHead    = 16
	elementHead = 16
	noFreelist  = 1<<64 - 1
	deepest     = 32 // levels of a tree; 2^32 pages of two keys each

	pageBranch   = 0x01
	pageLeaf     = 0x02
	pageFreelist = 0x10
	leafBucket   = 0x01
)

var native = binary.NativeEndian

// checker walks a file.
type checker struct {
	r        io.ReaderAt
	pageSize int64
	root     uint64
	freelist uint64
	high     uint64 // number of pages
	txid     uint64
	seen     []bool
}

// check reads every page in use and reports the first thing wrong with the
// structure of the file.
func check(r io.ReaderAt, size int64) error {
	c := &checker{r: r}
	if err := c.meta(size); err != nil {
		return err
	}
	if int64(c.high) > size/c.pageSize {
		return fmt.Errorf("file of %d bytes is cut off: must have %d", size, int64(c.high)*c.pageSize)
	}
	c.seen = make([]bool, c.high)
	c.seen[0], c.seen[1] = true, true
	if err := c.tree(c.root, nil, nil, 0); err != nil {
		return err
	}
	return c.free()
}

// meta finds the newer of the two meta pages that are whole. The second one
// lies at the page size, which only the first may know.
func (c *checker) meta(size int64) error {
	found := false
	for at := int64(0); at < min(size, 1<<17); at = max(2*at, 1024) {
		buf := make([]byte, pageHead+64)
		if _, err := c.r.ReadAt(buf, at); err != nil {
			break
		}
		m := buf[pageHead:]
		h := fnv.New64a()
		h.Write(m[:56])
		pageSize := int64(native.Uint32(m[8:]))
		if native.Uint32(m) != magic || native.Uint32(m[4:]) != fileVersion || h.Sum64() != native.Uint64(m[56:]) ||
			at != 0 && at != pageSize {
			continue
		}
		if txid := native.Uint64(m[48:]); !found || txid > c.txid {
			c.pageSize, c.txid = pageSize, txid
			c.root, c.freelist, c.high = native.Uint64(m[16:]), native.Uint64(m[32:]), native.Uint64(m[40:])
		}
		found = true
	}
	switch {
	case !found:
		return errors.New("neither meta page is whole")
	case c.pageSize < 1024 || c.pageSize > 1<<16 || c.high < 2 || c.high > 1<<40:
		return fmt.Errorf("meta page is wrong: %d pages of %d bytes", c.high, c.pageSize)
	}
	return nil
}

// read returns a page with its overflow, after checking that nothing else uses
// it, and its type and count.
func (c *checker) read(id uint64) (p []byte, flags uint16, n int, err error) {
	if id < 2 || id >= c.high {
		return nil, 0, 0, fmt.Errorf("page %d: must be from 2 to %d", id, c.high-1)
	}
	p = make([]byte, c.pageSize)
	if _, err := c.r.ReadAt(p, int64(id)*c.pageSize); err != nil {
		return nil, 0, 0, fmt.Errorf("page %d: cannot read: %v", id, err)
	}
	if got := native.Uint64(p); got != id {
		return nil, 0, 0, fmt.Errorf("page %d: says that it is page %d", id, got)
	}
	more := uint64(native.Uint32(p[12:]))
	if more >= c.high-id {
		return nil, 0, 0, fmt.Errorf("page %d: goes on for %d pages, past the end", id, more)
	}
	for i := id; i <= id+more; i++ {
		if c.seen[i] {
			return nil, 0, 0, fmt.Errorf("page %d: used twice", i)
		}
		c.seen[i] = true
	}
	if more > 0 {
		p = append(p, make([]byte, int64(more)*c.pageSize)...)
		if _, err := c.r.ReadAt(p[c.pageSize:], int64(id+1)*c.pageSize); err != nil {
			return nil, 0, 0, fmt.Errorf("page %d: cannot read: %v", id, err)
		}
	}
	return p, native.Uint16(p[8:]), int(native.Uint16(p[10:])), nil
}

// tree checks the tree below a page: all keys k must satisfy low <= k < high,
// where nil means no bound.
func (c *checker) tree(id uint64, low, high []byte, depth int) error {
	if depth > deepest {
		return fmt.Errorf("page %d: tree is deeper than %d", id, deepest)
	}
	p, flags, n, err := c.read(id)
	if err != nil {
		return err
	}
	switch flags {
	case pageBranch:
		return c.branch(id, p, n, low, high, depth)
	case pageLeaf:
		return c.leaf(id, p, n, low, high, depth)
	}
	return fmt.Errorf("page %d: type %#x: must be a branch or a leaf", id, flags)
}

// part cuts length bytes out of a page, at a position counted from an element.
// They must begin where those before them ended, at *end, as bbolt writes them:
// so a wrong length does not pass for a longer key.
func part(p []byte, element int, pos, length uint64, end *uint64) ([]byte, error) {
	from := uint64(element) + pos
	if from != *end || from+length > uint64(len(p)) {
		return nil, errors.New("is not where it should be")
	}
	*end = from + length
	return p[from:*end], nil
}

func word(b []byte) uint64 { return uint64(native.Uint32(b)) }

func (c *checker) branch(id uint64, p []byte, n int, low, high []byte, depth int) error {
	if n == 0 || pageHead+n*elementHead > len(p) {
		return fmt.Errorf("page %d: a branch of %d keys", id, n)
	}
	keys, ids := make([][]byte, n), make([]uint64, n)
	end := uint64(pageHead + n*elementHead)
	for i := range n {
		at := pageHead + i*elementHead
		k, err := part(p, at, word(p[at:]), word(p[at+4:]), &end)
		if err != nil {
			return fmt.Errorf("page %d: key %d %v", id, i, err)
		}
		keys[i], ids[i] = k, native.Uint64(p[at+8:])
	}
	if err := ordered(id, keys, low, high); err != nil {
		return err
	}
	for i := range n {
		upper := high
		if i+1 < n {
			upper = keys[i+1]
		}
		if err := c.tree(ids[i], keys[i], upper, depth+1); err != nil {
			return err
		}
	}
	return nil
}

func (c *checker) leaf(id uint64, p []byte, n int, low, high []byte, depth int) error {
	if pageHead+n*elementHead > len(p) {
		return fmt.Errorf("page %d: a leaf of %d keys", id, n)
	}
	keys := make([][]byte, n)
	end := uint64(pageHead + n*elementHead)
	for i := range n {
		at := pageHead + i*elementHead
		ksize := word(p[at+8:])
		k, err := part(p, at, word(p[at+4:]), ksize, &end)
		if err != nil {
			return fmt.Errorf("page %d: key %d %v", id, i, err)
		}
		v, err := part(p, at, word(p[at+4:])+ksize, word(p[at+12:]), &end)
		if err != nil {
			return fmt.Errorf("page %d: value %d %v", id, i, err)
		}
		keys[i] = k
		if native.Uint32(p[at:])&leafBucket != 0 {
			if err := c.bucket(id, v, depth); err != nil {
				return err
			}
		}
	}
	return ordered(id, keys, low, high)
}

// bucket checks a bucket's value: the number of its root page, or 0 and the
// page itself.
func (c *checker) bucket(id uint64, v []byte, depth int) error {
	if len(v) < 16 {
		return fmt.Errorf("page %d: a bucket of %d bytes", id, len(v))
	}
	if root := native.Uint64(v); root != 0 {
		return c.tree(root, nil, nil, depth+1)
	}
	inline := v[16:]
	if len(inline) < pageHead || native.Uint16(inline[8:]) != pageLeaf {
		return fmt.Errorf("page %d: a bucket within it is wrong", id)
	}
	return c.leaf(id, inline, int(native.Uint16(inline[10:])), nil, nil, depth+1)
}

func ordered(id uint64, keys [][]byte, low, high []byte) error {
	for i, k := range keys {
		if i > 0 && bytes.Compare(keys[i-1], k) >= 0 || low != nil && bytes.Compare(k, low) < 0 ||
			high != nil && bytes.Compare(k, high) >= 0 {
			return fmt.Errorf("page %d: key %d is out of order", id, i)
		}
	}
	return nil
}

// free checks that each page is in use or in the list of free pages, and none
// in both.
func (c *checker) free() error {
	if c.freelist == noFreelist {
		return nil
	}
	p, flags, n, err := c.read(c.freelist)
	if err != nil {
		return fmt.Errorf("list of free pages: %v", err)
	}
	ids := p[pageHead:]
	if n == 0xffff { // more than fit into the count; then the first is the count
		n, ids = int(min(native.Uint64(ids), c.high)), ids[8:]
	}
	if flags != pageFreelist || 8*n > len(ids) {
		return fmt.Errorf("list of free pages: type %#x, %d pages", flags, n)
	}
	for i := range n {
		id := native.Uint64(ids[8*i:])
		if id < 2 || id >= c.high || c.seen[id] {
			return fmt.Errorf("page %d: free and in use, or out of range", id)
		}
		c.seen[id] = true
	}
	for id, seen := range c.seen {
		if !seen {
			return fmt.Errorf("page %d: neither free nor in use", id)
		}
	}
	return nil
}
