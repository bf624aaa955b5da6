package recording

import (
	"strings"

	"heavyspot/acquire"
)

// estimatedMark follows the cause in the gap column when the number of lost
// rows is not exact.
const estimatedMark = " estimated"

// causeWords are the causes of a gap as the gap column has them.
var causeWords = map[string]acquire.Cause{
	"late":       acquire.Late,
	"bad-check":  acquire.BadCheck,
	"chip-reset": acquire.ChipReset,
	"bus-fault":  acquire.BusFault,
	"absent":     acquire.Absent,
}

// parseCause reads a cell of the gap column. Words it does not know mean no
// more than the hole itself.
func parseCause(cell []byte) (c acquire.Cause, estimated bool) {
	word, estimated := strings.CutSuffix(string(cell), estimatedMark)
	if c, ok := causeWords[word]; ok {
		return c, estimated
	}
	return acquire.Absent, false
}

// causeWord returns the cell of the gap column for g.
func causeWord(g acquire.Gap) string {
	for word, c := range causeWords {
		if c == g.Cause {
			if !g.Exact {
				word += estimatedMark
			}
			return word
		}
	}
	return ""
}
