package cli

import (
	"math"
	"sort"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"pinfill/internal/fault"
)

// flag is a command-line flag that refuses to be given twice and knows how to check its own text.
type flag struct {
	name, kind, def string
	text            string
	given           bool
	isBool          bool
	check           func(text string) error // parses and stores; runs when the flag is met
}

// Set is called by the flag library with the text typed.
func (f *flag) Set(text string) error {
	if f.given {
		return fault.Usagef("P09", "flag --%s is given twice", f.name)
	}
	f.given, f.text = true, text
	return f.check(text)
}

// String is the default shown in help.
func (f *flag) String() string {
	if f.given {
		return f.text
	}
	return f.def
}

// Type is the kind of value shown in help.
func (f *flag) Type() string { return f.kind }

// IsBoolFlag lets a switch stand without a value.
func (f *flag) IsBoolFlag() bool { return f.isBool }

// flags collects a command's flags under headings for its help.
type flags struct {
	cmd    *cobra.Command
	group  string
	groups []string
	byName map[string]string // flag name -> heading
	all    map[string]*flag
}

func (a *app) newFlags(cmd *cobra.Command) *flags {
	f := &flags{cmd: cmd, byName: map[string]string{}, all: map[string]*flag{}}
	cmd.Flags().SortFlags = false
	a.flags[cmd] = f
	return f
}

// under starts a heading.
func (f *flags) under(heading string) {
	f.group = heading
	f.groups = append(f.groups, heading)
}

// add registers one flag.
func (f *flags) add(name, short, kind, def, usage string, check func(string) error) *flag {
	v := &flag{name: name, kind: kind, def: def, check: check}
	f.register(v, short, usage)
	return v
}

func (f *flags) register(v *flag, short, usage string) *pflag.Flag {
	pf := f.cmd.Flags().VarPF(v, v.name, short, usage)
	if v.isBool {
		pf.NoOptDefVal = "true"
	}
	f.byName[v.name] = f.group
	f.all[v.name] = v
	return pf
}

// typed gives the flags that were given and how, for the record. Flags that say where things go or how the machine
// is used are not part of what makes a run the same run.
func (f *flags) typed(skip map[string]bool) map[string]string {
	out := map[string]string{}
	for name, v := range f.all {
		if v.given && !skip[name] {
			out[name] = v.text
		}
	}
	return out
}

// given reports whether a flag stands on the command line.
func (f *flags) given(name string) bool { v := f.all[name]; return v != nil && v.given }

// Text flags and switches.

func (f *flags) text(p *string, name, short, kind, usage string) {
	f.add(name, short, kind, *p, usage, func(s string) error { *p = s; return nil })
}

func (f *flags) bool(p *bool, name, usage string) {
	v := &flag{name: name, kind: "", def: "", isBool: true}
	v.check = func(s string) error {
		b, err := strconv.ParseBool(s)
		if err != nil {
			return fault.Usagef("P09", "flag --%s: value %s: not true or false", name, fault.Quote(s))
		}
		*p = b
		return nil
	}
	f.register(v, "", usage)
}

// list takes comma-separated texts; a comma inside a name is written \,.
func (f *flags) list(p *[]string, name, kind, usage string) {
	f.add(name, "", kind, "", usage, func(s string) error { *p = splitList(s); return nil })
}

func splitList(s string) []string {
	var out []string
	var b strings.Builder
	for i := 0; i < len(s); i++ {
		switch {
		case s[i] == '\\' && i+1 < len(s) && (s[i+1] == ',' || s[i+1] == '\\'):
			i++
			b.WriteByte(s[i])
		case s[i] == ',':
			out = append(out, b.String())
			b.Reset()
		default:
			b.WriteByte(s[i])
		}
	}
	return append(out, b.String())
}

// oneOf takes one of a few words.
func oneOf[T ~string](f *flags, p *T, name, usage string, words ...T) {
	texts := make([]string, len(words))
	for i, w := range words {
		texts[i] = string(w)
	}
	f.add(name, "", strings.Join(texts, "|"), string(*p), usage, func(s string) error {
		for _, w := range words {
			if string(w) == s {
				*p = w
				return nil
			}
		}
		return fault.Usagef("P09", "flag --%s: value %s: use one of %s%s", name, fault.Quote(s), strings.Join(texts, ", "), nearest(s, texts))
	})
	// Words complete themselves in the shell.
	_ = f.cmd.RegisterFlagCompletionFunc(name, cobra.FixedCompletions(texts, cobra.ShellCompDirectiveNoFileComp))
}

// number takes a finite number within limits; ok says which are allowed and want says so in words.
func (f *flags) number(p *float64, name, kind, def, usage, code, want string, ok func(float64) bool) {
	f.add(name, "", kind, def, usage, func(s string) error {
		v, err := parseFinite(s)
		if err != nil || !ok(v) {
			return fault.Usagef(code, "flag --%s: value %s: %s", name, fault.Quote(s), want)
		}
		*p = v
		return nil
	})
}

// parseFinite reads a plain decimal number: no hexadecimal, no underscores, no infinity.
func parseFinite(s string) (float64, error) {
	if strings.ContainsAny(s, "xX_pPnNiI") {
		return 0, strconv.ErrSyntax
	}
	v, err := strconv.ParseFloat(s, 64)
	if err == nil && math.IsInf(v, 0) {
		err = strconv.ErrRange
	}
	return v, err
}

func (f *flags) count(p *int, name, kind, def, usage, code string, least int) {
	f.add(name, "", kind, def, usage, func(s string) error {
		v, err := strconv.Atoi(s)
		if err != nil || v < least {
			return fault.Usagef(code, "flag --%s: value %s: a whole number from %d up", name, fault.Quote(s), least)
		}
		*p = v
		return nil
	})
}

func (f *flags) seed(p *uint64, name, usage string) {
	f.add(name, "", "N", strconv.FormatUint(*p, 10), usage, func(s string) error {
		v, err := strconv.ParseUint(s, 10, 64)
		if err != nil {
			return fault.Usagef("P08", "flag --%s: value %s: a whole number from 0 up", name, fault.Quote(s))
		}
		*p = v
		return nil
	})
}

// duration takes seconds as a number, or a Go duration such as 90s, 10m, 2h.
func (f *flags) duration(p *time.Duration, name, usage string) {
	f.add(name, "", "TIME", "none", usage, func(s string) error {
		if v, err := parseFinite(s); err == nil && v > 0 && v < 1e9 {
			*p = time.Duration(v * float64(time.Second))
			return nil
		}
		d, err := time.ParseDuration(s)
		if err != nil || d <= 0 {
			return fault.Usagef("P08", "flag --%s: value %s: seconds, or a time like 90s, 10m or 2h", name, fault.Quote(s))
		}
		*p = d
		return nil
	})
}

// bytes takes a number of bytes with an optional k, M, G or T (powers of 1024).
func (f *flags) bytes(p *int64, name, usage string) {
	f.add(name, "", "SIZE", "none", usage, func(s string) error {
		num, factor := strings.TrimSuffix(strings.TrimSuffix(s, "B"), "i"), 1.0
		if n := len(num); n > 0 {
			if i := strings.IndexByte("kMGT", num[n-1]); i >= 0 {
				factor, num = math.Pow(1024, float64(i+1)), num[:n-1]
			} else if num[n-1] == 'K' {
				factor, num = 1024, num[:n-1]
			}
		}
		v, err := parseFinite(num)
		if err != nil || v <= 0 || v*factor > 1<<60 {
			return fault.Usagef("P08", "flag --%s: value %s: a size like 500M, 4G or 1000000", name, fault.Quote(s))
		}
		*p = int64(v * factor)
		return nil
	})
}

// char takes one byte, with names for those that are hard to type.
func (f *flags) char(p *byte, name, usage, allowed string) {
	f.add(name, "", "CHAR", "", usage, func(s string) error {
		switch s {
		case "tab", `\t`:
			s = "\t"
		case "comma":
			s = ","
		case "semicolon":
			s = ";"
		case "pipe":
			s = "|"
		}
		if len(s) != 1 || (allowed != "" && !strings.Contains(allowed, s)) || strings.ContainsAny(s, "\"\r\n\x00") {
			return fault.Usagef("P09", "flag --%s: value %s: one character such as , ; | or tab", name, fault.Quote(s))
		}
		*p = s[0]
		return nil
	})
}

// knownFlags are the names of every command's flags, for suggestions.
func (a *app) knownFlags() []string {
	seen := map[string]bool{}
	for _, f := range a.flags {
		for name := range f.all {
			seen[name] = true
		}
	}
	names := make([]string, 0, len(seen))
	for name := range seen {
		names = append(names, name)
	}
	sort.Strings(names)
	return names
}
