package job

import (
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

// Every field of the run record stands in docs/file-format.md.
func TestRecordIsDocumented(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "docs", "file-format.md"))
	if err != nil {
		t.Fatal(err)
	}
	seen := map[reflect.Type]bool{}
	fields := 0
	var walk func(reflect.Type)
	walk = func(typ reflect.Type) {
		for typ.Kind() == reflect.Pointer || typ.Kind() == reflect.Slice {
			typ = typ.Elem()
		}
		if typ.Kind() != reflect.Struct || seen[typ] {
			return
		}
		seen[typ] = true
		for i := range typ.NumField() {
			f := typ.Field(i)
			name, _, _ := strings.Cut(f.Tag.Get("json"), ",")
			if f.IsExported() && name != "" && name != "-" {
				fields++
				if !strings.Contains(string(text), "`"+name+"`") {
					t.Errorf("docs/file-format.md does not name %s of %v", name, typ)
				}
			}
			walk(f.Type)
		}
	}
	walk(reflect.TypeFor[Record]())
	if fields < 50 {
		t.Errorf("only %d fields found", fields)
	}
}

// Every column that compare writes stands there too.
func TestComparisonIsDocumented(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "docs", "file-format.md"))
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range compareHead {
		if !strings.Contains(string(text), "`"+name+"`") {
			t.Errorf("docs/file-format.md does not name the column %s", name)
		}
	}
}
