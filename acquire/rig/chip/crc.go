package chip

// crcSeed is the start value of both check sums (section 8.3.12).
const crcSeed = 0xFFFF

// crcTable holds the check sum of every byte for one polynomial, most
// significant bit first, not reflected, not inverted.
type crcTable [256]uint16

var (
	ccitt = newTable(0x1021)
	ansi  = newTable(0x8005)
)

func newTable(poly uint16) *crcTable {
	var t crcTable
	for i := range t {
		crc := uint16(i) << 8
		for range 8 {
			top := crc&0x8000 != 0
			crc <<= 1
			if top {
				crc ^= poly
			}
		}
		t[i] = crc
	}
	return &t
}

// add carries crc on over the bytes p.
func (t *crcTable) add(crc uint16, p ...byte) uint16 {
	for _, b := range p {
		crc = crc<<8 ^ t[byte(crc>>8)^b]
	}
	return crc
}

// crcOf returns the polynomial that MODE.CRC_TYPE chooses.
func (r *registers) crcOf() *crcTable {
	if r[regMode]&modeCRCType != 0 {
		return ansi
	}
	return ccitt
}
