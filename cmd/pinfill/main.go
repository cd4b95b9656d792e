// Command pinfill finishes a partly labelled table: see README.md.
package main

import (
	"os"

	"pinfill/internal/cli"
)

func main() { os.Exit(cli.Main()) }
