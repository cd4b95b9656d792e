module pinfill

go 1.26.8

require (
	github.com/klauspost/compress v1.20.4
	github.com/kyroy/kdtree v0.0.0-20200419114247-70830f883f1d
	github.com/rogpeppe/go-internal v1.16.0
	github.com/spf13/cobra v1.10.2
	github.com/spf13/pflag v1.0.9
	golang.org/x/sys v0.50.0
	golang.org/x/term v0.48.0
	golang.org/x/text v0.44.0
	gonum.org/v1/gonum v0.17.0
)

require (
	github.com/inconshreveable/mousetrap v1.1.0 // indirect
	github.com/kyroy/priority-queue v0.0.0-20180327160706-6e21825e7e0c // indirect
	github.com/stretchr/testify v1.8.0 // indirect
	golang.org/x/tools v0.52.0 // indirect
)
