package encode

import (
	"strings"

	"golang.org/x/text/cases"
	"golang.org/x/text/unicode/norm"
)

// foldName maps names that a person would read as one to the same key: composed accents, folded case, single spaces.
func foldName(name string) string {
	return cases.Fold().String(norm.NFC.String(strings.Join(strings.Fields(name), " ")))
}
