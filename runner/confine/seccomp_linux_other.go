//go:build linux && !amd64 && !arm64

package confine

import (
	"errors"
	"runtime"
)

func filterCalls() error { return errors.New("no filter is known for " + runtime.GOARCH) }
