package job

// Parse reads a job text that was made, not read from a file: name stands in
// its faults, and dir is the folder that its paths are relative to.
func Parse(name, dir string, data []byte, o Options) (*Job, error) {
	return parse(name, dir, data, o)
}
