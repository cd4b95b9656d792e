package job

import (
	"context"
	"os"
	"path/filepath"

	"pinfill/internal/demo"
	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// Demo writes the demo tables into dir, which it makes if need be. All of them appear, or none.
func Demo(ctx context.Context, dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return &fault.Error{Exit: fault.File, Code: "S01", File: dir, Message: "cannot make the folder: " + reason(err), Err: err}
	}
	var outs table.Outputs
	defer outs.Abort()
	for _, f := range demo.Files(demo.Seed) {
		w, err := outs.Create(filepath.Join(dir, f.Name))
		if err != nil {
			return err
		}
		if _, err := w.Write(f.Data); err != nil {
			return err
		}
		if err := stopped(ctx); err != nil {
			return err
		}
	}
	return outs.Commit()
}
