package cli

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"pinfill/internal/fault"
)

// allowed are the exit codes that a user may bring about. 2 is the Go runtime's, 70 is a defect.
var allowed = []int{fault.OK, fault.Input, fault.File, fault.Uncertified, fault.Limit, fault.Usage}

// called runs one command line in dir and holds it to what every run owes: an allowed exit code, one clean line a
// message, and no output beside a refusal.
func called(t *testing.T, dir, in string, args []string) (code int, out string) {
	t.Helper()
	if dir != "" {
		was, err := os.Getwd()
		if err != nil {
			t.Fatal(err)
		}
		if err := os.Chdir(dir); err != nil {
			t.Fatal(err)
		}
		defer func() {
			if err := os.Chdir(was); err != nil {
				t.Fatal(err)
			}
		}()
	}
	var stdout, stderr bytes.Buffer
	code = run(args, streams{in: strings.NewReader(in), out: &stdout, err: &stderr})
	switch {
	case !slices.Contains(allowed, code):
		t.Fatalf("%q: exit %d: %s", args, code, stderr.String())
	case code != fault.OK && stdout.Len() > 0:
		t.Fatalf("%q: exit %d, yet %q on standard output", args, code, stdout.String())
	case code != fault.OK && !strings.HasPrefix(stderr.String(), "pinfill: "):
		t.Fatalf("%q: exit %d without a message: %q", args, code, stderr.String())
	case strings.ContainsAny(stderr.String(), "\x00\x1b\r"):
		t.Fatalf("%q: control characters on standard error: %q", args, stderr.String())
	}
	return code, stdout.String()
}

const tiny = "id,x,y,kind\na,0,0,mud\nb,1,0,\nc,0,1,\nd,9,9,sand\ne,9,8,\nf,8,9,\n"

// FuzzArguments runs any command line over small tables: one argument a line of the input.
func FuzzArguments(f *testing.F) {
	for _, line := range []string{
		"", "--help", "version", "label", "label t.csv", "label t.csv --label kind -o -", "help label", "lable",
		"check t.csv --label kind --id id", "label - --label=kind -o out.csv --record r.json --report r.html --model m",
		"compare t.csv --label kind --p 2,inf --neighbors 2,3 -o -", "next t.csv --label kind --id id --count 2 -o -",
		"audit t.csv --label kind -o -", "graph t.csv --label kind --id id -o -", "assess t.csv --truth kind --id id",
		"label t.csv --label kind --p 1 -o -", "label t.csv --label kind --p 3 --scores --coverage 0.8 --quiet -o -",
		"label t.csv --label kind --balance mud=1,sand=2 --tether 0.5 --unreachable blank -o -", "extend m t.csv -o -",
		"label t.csv --label kind --edges edges.csv --id id -o -", "label t.csv --labels labels.csv --label kind --id id -o -",
		"label t.csv --label kind --bandwidth local --kernel box --metric cosine --scale none --search approximate -o -",
		"label t.csv --label kind --workers 99999999999999999999 -o -", "label t.csv --label kind --neighbors 2147483647 -o -",
		"label t.csv --label kind --memory-limit 1k --time-limit 1ms -o -", "label t.csv --label kind --repeat r.json -o -",
		"__complete label --p", "completion bash", "label t.csv --label kind --solve-on 3 --abstain-rate 0.5 -o -",
	} {
		f.Add(strings.ReplaceAll(line, " ", "\n"))
	}
	dir := f.TempDir()
	fixtures := map[string]string{
		"t.csv": tiny, "labels.csv": "id,kind\na,mud\nd,sand\n", "edges.csv": "from,to,weight\na,b,1\nb,c,1\nc,d,2\nd,e,1\ne,f,1\n",
	}
	f.Fuzz(func(t *testing.T, text string) {
		args := strings.Split(text, "\n")
		// Nothing outside the directory is written, and the demo's three tables are not written a thousand times.
		if strings.ContainsAny(text, "/\x00") || strings.Contains(text, "..") || args[0] == "demo" || len(text) > 400 {
			return
		}
		for name, content := range fixtures {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o666); err != nil {
				t.Fatal(err)
			}
		}
		code, _ := called(t, dir, tiny, args)
		if code != fault.OK {
			return
		}
		entries, err := os.ReadDir(dir)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range entries {
			if fixtures[e.Name()] == "" {
				if err := os.RemoveAll(filepath.Join(dir, e.Name())); err != nil {
					t.Fatal(err)
				}
			}
		}
	})
}

// FuzzLabel labels any small table. Where the run succeeds the record is JSON, and every line of the output begins with
// the line of the input.
func FuzzLabel(f *testing.F) {
	f.Add(tiny, uint16(0))
	f.Add(strings.ReplaceAll(tiny, "\n", "\r\n"), uint16(1))
	f.Add("x,kind\n0,1.5\n1,\n2,\n3,2.5\n4,\n", uint16(2))
	f.Add("x,kind\n1,a\n1,\n1,b\n1,a\n", uint16(0xff))
	f.Add("x,kind\n1,a\n1e308,b\n-1e308,\n0,\n", uint16(0x1234))
	f.Add("x;kind\n1,5;a\n2;b\n3;", uint16(3))
	f.Add("\"x\n\",kind\n1,\"a\"\"\"\n2,b\n\n3,\"\"", uint16(4))
	f.Add("id,x,kind\n\"a\n\",,é\nb,2,\nc,3,e\nd,4,", uint16(0x4f))
	rng := rand.New(rand.NewPCG(5, 8))
	var many strings.Builder
	many.WriteString("x,y,kind\n")
	for i := range 24 {
		fmt.Fprintf(&many, "%.3f,%.3f,%s\n", rng.Float64(), rng.Float64(), []string{"a", "b", "", "", ""}[i%5])
	}
	f.Add(many.String(), uint16(0x80))
	dir := f.TempDir()
	f.Fuzz(func(t *testing.T, text string, how uint16) {
		if len(text) > 1000 {
			return
		}
		record := filepath.Join(dir, "record.json")
		pick := func(words ...string) string {
			w := words[int(how)%len(words)]
			how /= uint16(len(words))
			return w
		}
		args := []string{
			"label", "-", "--label", "kind", "--workers", "1", "-o", "-", "--record", record,
			"--p", pick("3", "2", "inf", "1.5", "auto"), "--neighbors", pick("2", "auto"), "--unreachable", pick("bridge", "blank", "stop"),
			"--missing", pick("stop", "median", "drop"), "--conflicts", pick("stop", "majority"), "--scale", pick("standard", "robust", "range", "none"),
			"--scores=" + pick("false", "true"), "--allow-constant=" + pick("false", "true"),
		}
		code, out := called(t, "", text, args)
		if code != fault.OK {
			return
		}
		b, err := os.ReadFile(record)
		if err != nil || !json.Valid(b) {
			t.Fatalf("%q: the record is no JSON (%v): %s", text, err, b)
		}
		begins(t, text, out)
	})
}

// begins checks that the output is the input with bytes added at the ends of records only.
func begins(t *testing.T, in, out string) {
	if in[0] >= 0xf0 || in[0] == 0x1f || in[0] == 0x28 { // packed or UTF-16: unpacked on the way
		return
	}
	if _, err := csv.NewReader(strings.NewReader(in)).ReadAll(); err != nil {
		return // quotes within bare cells, which records does not know
	}
	was, is := records(in), records(out)
	if len(was) != len(is) {
		t.Fatalf("%q: %d records became %d: %q", in, len(was), len(is), out)
	}
	for i, w := range was {
		w, end := body(w)
		if s, e := body(is[i]); !strings.HasPrefix(s, w) || e != end {
			t.Fatalf("record %d, %q, became %q", i, w+end, is[i])
		}
	}
}

// records splits at the line ends outside quotes; each keeps its line end.
func records(text string) []string {
	var out []string
	start, quoted := 0, false
	for i, b := range []byte(text) {
		switch {
		case b == '"':
			quoted = !quoted
		case b == '\n' && !quoted:
			out = append(out, text[start:i+1])
			start = i + 1
		}
	}
	if start < len(text) {
		out = append(out, text[start:])
	}
	return out
}

func body(record string) (text, end string) {
	text = strings.TrimRight(record, "\r\n")
	return text, record[len(text):]
}
