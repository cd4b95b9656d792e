// Package job runs the stages of each command in their order: read the table, encode its columns, build the graph,
// choose what was not given, solve, judge, and hand back columns, record and report. One function a command (Label,
// Check, Compare, ...) takes Options that the command line has already checked.
package job

import (
	"io"
	"math"
	"strconv"
	"time"

	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/points"
	"pinfill/internal/solve"
)

// Unreachable says what to do with components that hold no label.
type Unreachable string

// Ways to treat components without a label.
const (
	Bridge Unreachable = "bridge" // join each to the nearest labelled component
	Blank  Unreachable = "blank"  // leave their rows empty
	Stop   Unreachable = "stop"   // refuse
)

// Drawn says how the labelled rows were picked; what coverage promises rests on it.
type Drawn string

// Ways the labelled rows were picked.
const (
	DrawnRandom   Drawn = "random"
	DrawnPerClass Drawn = "per-class"
	DrawnChosen   Drawn = "chosen"
)

// Options hold what a user asked for. Zero values that mean "choose from the data" are said so.
type Options struct {
	// Input.
	Table      string // path, or "-" for standard input
	Stdin      io.Reader
	Label      string   // label column
	ID         string   // id column, or ""
	LabelsFile string   // second table with labels, joined on the id, or ""
	Features   []string // names or patterns; empty means every numeric column
	Ignore     []string
	Task       encode.Task // encode.TaskAuto decides by content
	NA         []string
	Delimiter  byte // 0 means by the file's name
	Decimal    byte // '.' or ','
	NoHeader   bool
	Missing    encode.Missing
	Conflicts  encode.Conflicts
	Strict     bool // class names that differ by case, space or composition are an error
	Group      string
	Cost       string // column of what labelling a row costs; next only
	MaxField   int    // longest cell, bytes; 0 means the reader's default
	MaxColumns int    // most columns; 0 means the reader's default

	// Graph.
	Scale       points.Scale
	Metric      points.Metric
	Neighbors   []int   // empty means choose
	Radius      float64 // 0 means none
	Kernels     []graph.Kernel
	Bandwidths  []graph.Bandwidth // empty means choose
	Edges       string
	Unreachable Unreachable
	Search      string // exact, approximate, auto

	// Model.
	P             []float64 // empty means choose; +Inf allowed
	Energy        solve.Energy
	Tether        float64 // 0 means labels are held exactly
	Tolerance     float64 // 0 means the solver's default
	Balance       encode.Balance
	AllowConstant bool

	// Trust.
	Coverage    float64 // 0 < Coverage < 1
	Abstain     float64 // rows whose confidence is below it are left empty; 0 means none
	AbstainRate float64 // share of the least sure rows to leave empty; 0 means none
	Drawn       Drawn

	// Output.
	Output            string // path, or "-" for standard output
	Stdout            io.Writer
	Record            string
	Report            string
	Model             string
	Timings           string
	Deps              string
	Scores            bool
	InPlace           bool
	SpreadsheetSafe   bool
	AcceptUncertified bool
	SolveOn           int

	// Run.
	Workers     int
	Seed        uint64
	TimeLimit   time.Duration
	MemoryLimit int64                             // bytes; 0 means none
	Flags       map[string]string                 // flags as typed, for the record
	Warn        func(encode.Warning)              // called for each warning, in order
	Note        func(line string)                 // summary lines; nil when quiet
	Progress    func(stage string, share float64) // may be nil
}

// PText writes p as the record and the columns show it.
func PText(p float64) string {
	if math.IsInf(p, 1) {
		return "inf"
	}
	return strconv.FormatFloat(p, 'g', -1, 64)
}
