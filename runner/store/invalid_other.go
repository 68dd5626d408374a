//go:build !unix

package store

import "io/fs"

var errInvalid error = fs.ErrPermission // what Windows says to syncing a folder
