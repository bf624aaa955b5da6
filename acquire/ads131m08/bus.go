package ads131m08

import (
	"fmt"

	"periph.io/x/conn/v3/spi"
)

// bus exchanges frames with the chip. Its buffers live as long as it does,
// because the kernel gets their addresses.
type bus struct {
	conn spi.Conn
	w, r [FrameBytes]byte
	null [FrameBytes]byte // a NULL frame
}

func newBus(conn spi.Conn) *bus {
	b := &bus{conn: conn}
	b.fill(cmdNull)
	b.null = b.w
	return b
}

// fill puts a command, the registers it writes, and the check sum into the
// frame to send. The check sum does no harm where the chip does not look at it.
func (b *bus) fill(cmd uint16, regs ...uint16) {
	clear(b.w[:])
	b.w[0], b.w[1] = byte(cmd>>8), byte(cmd)
	n := 3
	for _, v := range regs {
		b.w[n], b.w[n+1] = byte(v>>8), byte(v)
		n += 3
	}
	crc := crcBytes(crcSeed, b.w[:n]...)
	b.w[n], b.w[n+1] = byte(crc>>8), byte(crc)
}

// poll sends a NULL frame; the answer is in b.r.
func (b *bus) poll() error { return b.conn.Tx(b.null[:], b.r[:]) }

// answer sends a NULL frame and returns word 0 of what comes back, which
// answers the command before.
func (b *bus) answer() (uint16, error) {
	if err := b.poll(); err != nil {
		return 0, transferError(err)
	}
	if frameCRC(&b.r) != uint16(b.r[checkedBytes])<<8|uint16(b.r[checkedBytes+1]) {
		return 0, badFrame(frameError(&b.r))
	}
	return uint16(b.r[0])<<8 | uint16(b.r[1]), nil
}

// command sends a command and returns its answer.
func (b *bus) command(cmd uint16, regs ...uint16) (uint16, error) {
	b.fill(cmd, regs...)
	if err := b.conn.Tx(b.w[:], b.r[:]); err != nil {
		return 0, transferError(err)
	}
	return b.answer()
}

// write sets one register.
func (b *bus) write(a int, v uint16) error {
	got, err := b.command(opWrite|uint16(a)<<7, v)
	if err != nil {
		return err
	}
	if want := ackWrite | uint16(a)<<7; got != want {
		return fmt.Errorf("answer %04Xh, expected %04Xh: %s", got, want, adviceOut)
	}
	return nil
}

// read returns one register.
func (b *bus) read(a int) (uint16, error) { return b.command(opRead | uint16(a)<<7) }
