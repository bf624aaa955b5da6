package ads131m08

// The check sum is a CRC of 16 bits, polynomial 1021h (CCITT), start value
// FFFFh, neither reflected nor inverted (section 8.3.12).
const (
	crcPoly = 0x1021
	crcSeed = 0xFFFF
)

// crcBytes computes the check sum bit by bit; used for commands, which are
// rare, and as the source of the tables.
func crcBytes(crc uint16, p ...byte) uint16 {
	for _, b := range p {
		crc ^= uint16(b) << 8
		for range 8 {
			top := crc&0x8000 != 0
			crc <<= 1
			if top {
				crc ^= crcPoly
			}
		}
	}
	return crc
}

// crcTables serves frames, whose length never changes: the check sum is
// linear over the bits, so it is the check sum of zeros plus one term for each
// byte that depends only on its value and its place. Twenty-seven independent
// look-ups take the place of a chain of twenty-seven dependent ones.
var (
	crcTables = newTables()
	crcZeros  = crcBytes(crcSeed, make([]byte, checkedBytes)...)
)

func newTables() *[checkedBytes][256]uint16 {
	var t [checkedBytes][256]uint16
	for v := range 256 {
		crc := crcBytes(0, byte(v))
		for at := checkedBytes - 1; at >= 0; at-- {
			t[at][v] = crc
			crc = crcBytes(crc, 0)
		}
	}
	return &t
}

// frameCRC returns the check sum over the words of a frame before its own.
func frameCRC(f *[FrameBytes]byte) uint16 {
	crc := crcZeros
	for i := range checkedBytes {
		crc ^= crcTables[i][f[i]]
	}
	return crc
}
