package report

import (
	"fmt"
	"io"
)

// Comparison is a sweep of settings side by side.
type Comparison struct {
	Head
	Trials    []Trial
	Advised   int         // index of the advised setting
	Agreement [][]float64 // between each two settings, in [0, 1]; NaN where they cannot be compared
	Map       *Map        // places only: Class, Value and Doubt are taken from Answers; nil for none
	NoMap     string      // why there is no map
	Classes   [][]int32   // by setting, then by point of the map; -1 for none
	Values    [][]float64 // the same for numbers
}

// WriteComparison draws a comparison. It fails where lengths differ, or w does.
func WriteComparison(w io.Writer, c *Comparison) error {
	if err := c.validate(); err != nil {
		return err
	}
	return render(w, "compare.html", newComparePage(c))
}

func (c *Comparison) validate() error {
	n := len(c.Trials)
	if c.Advised < 0 || c.Advised >= n {
		return fmt.Errorf("advised setting %d of %d", c.Advised, n)
	}
	if len(c.Agreement) != n {
		return fmt.Errorf("agreement of %d settings, not %d", len(c.Agreement), n)
	}
	for _, row := range c.Agreement {
		if len(row) != n {
			return fmt.Errorf("agreement of %d settings, not %d", len(row), n)
		}
	}
	if c.Map == nil {
		return nil
	}
	if len(c.Classes) != n && len(c.Values) != n {
		return fmt.Errorf("map answers for %d classes and %d numbers, not %d settings", len(c.Classes), len(c.Values), n)
	}
	for i := range c.Trials {
		if c.Task == Classes && len(c.Classes[i]) != len(c.Map.X) || c.Task == Numbers && len(c.Values[i]) != len(c.Map.X) {
			return fmt.Errorf("setting %d does not answer the map's %d points", i, len(c.Map.X))
		}
	}
	return nil
}
