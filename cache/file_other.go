//go:build !unix

package cache

import (
	"io"
	"os"
)

// tryLock does without a lock where there is no flock.
func tryLock(*os.File) (bool, error) { return true, nil }

// contents reads a file.
func contents(file *os.File) (b []byte, release func(), err error) {
	b, err = io.ReadAll(io.NewSectionReader(file, 0, 1<<62))
	return b, func() {}, err
}
