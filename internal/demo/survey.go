package demo

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// Classes of the bottom.
const (
	mud = iota
	sand
	gravel
	shell
	eelgrass
)

var bottomNames = [...]string{"mud", "sand", "gravel", "shell", "eelgrass"}

// What the echo sounder sees of each class: backscatter (dB), roughness (cm) and the part of the slope (degrees) that
// the class itself makes.
var bottomEcho = [...]struct{ backscatter, roughness, slope float64 }{
	mud:      {-31, 0.9, 0.3},
	sand:     {-23, 1.7, 0.8},
	gravel:   {-14, 3.4, 1.6},
	shell:    {-18, 4.6, 2.3},
	eelgrass: {-27, 5.4, 1.1},
}

// The flat is laid out on a grid of pitch metres; a cell's position is that of the middle of its soundings, off the
// grid by a few metres.
const (
	gridColumns = 108
	gridRows    = 79
	pitch       = 25.0
	eastOrigin  = 412300.0
	northOrigin = 5921600.0
)

// flat is the ground: everything is a function of position alone, x east and y north in units of the width of the
// grid, so x in [0, 1) and y in [0, .73).
type flat struct {
	cover *field
}

// channel is the distance to the bed of the meandering main channel.
func (flat) channel(x, y float64) float64 {
	return math.Abs(y - (0.36 + float64(0.11*wave(float64(1.15*x)+0.62)) + float64(0.03*wave(float64(2.7*x)))))
}

// creek is the distance to a side creek, an arc that leaves the channel to the north.
func (flat) creek(x, y float64) float64 {
	if x < 0.34 {
		return 1
	}
	return math.Abs(hypot(x-0.33, y-0.62) - 0.22)
}

// depth is in metres below chart datum; what dries at low water is negative.
func (g flat) depth(x, y float64) float64 {
	d := -0.9 + float64(3.4*step(1.05-float64(1.5*x)))
	d += float64(5.2 * bump(g.channel(x, y)/0.11))
	d += float64(1.7 * bump(g.creek(x, y)/0.05))
	d += float64(1.1 * bump(hypot(x-0.62, y-0.14)/0.2))
	return d + float64(0.25*g.cover.at(float64(9*x), float64(9*y)))
}

// class is what lies on the bottom. The regions are curved and of very unequal size.
func (g flat) class(x, y float64) int {
	ripple := float64(0.008 * g.cover.at(float64(14*x)+1, float64(14*y)+2))
	switch {
	case g.channel(x, y)+ripple < 0.042 && x < 0.83:
		return gravel
	case math.Abs(hypot(x-0.10, y-0.30)-0.27)+ripple < 0.031 && g.channel(x, y) > 0.06:
		return shell // a ridge that follows the outer bank
	case hypot(x-0.62, y-0.14)+ripple < 0.165 && hypot(x-0.67, y-0.19) > 0.1:
		return eelgrass // a crescent in the southern hollow
	case hypot(x-0.30, y-0.62)+ripple < 0.10:
		return eelgrass // a round meadow inside the creek's bend
	case x+float64(0.12*wave(float64(1.4*y)+0.1))+ripple > 0.70:
		return mud // the sheltered head of the bay
	case g.creek(x, y)+ripple < 0.04:
		return mud // soft creek bed
	}
	return sand
}

// phi is the median grain size in phi units (minus the binary logarithm of the diameter in millimetres): coarse in
// the fast water of the channel, fine at the sheltered head and on the northern shore, and smooth in between.
func (g flat) phi(x, y float64) float64 {
	v := 1.6 + float64(4.2*step(float64(1.9*x)-0.9+float64(0.25*wave(float64(1.2*y)))))
	v -= float64(3.1 * bump(g.channel(x, y)/0.2) * (1 - float64(0.55*x)))
	v += float64(1.5 * bump(hypot(x-0.32, y-0.60)/0.3))
	return v - float64(0.9*bump((hypot(x-0.10, y-0.30)-0.27)/0.09))
}

// inside says whether (x, y) lies within the bay.
func (flat) inside(x, y float64) bool {
	if hypot(float64(1.15*(x-0.46)), float64(1.55*(y-0.37))) > 0.545+float64(0.02*wave(float64(3*x)+y)) {
		return false
	}
	return hypot(x-0.86, y-0.44) > 0.055 // an island
}

// survey makes the two tables of the tidal flat.
func survey(seed uint64) (bottom, grain *dataset) {
	r := rand.New(rand.NewPCG(seed, 1))
	g := flat{cover: newField(r, 20)}
	gain := newField(r, 8) // slow drift of the sounder
	soil := newField(r, 16)
	bottom = &dataset{id: "cell", label: "bottom"}
	grain = &dataset{id: "cell", label: "grain_phi"}
	columns := []column{
		{name: "easting_m", decimals: 1},
		{name: "northing_m", decimals: 1},
		{name: "depth_m", decimals: 2},
		{name: "backscatter_db", decimals: 2},
		{name: "roughness_cm", decimals: 2},
		{name: "slope_deg", decimals: 2},
	}
	const width = gridColumns * pitch
	for j := range gridRows {
		for i := range gridColumns {
			east := float64(pitch*float64(i)) + 12.5 + float64(3*normal(r))
			north := float64(pitch*float64(j)) + 12.5 + float64(3*normal(r))
			x, y := east/width, north/width
			if !g.inside(x, y) {
				continue
			}
			class := g.class(x, y)
			echo := bottomEcho[class]
			const h = 0.004
			steep := hypot(g.depth(x+h, y)-g.depth(x-h, y), g.depth(x, y+h)-g.depth(x, y-h)) / (2 * h * width)
			noise := func(s float64) float64 { return float64(s * normal(r)) }
			values := [...]float64{
				eastOrigin + east,
				northOrigin + north,
				g.depth(x, y) + noise(0.08),
				echo.backscatter + float64(0.9*gain.at(float64(6*x), float64(6*y))) + noise(2.6),
				max(0.1, float64(echo.roughness*(1+noise(0.22)))+noise(0.35)),
				max(0, float64(50*steep)+float64(echo.slope*(1+noise(0.25)))),
			}
			for c := range columns {
				columns[c].values = append(columns[c].values, values[c])
			}
			id := fmt.Sprintf("c%04d", len(bottom.ids)+1)
			bottom.ids = append(bottom.ids, id)
			bottom.truth = append(bottom.truth, bottomNames[class])
			phi := g.phi(x, y) + float64(0.25*soil.at(float64(15*x), float64(15*y))) + noise(0.12)
			grain.truth = append(grain.truth, decimal(phi, 2))
		}
	}
	grain.ids = bottom.ids
	bottom.columns, grain.columns = columns, columns
	bottom.labelled = draw(r, len(bottom.ids), 48)
	grain.labelled = draw(r, len(grain.ids), 60)
	return bottom, grain
}
