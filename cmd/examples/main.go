// Command examples writes the invented data of the examples, each from a known
// truth that is written beside them:
//
//	go run ./cmd/examples recipes/examples
package main

import (
	"fmt"
	"os"
)

func main() {
	if len(os.Args) != 2 {
		fmt.Fprintln(os.Stderr, "usage: examples DIR")
		os.Exit(2)
	}
	if err := curlew(os.Args[1] + "/curlew"); err != nil {
		fmt.Fprintln(os.Stderr, "examples:", err)
		os.Exit(1)
	}
}
