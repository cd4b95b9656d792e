package demo

import (
	"fmt"
	"math/rand/v2"
)

var stateNames = [...]string{"normal", "cavitating", "worn_bearing", "loose_mount"}

// Columns of a clip: sound level in third-octave bands (dB), then figures of the whole clip.
var (
	bands   = [...]string{"63", "80", "100", "125", "160", "200", "250", "315", "400", "500", "630", "800", "1000", "1250", "1600", "2000", "2500", "3150"}
	figures = [...]struct {
		name         string
		decimals     int
		middle, unit float64 // value and spread in the column's unit
	}{
		{"level_db", 2, 71, 4},
		{"crest_factor", 3, 4.2, 0.8},
		{"kurtosis", 3, 3.6, 0.7},
		{"centroid_hz", 1, 640, 120},
		{"blade_ratio", 3, 0.42, 0.11},
		{"flatness", 3, 0.31, 0.07},
	}
)

const clipCount = 3000

// pumps makes the table of sound clips. Each clip has four hidden co-ordinates in [-1, 1] (speed, load, wear,
// distance of the microphone); its 24 columns are smooth functions of them plus a little noise, so the clips lie near
// a sheet of four dimensions. The state of the pump is a curved region of the same four.
func pumps(seed uint64) *dataset {
	r := rand.New(rand.NewPCG(seed, 2))
	width := len(bands) + len(figures)
	// Each column: linear, wavy and quadratic parts in the hidden co-ordinates.
	type response struct {
		linear, phase [4]float64
		bend          [4]float64
	}
	responses := make([]response, width)
	for c := range responses {
		for k := range 4 {
			responses[c].linear[k] = float64(0.75 * normal(r))
			responses[c].bend[k] = float64(0.35 * normal(r))
			responses[c].phase[k] = uniform(r)
		}
	}
	d := &dataset{id: "clip", label: "state"}
	for _, hz := range bands {
		d.columns = append(d.columns, column{name: "band_" + hz + "hz_db", decimals: 2})
	}
	for _, f := range figures {
		d.columns = append(d.columns, column{name: f.name, decimals: f.decimals})
	}
	for i := range clipCount {
		var z [4]float64
		state := pumpState(&z, r)
		for c := range width {
			var v float64
			for k, t := range z {
				q := &responses[c]
				v += float64(q.linear[k]*t) + float64(q.bend[k]*wave(float64(0.45*t)+q.phase[k]))
			}
			v += float64(0.07 * normal(r))
			if c < len(bands) {
				tilt := 62 - float64(0.9*float64(c))
				d.columns[c].values = append(d.columns[c].values, tilt+float64(5*v))
				continue
			}
			f := figures[c-len(bands)]
			d.columns[c].values = append(d.columns[c].values, f.middle+float64(f.unit*v))
		}
		d.ids = append(d.ids, fmt.Sprintf("k%04d", i+1))
		d.truth = append(d.truth, stateNames[state])
	}
	d.labelled = draw(r, clipCount, 40)
	return d
}

// pumpState draws the hidden co-ordinates of a clip and gives its state.
func pumpState(z *[4]float64, r *rand.Rand) int {
	for {
		for k := range z {
			z[k] = float64(2*uniform(r)) - 1
		}
		speed, load, wear, distance := z[0], z[1], z[2], z[3]
		// Signed distances to the edge of each region, positive inside.
		inside := [...]float64{
			speed - 0.30 - float64(0.6*float64(load*load)) + float64(0.12*wave(float64(0.5*distance))),
			wear - 0.38 - float64(0.25*wave(float64(0.5*speed)+0.25)) + float64(0.12*float64(distance*distance)),
			0.75 - hypot(speed+0.8, float64(0.9*(load-0.6))),
		}
		state, gap := 0, 0.0
		for s, v := range inside {
			if v > gap {
				state, gap = s+1, v
			}
		}
		if state == 0 {
			gap = -max(inside[0], inside[1], inside[2])
		} else {
			for s, v := range inside {
				if s+1 != state {
					gap = min(gap, inside[state-1]-v)
				}
			}
		}
		// Clips between two states are rare: a pump stays in one for months and changes within days.
		if gap > 0.2 || uniform(r) < 0.15 {
			return state
		}
	}
}
