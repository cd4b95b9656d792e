package job

import (
	"bytes"
	"context"
	"crypto/sha256"
	"fmt"
	"slices"

	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// Repeat runs a recorded label job again and says whether the bytes agree: first those of the inputs, then those of
// the completed table. With -o the table is written as well, once it is known to agree. A difference is an error.
func Repeat(ctx context.Context, o *Options, rec *Record, path string) error {
	if rec.Command != "label" {
		return fault.Usagef("P09", "%s records pinfill %s; --repeat repeats label", fault.Name(path), rec.Command)
	}
	if o.SolveOn > 0 {
		return fault.Usagef("P09", "%s records a run with --solve-on, which --repeat does not do; run its flags again: the same bytes come out", fault.Name(path))
	}
	r, ctx, cancel := start(ctx, o)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	l, err := r.label(ctx)
	if err != nil {
		return err
	}
	for _, in := range l.data.inputs {
		i := slices.IndexFunc(rec.Inputs, func(f FileSum) bool { return f.Role == in.Role })
		if i < 0 || rec.Inputs[i].SHA256 != in.SHA256 {
			return &fault.Error{Exit: fault.Input, File: in.Name, Message: "differs from the recorded run's " + in.Role + ": other bytes", Hint: "give the file that " + fault.Name(path) + " speaks of"}
		}
	}
	var b bytes.Buffer
	if err := table.WriteAppended(&b, l.data.table, r.columns(l)); err != nil {
		return err
	}
	sum := fmt.Sprintf("%x", sha256.Sum256(b.Bytes()))
	i := slices.IndexFunc(rec.Outputs, func(f FileSum) bool { return f.Role == "table" })
	if i < 0 {
		return &fault.Error{Exit: fault.Input, File: path, Message: "records no completed table to compare with"}
	}
	if want := rec.Outputs[i].SHA256; sum != want {
		what := "the program is the same version"
		if rec.Version != Version || !slices.Equal(rec.Modules, modules()) {
			what = "it was written by version " + rec.Version + " with other modules"
		}
		return &fault.Error{Exit: fault.Uncertified, File: path, Message: fmt.Sprintf("the repeated table has other bytes (%s..., recorded %s...); %s", sum[:12], want[:12], what)}
	}
	r.note("the repeated run agrees with %s byte for byte: %s", path, sum)
	return r.writeLabel(ctx, w, l)
}
