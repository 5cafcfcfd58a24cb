//go:build !linux && !darwin

package cache

import "os"

func identify(info os.FileInfo) identity {
	return identity{size: info.Size(), modified: info.ModTime().UnixNano()}
}
