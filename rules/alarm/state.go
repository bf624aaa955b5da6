package alarm

import (
	"encoding/json"
	"fmt"
	"math"
)

// stored is the form of an exported state.
type stored struct {
	Version   int              `json:"version"`
	SteadyRPM float64          `json:"steady_rpm"`
	Alarms    map[string]*life `json:"alarms"`
}

const stateVersion = 1

// State exports the state as JSON, to be given to Restore after a restart.
func (e *Engine) State() ([]byte, error) {
	s := stored{Version: stateVersion, SteadyRPM: e.steadyRPM, Alarms: map[string]*life{}}
	for k, l := range e.lives {
		if l.Active || l.Row > 0 {
			s.Alarms[k] = l
		}
	}
	b, err := json.Marshal(&s)
	if err != nil {
		return nil, fmt.Errorf("alarm: cannot export state: %v", err)
	}
	return b, nil
}

// Restore takes over an exported state. On an error the engine is as it was.
func (e *Engine) Restore(state []byte) error {
	var s stored
	if err := json.Unmarshal(state, &s); err != nil {
		return fmt.Errorf("alarm: cannot restore state: %v", err)
	}
	if s.Version != stateVersion {
		return fmt.Errorf("alarm: cannot restore state: version %d: must be %d", s.Version, stateVersion)
	}
	if math.IsNaN(s.SteadyRPM) || s.SteadyRPM < 0 {
		return fmt.Errorf("alarm: cannot restore state: steady speed %v r/min: must be 0 or more", s.SteadyRPM)
	}
	lives := make(map[string]*life, len(s.Alarms))
	for k, l := range s.Alarms {
		if l == nil || k == "" || l.Row < 0 {
			return fmt.Errorf("alarm: cannot restore state: alarm %q is damaged", k)
		}
		lives[k] = l
	}
	e.lives, e.steadyRPM = lives, s.SteadyRPM
	return nil
}
