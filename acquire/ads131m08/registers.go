package ads131m08

// Register addresses (table 8-12).
const (
	regID          = 0x00
	regMode        = 0x02
	regClock       = 0x03
	regGain1       = 0x04
	regGain2       = 0x05
	regCfg         = 0x06
	regThresholdLo = 0x08
	regChannel     = 0x09 // CHn_CFG, five registers for each channel
	perChannel     = 5
)

// Command words and what answers them one frame later (table 8-11).
const (
	cmdNull   = 0x0000
	cmdReset  = 0x0011
	cmdUnlock = 0x0655
	opWrite   = 0x6000
	opRead    = 0xA000
	ackWrite  = 0x4000
	ackReset  = 0xFF28

	idMask = 0xFF00 // the low byte of ID is not specified
	idM08  = 0x2800
)

// Values written.
const (
	// modeBase: 24-bit words, frame timeout on, data-ready as a level, the
	// reset flag cleared.
	modeBase  = 0x0110
	modeRxCRC = 0x1000
	cfgReset  = 0x0600

	clockXtalOff = 1 << 7
	clockHighRes = 0b10 // PWR
)

// Status is the STATUS word in front of every frame.
type Status uint16

// Bits of Status besides the data-ready bits 7 to 0.
const (
	StatusLock    Status = 1 << 15
	StatusResync  Status = 1 << 14
	StatusRegMap  Status = 1 << 13
	StatusCRCErr  Status = 1 << 12
	StatusCRCType Status = 1 << 11
	StatusReset   Status = 1 << 10
	statusLength  Status = 3 << 8
	statusWord24  Status = 1 << 8
)

// Configured returns whether the chip still has the configuration of the
// bring-up as far as STATUS shows: not reset, not resynchronised, not locked,
// 24-bit words, CCITT check sum.
func (s Status) Configured() bool {
	return s&(StatusLock|StatusResync|StatusRegMap|StatusCRCType|StatusReset|statusLength) == statusWord24
}

// Fresh returns the data-ready bits, bit n set when the frame holds a new
// sample of channel n.
func (s Status) Fresh() uint8 { return uint8(s) }
