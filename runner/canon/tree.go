package canon

// memory that a value in a tree takes beside its content, at most: an
// interface, and its share of a slice or map.
const treeOverhead = 64

// Tree decodes canonical bytes of any type, for showing them. It gives bool,
// int64, uint64 (of integers beyond the range of int64), float64 and string;
// slices such as []float64 and []uint8 for typed arrays; []any for other
// arrays, and map[string]any for structs and maps, whose keys are written in
// decimal if they are integers. What would take more than about limit bytes of
// memory is refused.
func Tree(data []byte, limit int) (any, error) {
	t := treeReader{reader{data: data}, limit}
	v, err := t.value(1)
	if err != nil {
		return nil, err
	}
	if err := t.done(); err != nil {
		return nil, err
	}
	return v, nil
}

type treeReader struct {
	reader
	left int // bytes of memory
}

// spend accounts for memory that is to be taken.
func (t *treeReader) spend(bytes int) error {
	if bytes > t.left {
		return errorf("the value is too large to be shown")
	}
	t.left -= bytes
	return nil
}

func (t *treeReader) value(depth int) (any, error) {
	if depth > maxDepth {
		return nil, errorf("values nest more than %d deep", maxDepth)
	}
	if err := t.spend(treeOverhead); err != nil {
		return nil, err
	}
	if len(t.data) == 0 {
		return nil, errorf("the bytes end in the middle of the value")
	}
	switch b := t.data[0]; b & 0xe0 {
	case majorNatural, majorNegative:
		small, big, err := t.integer()
		if big != 0 {
			return big, err
		}
		return small, err
	case majorText:
		b, err := t.text("text")
		if err == nil {
			err = t.spend(len(b))
		}
		return string(b), err
	case majorTag:
		k, raw, err := t.typed()
		if err == nil {
			err = t.spend(len(raw))
		}
		if err != nil {
			return nil, err
		}
		return numbers(k, raw), nil
	case majorArray:
		return t.list(depth)
	case majorMap:
		return t.mapping(depth)
	case majorSimple:
		if b >= 0xf9 && b <= 0xfb {
			return t.float("a float")
		}
		return t.truth()
	}
	return nil, errorf("%s is no part of a value", t.found())
}

func (t *treeReader) list(depth int) (any, error) {
	n, err := t.count(majorArray, "an array", 1)
	if err == nil && n > t.left/treeOverhead {
		err = t.spend(t.left + 1)
	}
	if err != nil {
		return nil, err
	}
	out := make([]any, n)
	for i := range out {
		if out[i], err = t.value(depth + 1); err != nil {
			return nil, within(index(i), err)
		}
	}
	return out, nil
}

func (t *treeReader) mapping(depth int) (any, error) {
	out := map[string]any{}
	err := t.eachEntry(func(key any) error {
		name := keyText(key)
		if err := t.spend(len(name) + treeOverhead); err != nil {
			return err
		}
		v, err := t.value(depth + 1)
		out[name] = v
		return err
	})
	if err != nil {
		return nil, err
	}
	return out, nil
}
