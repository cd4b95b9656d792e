package extend

import (
	"archive/zip"
	"bytes"
	"testing"
)

// container is a model file with the given model.json and no arrays.
func container(tb testing.TB, manifest string) []byte {
	tb.Helper()
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	if err := store(z, modelName, []byte(manifest)); err != nil {
		tb.Fatal(err)
	}
	if err := z.Close(); err != nil {
		tb.Fatal(err)
	}
	return b.Bytes()
}
