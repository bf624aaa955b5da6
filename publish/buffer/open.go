package buffer

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime/debug"
	"sync"
	"sync/atomic"
	"syscall"
	"time"

	"go.etcd.io/bbolt"
	berrors "go.etcd.io/bbolt/errors"
)

// Buffer is an open file. Its methods may be called by several goroutines.
type Buffer struct {
	opt    Options
	db     *bbolt.DB
	opened Opened
	// writing serialises the writers, so that the counts below belong to the
	// last commit.
	writing  sync.Mutex
	packer   *packer
	sequence atomic.Uint64
	waiting  atomic.Int64 // messages in the outbox
	damaged  atomic.Int64 // records found damaged
	changed  chan struct{}
}

// Opened tells what Open met.
type Opened struct {
	// SetAside is the name that a damaged file was given, empty if none was.
	SetAside string
	// Why says what was wrong with it.
	Why string
	// Boot is the number of this start, Sequence that of the last message.
	Boot, Sequence uint64
}

// Open opens the file at path, or makes it. It checks the whole file first; a
// damaged one, or one of another layout, is renamed to path.corrupt-TIME and
// a new one begun, whose numbers go on above those that can be read in the old
// one. ErrHeld (to be tested with errors.Is) means that another process holds
// the file.
func Open(path string, opt Options) (*Buffer, error) {
	fail := func(err error) (*Buffer, error) {
		return nil, fmt.Errorf("buffer: cannot open %s: %w", path, err)
	}
	if err := opt.fill(); err != nil {
		return fail(err)
	}
	b, err := open(path, opt, count{})
	var damage *damageError
	if err == nil || opt.ReadOnly || !errors.As(err, &damage) {
		if err != nil {
			return fail(err)
		}
		return b, nil
	}
	aside, from, err := setAside(path, damage.from)
	if err != nil {
		return fail(fmt.Errorf("%v; it cannot be set aside: %w", damage, err))
	}
	if b, err = open(path, opt, from); err != nil {
		return fail(err)
	}
	b.opened.SetAside, b.opened.Why = aside, damage.why.Error()
	return b, nil
}

// damageError says that a file must be set aside.
type damageError struct {
	why error
	// from is the locked file, still open.
	from *os.File
}

func (e *damageError) Error() string { return "file is damaged: " + e.why.Error() }

func open(path string, opt Options, from count) (*Buffer, error) {
	f, err := lock(path, &opt)
	if err != nil {
		return nil, err
	}
	size, err := f.Seek(0, io.SeekEnd)
	if err != nil {
		f.Close()
		return nil, err
	}
	if size > 0 || opt.ReadOnly {
		if err := check(f, size); err != nil {
			return nil, refuse(f, &opt, err)
		}
	}
	b := &Buffer{opt: opt, changed: make(chan struct{}, 1)}
	if b.packer, err = newPacker(); err != nil {
		f.Close()
		return nil, err
	}
	if err := guard(func() error { return b.start(path, f, from, size) }); err != nil {
		if damaging(err) {
			// f must stay locked until the file is set aside, and closing the
			// database would close it; the mapping is given up instead.
			return nil, refuse(f, &opt, err)
		}
		if b.db != nil {
			b.db.Close()
		}
		f.Close()
		return nil, err
	}
	return b, nil
}

func damaging(err error) bool {
	for _, e := range []error{ErrDamaged, errLayout, berrors.ErrInvalid, berrors.ErrVersionMismatch, berrors.ErrChecksum} {
		if errors.Is(err, e) {
			return true
		}
	}
	return false
}

func refuse(f *os.File, opt *Options, err error) error {
	if opt.ReadOnly {
		f.Close()
		return fmt.Errorf("file is damaged: %w", err)
	}
	return &damageError{why: err, from: f}
}

// start hands the locked file to bbolt and reads what must be known.
func (b *Buffer) start(path string, f *os.File, from count, size int64) error {
	o := &bbolt.Options{
		Timeout:      b.opt.Timeout,
		FreelistType: bbolt.FreelistMapType,
		ReadOnly:     b.opt.ReadOnly,
		MaxSize:      int(b.opt.MaxSize),
		// The lock belongs to the open file, which was checked under it.
		OpenFile: func(string, int, fs.FileMode) (*os.File, error) { return f, nil },
	}
	if ^uint(0)>>32 != 0 {
		// With room to grow the mapping never moves, and a reader never holds up
		// the writer. A 32-bit address space is too small for that.
		o.InitialMmapSize = int(b.opt.MaxSize)
	}
	var err error
	if b.db, err = bbolt.Open(path, 0o640, o); err != nil {
		b.db = nil
		return err
	}
	b.db.AllocSize = growStep
	if b.opt.ReadOnly {
		return b.db.View(func(tx *bbolt.Tx) error {
			if err := checkLayout(tx); err != nil {
				return err
			}
			return b.load(tx)
		})
	}
	if size > b.opt.MaxSize {
		// The limit was lowered and the file cannot shrink. Without room for a
		// few pages not even a deletion could be written.
		b.db.MaxSize = int(size) + 4*growStep
	}
	if err := b.commit(func(tx *bbolt.Tx) error { return prepare(tx, from) }); err != nil {
		return err
	}
	return b.db.View(b.load)
}

// load reads the counts.
func (b *Buffer) load(tx *bbolt.Tx) error {
	meta := tx.Bucket(bucketMeta)
	b.opened.Boot, b.opened.Sequence = number(meta.Get(keyBoot)), number(meta.Get(keySequence))
	b.sequence.Store(b.opened.Sequence)
	n := int64(0)
	c := tx.Bucket(bucketOutbox).Cursor()
	for k, _ := c.First(); k != nil; k, _ = c.Next() {
		n++
	}
	b.waiting.Store(n)
	return nil
}

// Opened tells what Open met.
func (b *Buffer) Opened() Opened { return b.opened }

// Close lets go of the file. Calls after it return an error.
func (b *Buffer) Close() error {
	b.writing.Lock()
	defer b.writing.Unlock()
	return guard(b.db.Close)
}

// guard runs what touches the mapped file. Damage shows there as a panic or, as
// with an unreadable sector, as a fault; both become errors.
func guard(f func() error) (err error) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("%w: %v", ErrDamaged, r)
		}
	}()
	return f()
}

// lock opens the file and takes the lock that bbolt uses.
func lock(path string, opt *Options) (*os.File, error) {
	flag, how := os.O_RDWR|os.O_CREATE, syscall.LOCK_EX
	if opt.ReadOnly {
		flag, how = os.O_RDONLY, syscall.LOCK_SH
	}
	for deadline := time.Now().Add(opt.Timeout); ; {
		f, err := os.OpenFile(path, flag, 0o640)
		if err != nil {
			return nil, err
		}
		err = syscall.Flock(int(f.Fd()), how|syscall.LOCK_NB)
		if err == nil && same(f, path) {
			return f, nil
		}
		f.Close()
		if err != nil && err != syscall.EWOULDBLOCK && err != syscall.EINTR {
			return nil, fmt.Errorf("cannot lock: %w", err)
		}
		if time.Now().After(deadline) {
			return nil, ErrHeld
		}
		time.Sleep(20 * time.Millisecond)
	}
}

// same reports whether the open file still has the name: another process may
// have set it aside in between.
func same(f *os.File, path string) bool {
	a, err := f.Stat()
	if err != nil {
		return false
	}
	b, err := os.Stat(path)
	return err == nil && os.SameFile(a, b)
}

// setAside renames a damaged file, closes it, and returns its new name and the
// numbers that a new file goes on from.
func setAside(path string, f *os.File) (string, count, error) {
	defer f.Close()
	from := salvage(f)
	base := path + ".corrupt-" + time.Now().UTC().Format("20060102T150405Z")
	aside := base
	for i := 2; ; i++ {
		if _, err := os.Lstat(aside); errors.Is(err, fs.ErrNotExist) {
			break
		}
		aside = fmt.Sprintf("%s-%d", base, i)
	}
	if err := os.Rename(path, aside); err != nil {
		return "", from, err
	}
	dir, err := os.Open(filepath.Dir(path))
	if err != nil {
		return "", from, err
	}
	defer dir.Close()
	return aside, from, dir.Sync()
}
