package job

import (
	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/recording"
)

// wire is a channel to look up in the headers of takes.
type wire struct {
	n     *node
	name  string // key
	takes []*analyze.Take
}

// wireKeys are the keys that name channels.
var wireKeys = []string{"out", "in", "out2", "driven", "mains"}

// wire notes the channels that a take, or a check for its takes, states.
func (r *reader) wire(get func(string) *node, takes []*analyze.Take) {
	for _, name := range wireKeys {
		if n := get(name); n != nil {
			r.wires = append(r.wires, wire{n, name, takes})
		}
	}
}

// checkChannels looks every stated channel up in the headers of its takes. A
// file that cannot be opened is left for the run.
func (r *reader) checkChannels() {
	if r.opt.Headers == nil {
		return
	}
	type file struct {
		path string
		opt  recording.Options
	}
	infos := map[file]*recording.Info{}
	header := func(t *analyze.Take) *recording.Info {
		if t.Path == "" {
			return nil
		}
		f := file{t.Path, t.CSV}
		in, known := infos[f]
		if !known {
			in, _ = r.opt.Headers(t.Path, t.CSV)
			infos[f] = in
		}
		return in
	}
	quiet := &faults{} // the form of the value was judged before
	for _, w := range r.wires {
		text := quiet.channels(w.n, keys.Key{Name: w.name})
		if text == "" {
			continue
		}
		for _, t := range w.takes {
			in := header(t)
			if in == nil {
				continue
			}
			if _, _, err := analyze.ResolveChannel(text, in); err != nil {
				r.add(w.n.at, "%s: %s, take %s: %s", tick(w.name), quote(text), tick(t.Name), clean200(err.Error()))
			}
		}
	}
}
