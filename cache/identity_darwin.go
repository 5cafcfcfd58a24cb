package cache

import (
	"os"
	"syscall"
)

func identify(info os.FileInfo) identity {
	id := identity{size: info.Size(), modified: info.ModTime().UnixNano()}
	if sys, ok := info.Sys().(*syscall.Stat_t); ok {
		id.changed = sys.Ctimespec.Nano()
		id.device, id.inode = uint64(sys.Dev), sys.Ino
	}
	return id
}
