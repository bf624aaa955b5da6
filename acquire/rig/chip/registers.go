package chip

// Register addresses (table 8-12).
const (
	regID     = 0x00
	regStatus = 0x01
	regMode   = 0x02
	regClock  = 0x03
	regGain1  = 0x04
	regGain2  = 0x05
	regCfg    = 0x06
	regThMSB  = 0x07
	regThLSB  = 0x08
	regCh     = 0x09 // first of channel 0; perChannel registers each
	regLast   = 0x30
	regMapCRC = 0x3E
	regCount  = 0x40

	perChannel = 5
	ofsCfg     = 0
	ofsOcalMSB = 1
	ofsOcalLSB = 2
	ofsGcalMSB = 3
	ofsGcalLSB = 4
)

// Bits of STATUS and MODE.
const (
	statusLock   = 1 << 15
	statusResync = 1 << 14
	statusRegMap = 1 << 13
	statusCRCErr = 1 << 12

	modeRegCRC  = 1 << 13
	modeRxCRC   = 1 << 12
	modeCRCType = 1 << 11
	modeReset   = 1 << 10
	modeTimeout = 1 << 4
	modePulse   = 1 << 0
)

// registers is the register map; STATUS is put together when it is read.
type registers [regCount]uint16

// reset writes the default of every register.
func (r *registers) reset() {
	*r = registers{regID: 0x2800, regMode: 0x0510, regClock: 0xFF0E, regCfg: 0x0600}
	for ch := range channels {
		r[regCh+perChannel*ch+ofsGcalMSB] = 0x8000
	}
}

// writable returns the bits of register a which a write can change.
func writable(a int) uint16 {
	switch a {
	case regMode:
		return 0x3F1F
	case regClock:
		return 0xFFDF
	case regGain1, regGain2:
		return 0x7777
	case regCfg:
		return 0x1FFF
	case regThMSB:
		return 0xFFFF
	case regThLSB:
		return 0xFF0F
	}
	if a < regCh || a > regLast {
		return 0
	}
	switch (a - regCh) % perChannel {
	case ofsCfg:
		return 0xFFC7
	case ofsOcalLSB, ofsGcalLSB:
		return 0xFF00
	}
	return 0xFFFF
}

// write stores v as far as register a lets it.
func (r *registers) write(a int, v uint16) {
	m := writable(a)
	old := r[a]
	r[a] = old&^m | v&m
	if a == regMode {
		// The reset flag can be cleared, never set by a write.
		r[a] &^= modeReset &^ old
	}
}

// wordBytes is the length of a word on the bus, 2, 3 or 4 bytes.
func (r *registers) wordBytes() int {
	switch r[regMode] >> 8 & 3 {
	case 0:
		return 2
	case 1:
		return 3
	}
	return 4
}

// enabled returns the channel enables, bit n for channel n.
func (r *registers) enabled() uint16 { return r[regClock] >> 8 }

// osr returns the over-sampling ratio.
func (r *registers) osr() int { return 128 << (r[regClock] >> 2 & 7) }

// gain returns the gain of channel ch.
func (r *registers) gain(ch int) int {
	return 1 << (r[regGain1+ch/4] >> (4 * (ch % 4)) & 7)
}

// channel returns register ofs of channel ch.
func (r *registers) channel(ch, ofs int) uint16 { return r[regCh+perChannel*ch+ofs] }

// offset returns the offset calibration of ch, a signed 24-bit code.
func (r *registers) offset(ch int) int32 {
	return int32(uint32(r.channel(ch, ofsOcalMSB))<<16|uint32(r.channel(ch, ofsOcalLSB))) >> 8
}

// gainCal returns the gain calibration of ch, 1<<23 for 1.
func (r *registers) gainCal(ch int) int64 {
	return int64(r.channel(ch, ofsGcalMSB))<<8 | int64(r.channel(ch, ofsGcalLSB))>>8
}

// mapCRC is the check sum over the registers 02h to 30h.
func (r *registers) mapCRC(poly *crcTable) uint16 {
	crc := uint16(crcSeed)
	for a := regMode; a <= regLast; a++ {
		crc = poly.add(crc, byte(r[a]>>8), byte(r[a]))
	}
	return crc
}
