//go:build unix

package cache

import (
	"errors"
	"os"
	"syscall"
)

// tryLock takes the lock that bbolt takes for writing, until the file is
// closed. It gives false when another process has it.
func tryLock(file *os.File) (bool, error) {
	err := syscall.Flock(int(file.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
	if errors.Is(err, syscall.EWOULDBLOCK) {
		return false, nil
	}
	return err == nil, err
}

// contents gives the bytes of a file without reading those nobody looks at.
// They must be looked at under guard, for the file may be cut short meanwhile,
// and not after release.
func contents(file *os.File) (b []byte, release func(), err error) {
	info, err := file.Stat()
	if err != nil || info.Size() == 0 {
		return nil, func() {}, err
	}
	b, err = syscall.Mmap(int(file.Fd()), 0, int(info.Size()), syscall.PROT_READ, syscall.MAP_SHARED)
	return b, func() { syscall.Munmap(b) }, err
}
