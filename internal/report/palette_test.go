package report

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// themes reads the colours of the page's style: light, dark, print.
func themes(t *testing.T) map[string]map[string][3]float64 {
	t.Helper()
	b, err := templates.ReadFile("templates/style.html")
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]map[string][3]float64{}
	roots := regexp.MustCompile(`(?s):root\{(.*?)\}`).FindAllStringSubmatch(string(b), -1)
	for i, name := range []string{"light", "dark", "print"} {
		if i >= len(roots) {
			t.Fatalf("the style has %d themes", len(roots))
		}
		out[name] = map[string][3]float64{}
		for _, m := range regexp.MustCompile(`--(\w+):#([0-9a-f]{6})`).FindAllStringSubmatch(roots[i][1], -1) {
			v, _ := strconv.ParseUint(m[2], 16, 32)
			out[name][m[1]] = [3]float64{float64(v >> 16), float64(v >> 8 & 255), float64(v & 255)}
		}
	}
	return out
}

func linear(c [3]float64) (out [3]float64) {
	for i, v := range c {
		if v /= 255; v <= .04045 {
			out[i] = v / 12.92
		} else {
			out[i] = math.Pow((v+.055)/1.055, 2.4)
		}
	}
	return out
}

// luminance and contrast are those of WCAG 2.1.
func luminance(c [3]float64) float64 {
	l := linear(c)
	return .2126*l[0] + .7152*l[1] + .0722*l[2]
}

func contrast(a, b [3]float64) float64 {
	x, y := luminance(a), luminance(b)
	return (max(x, y) + .05) / (min(x, y) + .05)
}

func TestContrastFormula(t *testing.T) {
	// WCAG 2.1: black on white is 21:1; #767676 on white is the lightest grey that passes 4.5.
	if c := contrast([3]float64{}, [3]float64{255, 255, 255}); math.Abs(c-21) > 1e-9 {
		t.Errorf("black on white is %v", c)
	}
	if c := contrast([3]float64{0x76, 0x76, 0x76}, [3]float64{255, 255, 255}); c < 4.5 || c > 4.6 {
		t.Errorf("#767676 on white is %v", c)
	}
}

// TestContrast holds text at 4.5:1 and marks that carry meaning at 3:1 (WCAG 2.1, AA: 1.4.3 and 1.4.11).
func TestContrast(t *testing.T) {
	for name, theme := range themes(t) {
		check := func(fore, back string, least float64) {
			f, ok1 := theme[fore]
			b, ok2 := theme[back]
			if !ok1 || !ok2 {
				t.Errorf("%s: no colour %s or %s", name, fore, back)
				return
			}
			if c := contrast(f, b); c < least {
				t.Errorf("%s: %s on %s is %.2f:1, under %g", name, fore, back, c, least)
			}
		}
		for _, back := range []string{"paper", "panel", "chosen"} {
			check("ink", back, 4.5)
			check("soft", back, 4.5)
			check("accent", back, 4.5)
		}
		check("ink", "warnpaper", 4.5)
		check("warn", "warnpaper", 4.5)
		check("ink", "ground", 4.5)
		for s := range 7 {
			text := "cell"
			if s >= 4 {
				text = "cellon"
			}
			check(text, "a"+strconv.Itoa(s), 4.5)
		}
		for _, back := range []string{"ground", "paper", "panel"} {
			for c := range colours {
				check("c"+strconv.Itoa(c), back, 3)
			}
			for s := range ramp {
				check("v"+strconv.Itoa(s), back, 3)
			}
			for s := range doubtRamp {
				check("u"+strconv.Itoa(s), back, 3)
			}
			check("none", back, 3)
		}
	}
}

// TestRampsAreOrdered: the steps of a ramp grow apart from the ground one by one, so that they read without colour.
func TestRampsAreOrdered(t *testing.T) {
	for name, theme := range themes(t) {
		for _, r := range []struct {
			prefix string
			steps  int
		}{{"v", ramp}, {"u", doubtRamp}, {"a", 7}} {
			for s := 1; s < r.steps; s++ {
				a, b := theme[fmt.Sprint(r.prefix, s-1)], theme[fmt.Sprint(r.prefix, s)]
				if contrast(b, theme["ground"]) < 1.08*contrast(a, theme["ground"]) {
					t.Errorf("%s: step %d of %s is not clearly further from the ground than step %d", name, s, r.prefix, s-1)
				}
			}
		}
	}
}

// Colour-blind sight by Machado, Oliveira and Fernandes (2009), severity 1, on linear RGB.
var sights = map[string][3][3]float64{
	"full":         {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
	"protanopia":   {{.152286, 1.052583, -.204868}, {.114503, .786281, .099216}, {-.003882, -.048116, 1.051998}},
	"deuteranopia": {{.367322, .860646, -.227968}, {.280085, .672501, .047413}, {-.011820, .042940, .968881}},
}

// lab is CIE 1976 L*a*b* under D65.
func lab(c [3]float64, sight [3][3]float64) (out [3]float64) {
	l := linear(c)
	var s [3]float64
	for i := range s {
		for j := range l {
			s[i] += sight[i][j] * l[j]
		}
		s[i] = min(max(s[i], 0), 1)
	}
	f := func(v float64) float64 {
		if v > 216.0/24389 {
			return math.Cbrt(v)
		}
		return (24389.0/27*v + 16) / 116
	}
	x := f((.4124564*s[0] + .3575761*s[1] + .1804375*s[2]) / .95047)
	y := f(.2126729*s[0] + .7151522*s[1] + .0721750*s[2])
	z := f((.0193339*s[0] + .1191920*s[1] + .9503041*s[2]) / 1.08883)
	return [3]float64{116*y - 16, 500 * (x - y), 200 * (y - z)}
}

// TestClassesTellApart: the first five class colours differ for each kind of sight by 8 at least, several times the
// difference of about 2.3 that is just seen (Mahy and others 1994). Shapes and names on the map carry the rest.
func TestClassesTellApart(t *testing.T) {
	for name, theme := range themes(t) {
		for sight, m := range sights {
			for a := range 5 {
				for b := range a {
					x, y := lab(theme["c"+strconv.Itoa(a)], m), lab(theme["c"+strconv.Itoa(b)], m)
					d := math.Sqrt((x[0]-y[0])*(x[0]-y[0]) + (x[1]-y[1])*(x[1]-y[1]) + (x[2]-y[2])*(x[2]-y[2]))
					if d < 8 {
						t.Errorf("%s, %s: classes %d and %d differ by %.1f", name, sight, b, a, d)
					}
				}
			}
		}
	}
	for c := range 2 * colours { // a colour's second class has another shape
		if classStyle(c) == classStyle(c+colours) && classShape(c) == classShape(c+colours) {
			t.Errorf("classes %d and %d look alike", c, c+colours)
		}
	}
}

func TestPrintIsLight(t *testing.T) {
	if th := themes(t); luminance(th["print"]["paper"]) < .9 || luminance(th["dark"]["paper"]) > .05 {
		t.Error("paper is printed dark, or the dark theme is light")
	}
	b, _ := templates.ReadFile("templates/style.html")
	if !strings.Contains(string(b), "prefers-color-scheme:dark") || !strings.Contains(string(b), "@media print") {
		t.Error("a theme is missing")
	}
}
