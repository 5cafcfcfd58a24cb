module steelyard

go 1.26.0

require (
	github.com/agext/levenshtein v1.2.1
	github.com/astrogo/fitsio v0.2.0
	github.com/goccy/go-yaml v1.19.2
	github.com/google/go-cmp v0.7.0
	github.com/hashicorp/hcl/v2 v2.25.0
	github.com/spf13/cobra v1.10.2
	github.com/zclconf/go-cty v1.19.0
	go.etcd.io/bbolt v1.5.0
	golang.org/x/term v0.48.0
	gonum.org/v1/gonum v0.17.0
	pgregory.net/rapid v1.3.0
)

require (
	github.com/apparentlymart/go-textseg/v15 v15.0.0 // indirect
	github.com/apparentlymart/go-textseg/v17 v17.0.1 // indirect
	github.com/inconshreveable/mousetrap v1.1.0 // indirect
	github.com/mitchellh/go-wordwrap v1.0.1 // indirect
	github.com/spf13/pflag v1.0.10 // indirect
	golang.org/x/mod v0.29.0 // indirect
	golang.org/x/sync v0.20.0 // indirect
	golang.org/x/sys v0.50.0 // indirect
	golang.org/x/text v0.31.0 // indirect
	golang.org/x/tools v0.38.0 // indirect
)
