package compare

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"benchslip/analyze/slip"
)

// mostBytes bounds a slip.json; the demo's are under 100 kB.
const mostBytes = 64 << 20

// Read reads a slip.json. The text of an error begins with the path as given.
func Read(path string) (*slip.Slip, []byte, error) {
	fault := func(format string, args ...any) (*slip.Slip, []byte, error) {
		return nil, nil, fmt.Errorf("%s: %s", path, fmt.Sprintf(format, args...))
	}
	st, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return fault("there is no such file")
	case err != nil:
		return fault("%v", reason(err))
	case st.IsDir():
		return fault("is a folder; name the slip.json in it")
	case !st.Mode().IsRegular():
		return fault("is no ordinary file")
	}
	f, err := os.Open(path)
	if err != nil {
		return fault("%v", reason(err))
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, mostBytes+1))
	if err != nil {
		return fault("%v", reason(err))
	}
	if len(data) > mostBytes {
		return fault("is larger than %d MiB, which no slip is", mostBytes>>20)
	}
	s, err := parse(data)
	if err != nil {
		return fault("%v", err)
	}
	return s, data, nil
}

func reason(err error) error {
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	return err
}

// parse decodes and looks whether it is a slip at all.
func parse(data []byte) (*slip.Slip, error) {
	var s slip.Slip
	if err := json.Unmarshal(data, &s); err != nil {
		var syntax *json.SyntaxError
		if errors.As(err, &syntax) {
			return nil, fmt.Errorf("byte %d: is no slip.json: %v", syntax.Offset, err)
		}
		return nil, fmt.Errorf("is no slip.json: %v", err)
	}
	switch {
	case s.Format == 0 || s.Checks == nil:
		return nil, errors.New("is no slip.json: it has no format and no checks")
	case s.Format != 1:
		return nil, fmt.Errorf("is a slip of format %d; this version reads format 1", s.Format)
	}
	seen := map[string]bool{}
	for i := range s.Checks {
		if seen[s.Checks[i].Name] {
			return nil, fmt.Errorf("the check %q stands twice", s.Checks[i].Name)
		}
		seen[s.Checks[i].Name] = true
	}
	return &s, nil
}
