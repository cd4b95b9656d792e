// Package report draws a run as one HTML file that opens offline and needs no script: what came out, how sure it is,
// what to doubt, the picture, why these settings, the graph's health, the certificates, and how to repeat it.
//
// Write draws a run of label from a Run, WriteComparison a sweep of settings from a Comparison. Both are plain
// structs; Directions and Sample help to fill their pictures. Everything a user may have named goes through
// html/template as text, never as markup. The bytes depend on the struct alone: no clock, no map order, no chance.
package report

import (
	"bufio"
	"embed"
	"fmt"
	"html/template"
	"io"
)

// Task is what kind of label the table holds.
type Task string

// Kinds of label.
const (
	Classes Task = "classes"
	Numbers Task = "numbers"
)

// Origin says where a row's label comes from.
type Origin uint8

// Origins of a label.
const (
	Inferred Origin = iota
	Given
	Bridged
	Abstained
	Blank
)

// Head says what both kinds of report are about.
type Head struct {
	Program  string // name and version
	Table    string // as the user named it
	Label    string // label column
	Task     Task
	Names    []string // classes, in order; nil for numbers
	Rows     int
	Labelled int
	Features []string
	Reason   string // why these settings, a sentence
	Caution  string
	Warnings []Warning
	Command  string // what to type to get the same bytes again
	Files    []File
}

// Run is a run of label.
type Run struct {
	Head
	Vertices  int      // distinct points
	Constant  []string // feature columns that were dropped
	Answers   Answers
	Trust     *Trust // nil where labels are too few to leave some out
	Doubts    Doubts
	Bridges   []Bridge // components without a label that were joined to one with, largest first
	Map       *Map     // nil where there are no coordinates
	NoMap     string   // why there is no map
	Settings  []Setting
	P         float64 // chosen; +Inf allowed
	Neighbors int     // chosen; 0 for a radius or a given graph
	Trials    []Trial
	Dimension *Dimension // nil where it could not be told
	Windows   []Window
	Graph     Graph
	Solves    []Solve
}

// Answers are the labels by row. Slices that do not apply are nil; NaN is an empty cell.
type Answers struct {
	Origin     []Origin
	Class      []int32 // index into Names, or -1
	Value      []float64
	Confidence []float64 // probability in [0, 1]
	SetSize    []int32
	Low, High  []float64
	RowName    func(row int) string // how the user knows a row: its id, or its number from 1
	SetText    func(row int) string // the row's set, most likely first
}

// Trust says what the labels' confidence rests on. NaN where a figure does not apply.
type Trust struct {
	Promise  string  // sentence
	Note     string  // sentence
	Coverage float64 // promised
	Labels   int     // left out
	Accuracy, LogLoss, Brier,
	ECE, ECEFloor, RMSE, MAE float64
	Bins           []Bin     // calibration of classes
	Given, LeftOut []float64 // numbers: each label and its answer without it
}

// Bin is a point of the calibration plot: labels left out, their mean confidence and the share that was right.
type Bin struct {
	Count                int
	Confidence, Accuracy float64
}

// Doubts are the given labels that the others dispute.
type Doubts struct {
	Skipped string // why the labels were not audited, or ""
	Audited int
	List    []Dispute // most doubtful first
}

// Dispute is a given label with what the others say of it.
type Dispute struct {
	Row         string
	Given, Says string
	Adjusted    float64 // corrected p-value
	Disputed    bool
	Because     []string // rows that say so
}

// Bridge is a component without a label.
type Bridge struct {
	Vertices int
	Row      string // one of its rows
	Answer   string // what that row got
}

// Map is the picture: the points drawn, in two coordinates, with what is known of them.
type Map struct {
	X, Y         []float64
	XName, YName string
	Sentence     string // what the coordinates are
	Equal        bool   // both axes have one scale
	Total        int    // points before sampling
	Seed         uint64
	Given        []bool    // carries a label
	Origin       []Origin  // of its answer (Given counts as Inferred)
	Class        []int32   // answer; -1 where there is none
	Value        []float64 // answer; NaN where there is none
	Doubt        []float64 // classes: 1 - confidence; numbers: interval width over the range of the labels; NaN unknown
}

// Setting is one setting of the run.
type Setting struct {
	Name, Value string
	Given       bool // by the user
}

// Trial is one setting tried.
type Trial struct {
	P          float64
	Neighbors  int // 0 where it does not apply
	Kernel     string
	Bandwidth  string
	Error      float64 // share decided wrong, or root mean square error, on labels left out
	StdError   float64
	LogLoss    float64
	LabelDrop  float64
	Bulk       float64
	AtLabels   float64
	SmallShare float64 // smallest class's share of the unlabelled; NaN for numbers
	LargeShare float64
	Width, Gap float64
	Solves     int
	Iterations int
	Certified  bool
	Advised    bool
}

// Dimension is the intrinsic dimension of the points.
type Dimension struct {
	Value, Low, High float64
	Columns          int
	Note             string
}

// Window is the admissible window at one p.
type Window struct {
	P             float64
	NeighborsLow  float64
	NeighborsHigh float64
	BandwidthLow  float64
	BandwidthHigh float64
	Inside        bool
	Reasons       []string
}

// Graph is the graph's health.
type Graph struct {
	Vertices, Edges, Components         int
	UnlabelledParts, UnlabelledRows     int
	BridgedParts                        int
	MinDegree, MedianDegree, MaxDegree  int
	LogWeightLow, LogWeightHigh, Recall float64
	Search                              string // "" for a given graph
}

// Solve is one solve's certificate.
type Solve struct {
	What      string
	Component int
	Status    string
	Gap, Imbalance, Width,
	SlopeImbalance float64
	LinearSolves, Iterations int
}

// Warning is something that did not stop the run.
type Warning struct{ Code, Text string }

// File is an input or output.
type File struct {
	Role, Name string
	Bytes      int64
	SHA256     string
}

//go:embed templates
var templates embed.FS

var pages = template.Must(template.New("").Funcs(template.FuncMap{
	"count": count, "figure": figure, "percent": percent, "power": power, "key": keyOf, "file": fileText, "seq": seq,
}).ParseFS(templates, "templates/*.html"))

// Write draws a run. It fails where the slices of Answers or Map differ in length, or w does.
func Write(w io.Writer, r *Run) error {
	if err := r.validate(); err != nil {
		return err
	}
	return render(w, "run.html", newRunPage(r))
}

func render(w io.Writer, name string, page any) error {
	b := bufio.NewWriterSize(w, 1<<16)
	if err := pages.ExecuteTemplate(b, name, page); err != nil {
		return err
	}
	return b.Flush()
}

func (r *Run) validate() error {
	a, n := &r.Answers, len(r.Answers.Origin)
	for _, s := range []struct {
		what string
		n    int
	}{{"classes", len(a.Class)}, {"values", len(a.Value)}, {"confidences", len(a.Confidence)}, {"set sizes", len(a.SetSize)}, {"lower ends", len(a.Low)}, {"upper ends", len(a.High)}} {
		if s.n != 0 && s.n != n {
			return fmt.Errorf("%d %s for %d rows", s.n, s.what, n)
		}
	}
	for row, c := range a.Class {
		if int(c) >= len(r.Names) || c < 0 && (a.Origin[row] != Abstained && a.Origin[row] != Blank) {
			return fmt.Errorf("row %d: class %d of %d", row, c, len(r.Names))
		}
	}
	if (r.Task == Classes) != (a.Class != nil) || (r.Task == Numbers) != (a.Value != nil) {
		return fmt.Errorf("answers are not of task %q", r.Task)
	}
	return r.Map.validate(r.Task, len(r.Names))
}

func (m *Map) validate(task Task, classes int) error {
	if m == nil {
		return nil
	}
	n := len(m.X)
	if len(m.Y) != n || len(m.Given) != n || len(m.Origin) != n || len(m.Doubt) != n ||
		task == Classes && len(m.Class) != n || task == Numbers && len(m.Value) != n {
		return fmt.Errorf("the map's columns differ in length from its %d points", n)
	}
	for k, c := range m.Class {
		if int(c) >= classes {
			return fmt.Errorf("point %d of the map: class %d of %d", k, c, classes)
		}
	}
	return nil
}
