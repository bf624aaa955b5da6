package buffer

import (
	"errors"
	"fmt"

	"go.etcd.io/bbolt"

	"heavyspot/publish"
)

// layoutVersion is the version of the file's layout. A file of another version
// is set aside like a damaged one.
const layoutVersion = 1

// The buckets. Records and outbox are keyed by the big-endian sequence number.
var (
	bucketMeta     = []byte("meta")
	bucketOutbox   = []byte("outbox")   // sequence -> kind letter
	bucketStanding = []byte("standing") // alarm topic -> record of its newest message
	bucketState    = []byte("state")    // state of the alarm engine
)

var (
	keyLayout   = []byte("layout")
	keySequence = []byte("sequence")
	keyBoot     = []byte("boot")
	keyAlarms   = []byte("alarms")
)

// A shelf is where one kind of record is kept, with an index of runs.
type shelf struct {
	kind    publish.Kind
	letter  byte
	records []byte
	runs    []byte
}

// The shelves, in the order in which they give way.
var shelves = []shelf{
	{publish.KindMinute, 'm', []byte("minutes"), []byte("minute runs")},
	{publish.KindFinding, 'f', []byte("findings"), []byte("finding runs")},
	{publish.KindAlarm, 'a', []byte("alarms"), []byte("alarm runs")},
}

func shelfOf(k publish.Kind) *shelf {
	for i := range shelves {
		if shelves[i].kind == k {
			return &shelves[i]
		}
	}
	return nil
}

func shelfByLetter(v []byte) *shelf {
	for i := range shelves {
		if len(v) == 1 && shelves[i].letter == v[0] {
			return &shelves[i]
		}
	}
	return nil
}

// open returns a bucket set up for keys that only ever grow; the setting does
// not outlive the transaction.
func sequential(tx *bbolt.Tx, name []byte) *bbolt.Bucket {
	b := tx.Bucket(name)
	b.FillPercent = 0.9
	return b
}

var errLayout = errors.New("layout is of another version")

// prepare makes the buckets of a new file, or checks those of an old one, and
// counts the start.
func prepare(tx *bbolt.Tx, from count) error {
	if tx.Bucket(bucketMeta) == nil {
		if k, _ := tx.Cursor().First(); k != nil {
			return errLayout
		}
		if err := create(tx, from); err != nil {
			return err
		}
	}
	if err := checkLayout(tx); err != nil {
		return err
	}
	meta := tx.Bucket(bucketMeta)
	return meta.Put(keyBoot, key(number(meta.Get(keyBoot))+1))
}

func create(tx *bbolt.Tx, from count) error {
	names := [][]byte{bucketMeta, bucketOutbox, bucketStanding, bucketState}
	for _, s := range shelves {
		names = append(names, s.records, s.runs)
	}
	for _, n := range names {
		if _, err := tx.CreateBucket(n); err != nil {
			return err
		}
	}
	meta := tx.Bucket(bucketMeta)
	return errors.Join(
		meta.Put(keyLayout, key(layoutVersion)),
		meta.Put(keySequence, key(from.sequence)),
		meta.Put(keyBoot, key(from.boot)))
}

func checkLayout(tx *bbolt.Tx) error {
	meta := tx.Bucket(bucketMeta)
	if meta == nil {
		return errLayout
	}
	if v := number(meta.Get(keyLayout)); v != layoutVersion {
		return fmt.Errorf("%w: %d: must be %d", errLayout, v, layoutVersion)
	}
	names := [][]byte{bucketOutbox, bucketStanding, bucketState}
	for _, s := range shelves {
		names = append(names, s.records, s.runs)
	}
	for _, n := range names {
		if tx.Bucket(n) == nil {
			return fmt.Errorf("%w: no %s", errLayout, n)
		}
	}
	return nil
}
