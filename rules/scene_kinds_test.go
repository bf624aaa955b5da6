package rules

import (
	"math/rand/v2"
	"os"
	"testing"
)

// scenes is the number of machines drawn of each cause.
func scenes() int {
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		return 30000
	}
	return 1000
}

// TestScenes judges prescribed vectors of every cause. No verdict may be wrong,
// and at most 3 % of a cause may stay undetermined.
func TestScenes(t *testing.T) {
	for i, cause := range causes {
		r := rand.New(rand.NewPCG(7, uint64(i)))
		var right, undetermined, otherSuspect int
		n := scenes()
		for range n {
			s := newScene(cause, r)
			f := s.finding()
			switch {
			case s.right(f):
				right++
			case s.wrong(f):
				t.Errorf("%s: verdict %s %v\n%v", cause, f.Verdict, f.Suspects, f.Evidence)
			case f.Verdict == Undetermined:
				undetermined++
			default:
				otherSuspect++
			}
		}
		t.Logf("%-10s right %d, other suspect first %d, undetermined %d of %d", cause, right, otherSuspect, undetermined, n)
		if undetermined*100 > 3*n {
			t.Errorf("%s: %d of %d undetermined, want at most 3 %%", cause, undetermined, n)
		}
		if otherSuspect*100 > 3*n {
			t.Errorf("%s: %d of %d with another suspect first, want at most 3 %%", cause, otherSuspect, n)
		}
	}
}
