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

// frameCRC returns the check sum over the words of a frame before its own. One
// line for each word: constant places let the compiler leave out every check
// of a bound.
func frameCRC(f *[FrameBytes]byte) uint16 {
	t := crcTables
	crc := crcZeros
	crc ^= t[0][f[0]] ^ t[1][f[1]] ^ t[2][f[2]]
	crc ^= t[3][f[3]] ^ t[4][f[4]] ^ t[5][f[5]]
	crc ^= t[6][f[6]] ^ t[7][f[7]] ^ t[8][f[8]]
	crc ^= t[9][f[9]] ^ t[10][f[10]] ^ t[11][f[11]]
	crc ^= t[12][f[12]] ^ t[13][f[13]] ^ t[14][f[14]]
	crc ^= t[15][f[15]] ^ t[16][f[16]] ^ t[17][f[17]]
	crc ^= t[18][f[18]] ^ t[19][f[19]] ^ t[20][f[20]]
	crc ^= t[21][f[21]] ^ t[22][f[22]] ^ t[23][f[23]]
	crc ^= t[24][f[24]] ^ t[25][f[25]] ^ t[26][f[26]]
	return crc
}
