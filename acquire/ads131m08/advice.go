package ads131m08

import "fmt"

// What an operator should look at.
const (
	adviceIn     = "look at the MISO wire, at the SPI mode (1) and at the SPI clock"
	adviceOut    = "look at the MOSI and clock wires and at the SPI clock"
	adviceReset  = "look at the MOSI wire, at chip select and at the SPI mode (1); if another program has used the converter, switch its power off and on"
	adviceSupply = "look at the converter's supply and its SYNC/RESET pin"
	adviceClock  = "look at the converter's clock: clock_hz, crystal or clock at CLKIN"
	adviceLoad   = "look at the load of the board and the priority of the process"
	adviceEdge   = "look at the data-ready wire and its pin, and at the converter's clock (crystal or clock at CLKIN)"
)

// transferError reports a transaction that the host's driver refused.
func transferError(err error) error {
	return fmt.Errorf("SPI transfer failed: %w; look at the SPI port and its permissions", err)
}

// badFrame reports an answer that is no frame.
func badFrame(err error) error {
	switch err {
	case ErrLow:
		return fmt.Errorf("%w; look at the MISO wire, chip select and the converter's supply", err)
	case ErrHigh:
		return fmt.Errorf("%w; look whether the MISO wire is connected and the converter has power", err)
	}
	return fmt.Errorf("%w; look at the SPI mode (1), the SPI clock, the length of the wires and the ground", err)
}
