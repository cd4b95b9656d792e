package job

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"os"
	"runtime/debug"
	"slices"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
)

// recordFormat is the version of the record's layout; it changes when a field changes its meaning.
const recordFormat = 1

// Number is a float64 that JSON can always hold: not-a-number is null, infinities are "inf" and "-inf".
type Number float64

// MarshalJSON writes the number.
func (v Number) MarshalJSON() ([]byte, error) {
	f := float64(v)
	switch {
	case math.IsNaN(f):
		return []byte("null"), nil
	case math.IsInf(f, 0):
		return []byte(`"` + string(encode.AppendNumber(nil, f)) + `"`), nil
	}
	return encode.AppendNumber(nil, f), nil
}

// UnmarshalJSON reads what MarshalJSON writes.
func (v *Number) UnmarshalJSON(b []byte) error {
	switch string(b) {
	case "null":
		*v = Number(math.NaN())
	case `"inf"`:
		*v = Number(math.Inf(1))
	case `"-inf"`:
		*v = Number(math.Inf(-1))
	default:
		var f float64
		if err := json.Unmarshal(b, &f); err != nil {
			return err
		}
		*v = Number(f)
	}
	return nil
}

// Record says everything from which a run can be repeated and defended. It holds no clock time, no host name and no
// path but the user's own words, so that two runs of one job give the same bytes.
type Record struct {
	Program  string            `json:"program"`
	Version  string            `json:"version"`
	Modules  []string          `json:"modules"`
	Format   int               `json:"format"`
	Command  string            `json:"command"`
	Flags    map[string]string `json:"flags"` // as typed, without those that name files to write or use of the machine
	Inputs   []FileSum         `json:"inputs"`
	Table    TableFigures      `json:"table"`
	Settings Settings          `json:"settings"`
	Choice   *ChoiceFigures    `json:"choice,omitempty"`
	Graph    GraphFigures      `json:"graph"`
	Solves   []SolveFigures    `json:"solves"`
	Trust    *TrustFigures     `json:"trust,omitempty"`
	Fewer    *FewerFigures     `json:"solve_on,omitempty"`
	Result   ResultFigures     `json:"result"`
	Warnings []encode.Warning  `json:"warnings"`
	Caution  string            `json:"caution"`
	Outputs  []FileSum         `json:"outputs"`
}

// Caution stands in every record and report.
const Caution = "The labels are estimates computed from the given labels and features, for review by a qualified person; they are never measurements. " +
	"Where they can bear on people's safety or money, local codes and the judgement of licensed practitioners come first."

// FileSum is a file's size and checksum; Name is what the user typed.
type FileSum struct {
	Role   string `json:"role"`
	Name   string `json:"name"`
	Bytes  int64  `json:"bytes"`
	SHA256 string `json:"sha256"`
}

// TableFigures say what was read.
type TableFigures struct {
	Rows     int          `json:"rows"`
	Columns  int          `json:"columns"`
	Vertices int          `json:"vertices"` // distinct points
	Labelled int          `json:"labelled"`
	Memory   int64        `json:"memory_estimate_bytes,omitempty"`
	Task     string       `json:"task"`
	Features []string     `json:"features,omitempty"`
	Dropped  []string     `json:"constant_columns,omitempty"`
	Classes  []ClassCount `json:"classes,omitempty"`
	Low      *Number      `json:"lowest_label,omitempty"`
	High     *Number      `json:"highest_label,omitempty"`
}

// ClassCount is a class and a number of rows.
type ClassCount struct {
	Class string `json:"class"`
	Rows  int    `json:"rows"`
}

// Settings are what the run used, given or chosen.
type Settings struct {
	P           Number `json:"p"`
	Energy      string `json:"energy"`
	Neighbors   int    `json:"neighbors,omitempty"`
	Radius      Number `json:"radius,omitempty"`
	Kernel      string `json:"kernel,omitempty"`
	Bandwidth   string `json:"bandwidth,omitempty"`
	Balance     string `json:"balance,omitempty"`
	Scale       string `json:"scale,omitempty"`
	Metric      string `json:"metric,omitempty"`
	Tether      Number `json:"tether,omitempty"`
	Unreachable string `json:"unreachable"`
	Coverage    Number `json:"coverage"`
	Drawn       string `json:"drawn"`
	Tolerance   Number `json:"tolerance"`
	Seed        uint64 `json:"seed"`
	SolveOn     int    `json:"solve_on,omitempty"`
}

// GraphFigures are the graph's health.
type GraphFigures struct {
	Vertices        int    `json:"vertices"`
	Edges           int    `json:"edges"`
	Components      int    `json:"components"`
	UnlabelledParts int    `json:"components_without_label"`
	UnlabelledRows  int    `json:"rows_without_label_in_reach"`
	BridgedParts    int    `json:"components_bridged"`
	MinDegree       int    `json:"min_degree"`
	MedianDegree    int    `json:"median_degree"`
	MaxDegree       int    `json:"max_degree"`
	LogWeightLow    Number `json:"ln_weight_low"`
	LogWeightHigh   Number `json:"ln_weight_high"`
	Search          string `json:"search,omitempty"`
	Recall          Number `json:"recall,omitempty"`
}

// SolveFigures are one solve's certificate and counts.
type SolveFigures struct {
	What           string `json:"what"` // class name, or the label column
	Component      int    `json:"component"`
	Status         string `json:"status"`
	Gap            Number `json:"gap"`
	Imbalance      Number `json:"imbalance"`
	Width          Number `json:"width"`
	SlopeImbalance Number `json:"slope_imbalance"`
	LinearSolves   int    `json:"linear_solves"`
	Iterations     int    `json:"iterations"`
	Newton         int    `json:"newton_steps"`
	Paths          int    `json:"paths"`

	missed bool
}

// ResultFigures count what came out.
type ResultFigures struct {
	Given     int          `json:"given"`
	Inferred  int          `json:"inferred"`
	Bridged   int          `json:"bridged"`
	Abstained int          `json:"abstained"`
	Blank     int          `json:"blank"`
	Classes   []ClassCount `json:"classes,omitempty"`
	Low       *Number      `json:"low,omitempty"`
	Median    *Number      `json:"median,omitempty"`
	High      *Number      `json:"high,omitempty"`
}

// encodeRecord writes the record as indented JSON with a final newline.
func encodeRecord(rec *Record) ([]byte, error) { return encodeJSON(rec) }

// encodeJSON writes v as every JSON output is written: indented, with names as they are, and a final newline.
func encodeJSON(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	err := e.Encode(v)
	return b.Bytes(), err
}

// ReadRecord reads a record written by an earlier run.
func ReadRecord(path string) (*Record, error) {
	b, err := os.ReadFile(path)
	if err != nil {
		return nil, &fault.Error{Exit: fault.File, Code: "S16", File: path, Message: "cannot read the record: " + reason(err), Err: err}
	}
	rec := &Record{}
	if err := json.Unmarshal(b, rec); err != nil {
		return nil, &fault.Error{Exit: fault.Input, File: path, Message: "not a run record: " + err.Error(), Err: err}
	}
	if rec.Program != "pinfill" || rec.Format != recordFormat {
		return nil, &fault.Error{Exit: fault.Input, File: path, Message: "not a run record of this version of pinfill"}
	}
	return rec, nil
}

// reason is the short cause of a file error, without the path it repeats.
func reason(err error) string {
	var p *os.PathError
	if errors.As(err, &p) {
		return p.Err.Error()
	}
	return err.Error()
}

// FlagNames are the recorded flags in order.
func (rec *Record) FlagNames() []string {
	names := make([]string, 0, len(rec.Flags))
	for name := range rec.Flags {
		names = append(names, name)
	}
	slices.Sort(names)
	return names
}

// modules lists what the binary was built from.
func modules() []string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return nil
	}
	out := []string{info.GoVersion}
	for _, m := range info.Deps {
		if strings.HasPrefix(m.Path, "gonum.org/") || strings.Contains(m.Path, "kdtree") {
			out = append(out, m.Path+" "+m.Version)
		}
	}
	return out
}
