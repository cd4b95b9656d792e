// Study measures what the choice of p, bandwidth and balance is worth: on open and generated tables, over seeded draws
// of the labels, against every fixed p in hindsight and against a hand-written linear solve. It rewrites the part of
// docs/choosing-p.md between its markers and the two pictures beside it.
//
//	go run ./internal/choose/study -draws 30
package main

import (
	"context"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
)

func main() {
	draws := flag.Int("draws", 30, "draws of the labels for each table and rate")
	large := flag.Int("large", 10, "draws for tables of more than 1,000 rows")
	held := flag.Uint64("held", 0, "number of a held-back suite of generated tables; 0 is the study's own")
	only := flag.String("only", "", "tables whose name holds this")
	tables := flag.String("open", "testdata/open", "folder of the open tables")
	docs := flag.String("docs", "", "folder of choosing-p.md to rewrite; empty prints the tables")
	flag.Parse()
	if err := run(context.Background(), *draws, *large, *held, *only, *tables, *docs); err != nil {
		fmt.Fprintln(os.Stderr, "study:", err)
		os.Exit(1)
	}
}

func run(ctx context.Context, draws, large int, held uint64, only, tables, docs string) error {
	classes, err := classTables(tables, held)
	if err != nil {
		return err
	}
	var text strings.Builder
	cs, err := studyClasses(ctx, pick(classes, only), draws, large)
	if err != nil {
		return err
	}
	ns, err := studyNumbers(ctx, pick(numberTables(held), only), draws)
	if err != nil {
		return err
	}
	cs.write(&text)
	ns.write(&text)
	if docs == "" {
		fmt.Print(text.String())
		return nil
	}
	if err := os.WriteFile(filepath.Join(docs, "choosing-p-classes.svg"), cs.picture(), 0o644); err != nil {
		return err
	}
	if err := os.WriteFile(filepath.Join(docs, "choosing-p-numbers.svg"), ns.picture(), 0o644); err != nil {
		return err
	}
	return replace(filepath.Join(docs, "choosing-p.md"), text.String())
}

const (
	begin = "<!-- figures: written by make study -->\n"
	end   = "<!-- end of figures -->\n"
)

// replace puts text between the markers of a document.
func replace(path, text string) error {
	old, err := os.ReadFile(path)
	if err != nil {
		return err
	}
	head, rest, ok := strings.Cut(string(old), begin)
	_, tail, ok2 := strings.Cut(rest, end)
	if !ok || !ok2 {
		return fmt.Errorf("%s has no markers for the figures", path)
	}
	return os.WriteFile(path, []byte(head+begin+text+end+tail), 0o644)
}

func pick(all []*table, only string) []*table {
	var some []*table
	for _, t := range all {
		if strings.Contains(t.name, only) {
			some = append(some, t)
		}
	}
	return some
}
