package canon

import (
	"errors"
	"fmt"
)

// An Error says what about a type, a value or encoded bytes is not canonical,
// and where.
type Error struct {
	Path string // from the outermost value, for example ".Aux[1].Value"; empty for that value itself
	Text string
}

func (e *Error) Error() string {
	if e.Path == "" {
		return "canon: " + e.Text
	}
	return "canon: " + e.Path + ": " + e.Text
}

func errorf(format string, args ...any) error {
	return &Error{Text: fmt.Sprintf(format, args...)}
}

// within says that an error arose further in, below the given step of a path.
func within(step string, err error) error {
	var e *Error
	if errors.As(err, &e) {
		e.Path = step + e.Path
	}
	return err
}
