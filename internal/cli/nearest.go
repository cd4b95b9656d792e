package cli

import (
	"pinfill/internal/fault"

	"pinfill/internal/encode"
)

// nearest gives "; did you mean ...?" for the candidate closest to name, or nothing when none is close.
func nearest(name string, candidates []string) string {
	if best, ok := encode.Nearest(name, candidates); ok {
		return "; did you mean " + fault.Quote(best) + "?"
	}
	return ""
}
