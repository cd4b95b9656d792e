package cli

import (
	"math"
	"sort"
	"strconv"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/graph"
	"pinfill/internal/job"
	"pinfill/internal/points"
	"pinfill/internal/solve"
)

// defaults are the options of a command line without flags.
func (a *app) defaults() *job.Options {
	return &job.Options{
		Stdin: a.in, Stdout: a.out,
		Decimal: '.', Missing: encode.MissingStop, Conflicts: encode.ConflictsStop,
		Scale: points.Standard, Metric: points.Euclidean, Unreachable: job.Bridge, Search: "auto",
		Energy: solve.Slope, Balance: encode.Balance{Mode: "auto"},
		Coverage: 0.9, Drawn: job.DrawnRandom,
		Seed: 20,
	}
}

// inputFlags say how the table is read and which columns are what.
func inputFlags(f *flags, o *job.Options) {
	f.under("Table")
	f.text(&o.Label, "label", "", "COL", "label column; an empty cell is a row to label")
	f.text(&o.ID, "id", "", "COL", "column with a name for each row; kept out of the features")
	f.text(&o.LabelsFile, "labels", "", "FILE", "second table that holds the labels, joined on the id")
	f.list(&o.Features, "features", "COLS", "feature columns, names or * patterns with commas between (default every numeric column)")
	f.list(&o.Ignore, "ignore", "COLS", "columns to leave out, names or * patterns")
	oneOf(f, &o.Task, "task", "what the labels are; by content when not given, but whole numbers need it", encode.Classes, encode.Numbers)
	oneOf(f, &o.Missing, "missing", "what to do with a missing feature: stop, put the median, or drop the row from the graph", encode.MissingStop, encode.MissingMedian, encode.MissingDrop)
	oneOf(f, &o.Conflicts, "conflicts", "what to do with identical rows whose labels differ", encode.ConflictsStop, encode.ConflictsMajority, encode.ConflictsMean)
	f.bool(&o.Strict, "strict", "refuse class names that differ only in case, spaces or accents")
	f.text(&o.Group, "group", "", "COL", "column of rows that must stay together when labels are left out (a transect, a recording)")
	dialectFlags(f, o)
}

// dialectFlags say how text becomes cells.
func dialectFlags(f *flags, o *job.Options) {
	f.list(&o.NA, "na", "LIST", "texts that mean a missing value, beside the empty cell")
	f.char(&o.Delimiter, "delimiter", "character between cells (default comma, tab for .tsv)", "")
	f.char(&o.Decimal, "decimal", "decimal mark, . or , (default .)", ".,")
	f.bool(&o.NoHeader, "no-header", "the first line is data; columns are named 1, 2, 3")
	f.count(&o.MaxField, "max-field", "BYTES", "16777216", "longest cell allowed", "P08", 1)
	f.count(&o.MaxColumns, "max-columns", "N", "100000", "most columns allowed", "P08", 1)
}

// graphFlags say how the neighbour graph is built.
func graphFlags(f *flags, o *job.Options) {
	f.under("Graph")
	oneOf(f, &o.Scale, "scale", "how columns are made comparable: standard deviation, interquartile range, range, or not", points.Standard, points.Robust, points.Range, points.None)
	oneOf(f, &o.Metric, "metric", "distance between rows", points.Euclidean, points.Manhattan, points.Cosine)
	f.add("neighbors", "", "K|auto", "auto", "neighbours a row is joined to; a list in compare", func(s string) error {
		o.Neighbors = nil
		return eachOrAuto(s, func(t string) error {
			k, err := strconv.Atoi(t)
			if err != nil || k < 1 || k > math.MaxInt32 {
				return fault.Usagef("P08", "flag --neighbors: value %s: a whole number from 1 up, or auto", fault.Quote(t))
			}
			o.Neighbors = append(o.Neighbors, k)
			return nil
		})
	})
	f.number(&o.Radius, "radius", "R", "none", "join every pair within this distance, in scaled units, instead of nearest neighbours", "P06", "a distance greater than 0", func(v float64) bool { return v > 0 })
	f.add("kernel", "", "NAME", "gaussian", "weight as a function of distance: gaussian, exponential, epanechnikov, box or inverse", func(s string) error {
		o.Kernels = nil
		for t := range strings.SplitSeq(s, ",") {
			k, err := graph.ParseKernel(t)
			if err != nil {
				return fault.Usagef("P09", "flag --kernel: %v", err)
			}
			o.Kernels = append(o.Kernels, k)
		}
		return nil
	})
	f.add("bandwidth", "", "H|local|auto", "auto", "kernel width: a number in scaled units, local (each pair's own), or auto", func(s string) error {
		o.Bandwidths = nil
		return eachOrAuto(s, func(t string) error {
			b, err := parseBandwidth(t)
			if err != nil {
				return fault.Usagef("P06", "flag --bandwidth: value %s: a number greater than 0, local, or auto", fault.Quote(t))
			}
			o.Bandwidths = append(o.Bandwidths, b)
			return nil
		})
	})
	f.text(&o.Edges, "edges", "", "FILE", "use this graph, a table with columns from,to,weight and ids as in --id, instead of building one")
	oneOf(f, &o.Unreachable, "unreachable", "components without a label: join to the nearest labelled one, leave blank, or refuse", job.Bridge, job.Blank, job.Stop)
	oneOf(f, &o.Search, "search", "neighbour search; auto is exact unless that would take too long, and says so", "exact", "approximate", "auto")
}

// modelFlags say what is minimised.
func modelFlags(f *flags, o *job.Options) {
	f.under("Model")
	f.add("p", "", "P|inf|auto", "auto", "power of the energy: a number greater than 1, inf, or auto; a list in compare", func(s string) error {
		o.P = nil
		return eachOrAuto(s, func(t string) error {
			p, err := parseP(t)
			if err != nil {
				return err
			}
			o.P = append(o.P, p)
			return nil
		})
	})
	words(f, &o.Energy, "energy", "slope", "how the weight w enters: slope sums (w|df|)^p, conductance sums w|df|^p", map[string]solve.Energy{"slope": solve.Slope, "conductance": solve.Conductance})
	f.number(&o.Tether, "tether", "T", "none", "tie labels to their rows by an edge of this weight instead of holding them exactly", "P06", "a weight greater than 0", func(v float64) bool { return v > 0 })
	f.number(&o.Tolerance, "tolerance", "T", "1e-9", "largest distance from the true minimiser that counts as certified, as a share of the label range", "P09", "a number between 1e-13 and 0.1", func(v float64) bool { return v >= 1e-13 && v <= 0.1 })
	f.add("balance", "", "MODE", "auto", "class shares expected among unlabelled rows: uniform, labels, none, auto, or CLASS=SHARE,...", func(s string) error {
		b, err := parseBalance(s)
		o.Balance = b
		return err
	})
	f.bool(&o.AllowConstant, "allow-constant", "accept labels that are all the same")
}

// trustFlags say what is promised about each row.
func trustFlags(f *flags, o *job.Options) {
	f.under("Trust")
	share := func(v float64) bool { return v > 0 && v < 1 }
	f.number(&o.Coverage, "coverage", "SHARE", "0.9", "share of rows whose set or interval should hold the truth", "P09", "a share between 0 and 1", share)
	f.number(&o.Abstain, "abstain", "T", "none", "leave rows empty whose confidence is below T", "P09", "a share between 0 and 1", share)
	f.number(&o.AbstainRate, "abstain-rate", "S", "none", "leave the least sure share S of rows empty", "P09", "a share between 0 and 1", share)
	oneOf(f, &o.Drawn, "drawn", "how the labelled rows were picked; what coverage rests on", job.DrawnRandom, job.DrawnPerClass, job.DrawnChosen)
}

// runFlags say how the machine is used. verbosity is set apart as it never reaches the job.
func (a *app) runFlags(f *flags, o *job.Options, v *verbosity) {
	f.under("Run")
	f.count(&o.Workers, "workers", "N", "all cores", "workers; the answer does not depend on it", "P08", 1)
	f.seed(&o.Seed, "seed", "seed of every draw")
	f.duration(&o.TimeLimit, "time-limit", "stop with exit 6 after this time, in seconds or like 10m")
	f.bytes(&o.MemoryLimit, "memory-limit", "stop with exit 6 before using more, like 4G")
	f.text(&o.Timings, "timings", "", "FILE", "write a CSV of stage, seconds, peak_bytes")
	f.bool(&v.quiet, "quiet", "nothing on standard error but errors")
	f.bool(&v.verbose, "verbose", "say more on standard error")
	oneOf(f, &v.progress, "progress", "progress line on standard error", "auto", "always", "never")
}

// words takes one of the keys of a map.
func words[T any](f *flags, p *T, name, def, usage string, values map[string]T) {
	keys := make([]string, 0, len(values))
	for k := range values {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	f.add(name, "", strings.Join(keys, "|"), def, usage, func(s string) error {
		v, ok := values[s]
		if !ok {
			return fault.Usagef("P09", "flag --%s: value %s: use one of %s%s", name, fault.Quote(s), strings.Join(keys, ", "), nearest(s, keys))
		}
		*p = v
		return nil
	})
}

// eachOrAuto calls take for each comma-separated part, or not at all for "auto".
func eachOrAuto(s string, take func(string) error) error {
	if s == "auto" {
		return nil
	}
	for t := range strings.SplitSeq(s, ",") {
		if err := take(t); err != nil {
			return err
		}
	}
	return nil
}

// parseP reads a power: a number greater than 1, or inf.
func parseP(s string) (float64, error) {
	switch s {
	case "inf", "Inf", "infinity", "Infinity":
		return math.Inf(1), nil
	}
	p, err := parseFinite(s)
	switch {
	case err != nil:
		return 0, fault.Usagef("P01", "flag --p: value %s: a number greater than 1, inf, or auto", fault.Quote(s))
	case p == 1:
		return 0, fault.Usagef("P02", "flag --p: value %s: at p = 1 the minimiser is not unique; use a number greater than 1", fault.Quote(s))
	case !(p > 1):
		return 0, fault.Usagef("P01", "flag --p: value %s: p must be greater than 1", fault.Quote(s))
	}
	return p, nil
}

// parseBalance reads a mode or CLASS=SHARE,... whose shares are made to sum to 1.
func parseBalance(s string) (encode.Balance, error) {
	switch s {
	case "auto", "uniform", "labels", "none":
		return encode.Balance{Mode: s}, nil
	}
	b := encode.Balance{Mode: "shares", Shares: map[string]float64{}}
	for _, part := range splitList(s) {
		i := strings.LastIndexByte(part, '=')
		if i < 0 {
			return b, fault.Usagef("P09", "flag --balance: value %s: uniform, labels, none, auto, or CLASS=SHARE,...", fault.Quote(s))
		}
		v, err := parseFinite(part[i+1:])
		if err != nil || !(v > 0) {
			return b, fault.Usagef("P09", "flag --balance: value %s: a share greater than 0", fault.Quote(part))
		}
		if _, twice := b.Shares[part[:i]]; twice {
			return b, fault.Usagef("P09", "flag --balance: class %s is given twice", fault.Quote(part[:i]))
		}
		b.Shares[part[:i]] = v
	}
	return b, nil
}

// parseBandwidth reads a number greater than 0 or the word local.
func parseBandwidth(s string) (graph.Bandwidth, error) {
	if s == "local" {
		return graph.Bandwidth{Local: true, H: 1}, nil
	}
	h, err := parseFinite(s)
	if err != nil {
		return graph.Bandwidth{}, err
	}
	b := graph.Bandwidth{H: h}
	return b, b.Validate()
}
